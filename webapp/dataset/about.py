"""What a dataset says of itself: where and when, by whom, in which state, by which rules, and what it is good for."""

from webapp.dataset.equations import EQUATION_SET
from webapp.dataset.fields import iso
from webapp.dataset.package import LAYOUT
from webapp.meters.words import METHODS

_NOT_STATED = "not stated: ask the contact"
ZERO = "Distances are km downstream of the outfall, which is 0; negative above it."
BANKS = "Left and right are as one looks downstream."
ROUNDING = (
    "station_summary.csv is rounded once, half to even, to what can be measured; raw and corrected values everywhere "
    "are not rounded, computed ones to 4 decimals."
)
LIMITS = (
    "Readings are as recorded in the field; quality and reasons say what was checked and how.",
    "The place of the lowest oxygen is known as an interval and never as a point.",
    "A percent saturation that a meter showed refers to what percent_basis says.",
    "Results support, and do not replace, the judgement of a licensed professional.",
)


def about(survey, name, version, state, rows, names, lines, plan):
    """Return what datapackage.json says of the package itself; README.txt tells the same."""
    history = rows["history"]
    as_of = max((row["at"] for row in history), default=None)
    title = f"{survey.name}: dissolved oxygen in {survey.river}"
    return {
        "name": name,
        "title": title,
        "description": survey.purpose.strip() or f"A survey of dissolved oxygen in {survey.river}.",
        "version": version,
        "state": state,
        "as_of": iso(as_of, survey.time_zone),
        "bankside_layout": LAYOUT,
        "equation_set": EQUATION_SET,
        "time_zone": survey.time_zone,
        "temporal": _temporal(lines, survey.time_zone),
        "bounding_box": _bounding_box(lines, plan),
        "horizontal_datum": "WGS 84",
        "vertical_datum": "not stated; elevation_m is above sea level as it was entered",
        "zero_of_distance": ZERO,
        "bank_convention": BANKS,
        "rounding": ROUNDING,
        "methods": _methods(rows["meter"]),
        "meters": _meters(rows["meter"]),
        "known_limits": list(LIMITS),
        "contributors": _contributors(rows, names, lines),
        "contact": f"{names.people[survey.created_by_id]}, who made the survey",
        "licence": _NOT_STATED,
        "citation": f"{title}. Version {version}, {as_of:%Y-%m-%d}." if as_of else f"{title}. Version {version}.",
        "version_history": _versions(rows["survey_event"], names, survey.time_zone),
    }


def _temporal(lines, zone):
    times = [line.final.taken_at for line in lines]
    return {"start": iso(min(times), zone), "end": iso(max(times), zone)} if times else {}


def _bounding_box(lines, plan):
    """Return west, south, east and north of all positions that are known."""
    access = (plan.tables.get("access") or []) if plan else []
    places = [(line.reading.longitude, line.reading.latitude) for line in lines]
    places += [(row.get("longitude"), row.get("latitude")) for row in access]
    places = [place for place in places if None not in place]
    if not places:
        return {}
    east, north = zip(*places, strict=True)
    return {"west": min(east), "south": min(north), "east": max(east), "north": max(north)}


def _methods(meters):
    words = sorted({METHODS.get(row["method"], row["method"]) for row in meters if row["method"]})
    said = f"Oxygen by meter: {', '.join(words).lower()}." if words else "Oxygen by meter; of what kind was not noted."
    return [said, "Saturation, deficit and prediction: see equations.csv.", "Thresholds: see settings.csv."]


def _meters(meters):
    ordered = sorted(meters, key=lambda row: (row["name"], row["id"]))
    return [{key: row[key] for key in ("name", "maker", "model", "serial") if row[key]} for row in ordered]


def _contributors(rows, names, lines):
    """Return who recorded, and who decided about what was recorded."""
    recorded = {line.reading.author_id for line in lines}
    decided = {row["made_by_id"] for row in (*rows["reading_event"], *rows["survey_event"])}
    people = sorted((names.people[one], one) for one in recorded | decided)
    return [
        {"title": label, "role": "recorded and reviewed" if one in recorded & decided else "recorded" if one in recorded
         else "reviewed"}
        for label, one in people
    ]  # fmt: skip


def _versions(events, names, zone):
    ordered = sorted(events, key=lambda row: (row["made_at"], row["id"]))
    return [
        {
            "at": iso(row["made_at"], zone),
            "what": row["kind"],
            "version": row["version"],
            "by": names.people[row["made_by_id"]],
            "why": row["reason"],
        }
        for row in ordered
    ]
