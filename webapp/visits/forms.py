"""The form of a visit: what a crew typed, into a NewEntry or a message beside each field."""

import json
import re
import uuid
from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

from webapp.answers import saved_at
from webapp.forms import Fields, NotANumber, read_number
from webapp.visits.new import Choice, NewEntry
from webapp.visits.words import CHOICES, NUMBERS

LONGEST_VISIT = timedelta(hours=48)
TEXTS = {"crew": ("crew", 200), "water_look": ("look of the water", 200), "note": ("note", 2000)}
TEXTS["partial_reason"] = ("reason why it is partial", 500)
_MOST_SEEN = 200
_MOST_RUNS = 20
_SECONDS = re.compile(r"[\s;/]+")


def parse_entry(source, show, code, now):
    """Return (NewEntry, {}) or (None, {field: message})."""
    fields = Fields(source, show)
    saved = saved_at(source)
    entry_id = fields.uuid("submission_id")
    facts = {name: _number(fields, name) for name in NUMBERS}
    facts |= {name: fields.choice(name, "entry", options, "") for name, options in CHOICES.items()}
    facts |= {name: fields.text(name, label, longest, required=False) for name, (label, longest) in TEXTS.items()}
    facts |= _times(fields, saved or now, now)
    facts |= _float(fields)
    _together(fields, facts)
    new = NewEntry(
        id=entry_id,
        visit_id=fields.uuid("visit_id") if fields.holds("visit_id") else entry_id,
        station_code=code,
        facts={name: _or_none(value) for name, value in facts.items() if _was_asked(name, source)},
        entered=_entered(fields, source),
        seen=_ids(source.get("seen")),
        reason=fields.text("reason", "reason", 500, required=False) or "",
        saved_at=saved,
    )
    return (None, fields.errors) if fields.errors else (new, {})


def _number(fields, name):
    one = NUMBERS[name]
    return fields.number(name, one.label, one.low, one.high, one.quantity, required=False)


def _was_asked(name, source):
    """Return whether the form had a field for a fact: what it did not ask about stays as it is."""
    field = {"float_distance_m": "float_distance", "surface_velocity_m_s": "float_times"}.get(name, name)
    return ("float_times" if field in ("float_time_s", "velocity_m_s") else field) in source


def _or_none(value):
    return None if value == "" else value


def _entered(fields, source):
    """Return everything that was typed: numbers with their unit, the rest as text."""
    names = [*CHOICES, *TEXTS, "arrived_at", "left_at", "float_times"]
    texts = {name: str(source.get(name) or "").replace("\x00", "").strip() for name in names}
    return {name: {"text": text, "unit": ""} for name, text in texts.items() if text} | fields.entered


def _times(fields, saved, now):
    """Return when they arrived and left, as ISO text. An hour that came twice is the one nearer to what is known."""
    new_visit = not fields.holds("visit_id")
    arrived = fields.local_time("arrived_at", "time of arrival", required=new_visit or "arrived_at" in fields.source)
    left = fields.local_time("left_at", "time of leaving", required=False)
    if arrived is not None and (again := _second_time(arrived, fields.show)) is not None:
        arrived = again if timedelta() <= saved - again < timedelta(hours=1) else arrived
    if left is not None and arrived is not None and left < arrived:
        left = _second_time(left, fields.show) or left
    for name, instant in (("arrived_at", arrived), ("left_at", left)):
        fields.not_to_come(name, instant, now)
    if arrived is not None and left is not None:
        if left < arrived:
            fields.refuse("left_at", "That is before the arrival. Check both, also the day.")
        elif left - arrived > LONGEST_VISIT:
            fields.refuse("left_at", "That is more than two days after the arrival. Check the day.")
    return {"arrived_at": arrived and arrived.isoformat(), "left_at": left and left.isoformat()}


def _second_time(instant, show):
    """Return when the same time of day came again, where the clocks went back over it; else None."""
    zone = ZoneInfo(show.time_zone)
    again = instant.astimezone(zone).replace(fold=1).astimezone(UTC)
    return again if again > instant else None


def _float(fields):
    """Return the distance of a float, the mean of its times, and its velocity at the surface, or nothing of it."""
    distance = fields.number("float_distance", "distance of the float", 0.1, 2000, "depth", False)
    times = _seconds(fields)
    if (distance is None) != (not times) and not {"float_distance", "float_times"} & set(fields.errors):
        lacking = "float_times" if times == [] else "float_distance"
        fields.refuse(lacking, "Enter both how far the float went and how long it took, or neither.")
    if distance is None or not times:
        return dict.fromkeys(("float_distance_m", "float_time_s", "surface_velocity_m_s", "velocity_m_s"))
    mean = sum(times) / len(times)
    surface = distance / mean
    if surface > 10:
        fields.refuse("float_times", "That float ran faster than 10 m/s (33 ft/s). Check distance and time.")
    return {"float_distance_m": distance, "float_time_s": mean, "surface_velocity_m_s": surface, "velocity_m_s": None}


def _seconds(fields):
    """Return the seconds of each run, written one after the other."""
    written = str(fields.source.get("float_times") or "").replace("\x00", "").strip()
    try:
        times = [read_number(text) for text in _SECONDS.split(written) if text]
    except NotANumber:
        return fields.refuse("float_times", "Enter seconds, a blank between the runs, for example 31.2 30.5.")
    if not all(1 <= one <= 36000 for one in times) or len(times) > _MOST_RUNS:
        return fields.refuse("float_times", "Enter up to 20 runs, each of 1 second to 10 hours.")
    return times


def _together(fields, facts):
    """Refuse what says only half."""
    if facts["status"] == "partial" and not facts["partial_reason"]:
        fields.refuse("partial_reason", "Say why the visit is partial.")
    if facts["status"] != "partial":
        facts["partial_reason"] = ""
    if facts["flow_m3_s"] is None and not fields.holds("flow_m3_s"):
        if facts["flow_uncertainty_percent"] is not None:
            fields.refuse("flow_m3_s", "Enter the flow, or leave its uncertainty empty.")
        facts["flow_method"] = ""


def _ids(text):
    """Return the ids that a form lists as JSON; nothing where it lists none."""
    try:
        ids = json.loads(text or "[]")
    except (ValueError, RecursionError):
        return ()
    ids = [one for one in ids if isinstance(one, str) and len(one) <= 40] if isinstance(ids, list) else []
    return tuple(sorted(set(ids)))[:_MOST_SEEN]


def parse_wading(source, show):
    """Return (depth, velocity) as far as they can be read, for the warning while they are typed. [m, m/s]"""
    fields = Fields(source, show)
    return tuple(_number(fields, name) for name in ("wading_depth_m", "wading_velocity_m_s"))


def parse_choice(source):
    """Return (Choice, {}) or (None, {field: message})."""
    fields = Fields(source)
    choice = Choice(
        id=fields.uuid("submission_id"),
        name=fields.text("name", "fact", 40),
        entry_id=fields.text("entry_id", "value that holds", 40),
        seen=_ids(source.get("seen")),
        reason=fields.text("reason", "reason: whoever reads this later must see why", 500),
    )
    return (None, fields.errors) if fields.errors else (choice, {})


def fresh_form(show, now, crew):
    """Return the texts of a form that begins a visit."""
    return {
        "submission_id": str(uuid.uuid4()),
        "visit_id": "",
        "seen": "[]",
        "units": show.unit_system,
        "arrived_at": show.typed_time(now),
        "crew": crew,
    }


def form_of(show, final, entries, now, leaving=False):
    """Return the texts of a form that goes on with a visit, as its entries have it so far."""
    facts = final.facts
    form = {
        "submission_id": str(uuid.uuid4()),
        "visit_id": final.id,
        "seen": seen_of(entries),
        "units": show.unit_system,
        "arrived_at": show.typed_time(final.arrived_at),
        "left_at": show.typed_time(final.left_at or (now if leaving else None)),
    }
    form |= {name: show.typed(one.quantity, facts.get(name)) for name, one in NUMBERS.items()}
    form |= {name: facts.get(name) or "" for name in (*CHOICES, *TEXTS)}
    if facts.get("float_distance_m") is not None:
        form["float_distance"] = show.typed("depth", facts["float_distance_m"])
        form["float_times"] = show.typed("plain", facts.get("float_time_s"))
    return form


def seen_of(entries):
    """Return the ids of entries as a form carries them: those that whoever fills it in has seen."""
    return json.dumps(sorted(one.id for one in entries))


def is_recent(final, now):
    """Return whether a visit goes on at this moment, as far as is known: nobody left, and it began today."""
    began = final.arrived_at or datetime.min.replace(tzinfo=UTC)
    return final.left_at is None and now - began < timedelta(hours=12)
