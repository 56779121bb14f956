"""A survey's own facts, typed or from the first row of a survey.csv."""

import uuid
from dataclasses import dataclass, replace
from datetime import datetime
from zoneinfo import available_timezones

from webapp.display import Show
from webapp.forms import Fields

UNIT_SYSTEMS = {"si": "SI (m, °C, m³/s)", "us": "US customary (ft, °F, ft³/s)"}
DISTANCE_RULES = {
    "downstream": "Distance below the outfall",
    "river_km": "River kilometre, counted up from the mouth",
    "river_mile": "River mile, counted up from the mouth",
}
SAMPLINGS = {"same_parcel": "Same parcel of water, followed down the river", "snapshot": "Snapshot of the river"}


@dataclass(frozen=True)
class SurveyFacts:
    """What a survey says of itself, in SI."""

    name: str
    river: str
    purpose: str
    time_zone: str
    unit_system: str
    distance_rule: str
    outfall_mark: float | None
    elevation_m: float
    do_criterion_mg_l: float | None
    criterion_basis: str
    sampling: str
    release_at: datetime | None
    safety_note: str


def new_id():
    """Return an id for a survey that is about to be typed: sent twice by a double tap, it is one survey."""
    return str(uuid.uuid4())


def id_of_new(source):
    """Return the id that the form carries, or a new one where it carries none."""
    try:
        return str(uuid.UUID(str(source.get("survey_id") or "")))
    except ValueError:
        return new_id()


def parse_survey(source):
    """Return (SurveyFacts, {}) or (None, {field: message})."""
    first = Fields(source)
    zone = first.text("time_zone", "time zone", 64)
    if zone and zone not in available_timezones():
        first.refuse("time_zone", "Enter a time zone as region and city, for example Europe/Vienna or America/Denver.")
        zone = None
    units = first.choice("unit_system", "units", UNIT_SYSTEMS, "si")
    rule = first.choice("distance_rule", "distance rule", DISTANCE_RULES, "downstream")
    fields = Fields(source, Show(unit_system=units or "si", time_zone=zone or "UTC"))
    fields.errors.update(first.errors)
    facts = SurveyFacts(
        name=fields.text("name", "survey's name", 120),
        river=fields.text("river", "river's name", 120),
        purpose=fields.text("purpose", "purpose", 2000, required=False),
        time_zone=zone,
        unit_system=units,
        distance_rule=rule,
        outfall_mark=_outfall_mark(fields, rule),
        elevation_m=fields.number("elevation_m", "elevation of the water above sea level", -430, 6000, "elevation"),
        do_criterion_mg_l=fields.number("do_criterion_mg_l", "oxygen criterion", 0, 20, "oxygen", required=False),
        criterion_basis=fields.text("criterion_basis", "basis of the criterion", 200, required=False),
        sampling=fields.choice("sampling", "way of sampling", SAMPLINGS, "same_parcel"),
        release_at=fields.local_time("release_at", "time the parcel leaves the outfall", required=False),
        safety_note=fields.text("safety_note", "safety note", 2000, required=False),
    )
    return (None, fields.errors) if fields.errors else (facts, {})


def _outfall_mark(fields, rule):
    if rule in (None, "downstream"):
        return None
    return fields.number("outfall_mark", "outfall's own river mark", 0, 10000)


def with_untouched(facts, source, survey, typed):
    """Return the facts with each number that nobody touched as it is stored; typed is the form as it was opened.

    Where other units were chosen, the number that still stands in the form is in the former ones.
    """

    def untouched(name):
        opened = source.get(f"was_{name}")  # what stood there when the page was opened: it may have changed since
        return str(source.get(name) or "").strip() == (typed[name] if opened is None else opened)

    kept = {}
    if untouched("elevation_m"):
        kept["elevation_m"] = survey.elevation_m
    if untouched("outfall_mark") and None not in (facts.outfall_mark, survey.outfall_mark):
        before, after = (Show(distance_rule=one.distance_rule) for one in (survey, facts))
        mark_km = before.to_si("length", survey.outfall_mark, before.unit_code("place"))
        kept["outfall_mark"] = after.shown("length", mark_km, after.unit_code("place"))
    if untouched("release_at") and facts.time_zone == survey.time_zone:
        kept["release_at"] = survey.release_at
    return replace(facts, **kept)
