"""Storing meters and checks, each once, with what was said of a check at the time; setting checks aside."""

import math
from dataclasses import asdict

from sqlalchemy import select
from sqlalchemy.exc import IntegrityError

from calc.quality_meter import expected_value
from webapp.errors import Conflict, NotAllowed
from webapp.meters import queries
from webapp.meters.verdicts import judged_checks
from webapp.models import Meter, MeterCheck, MeterCheckEvent, new_id
from webapp.readings.asking import thresholds
from webapp.readings.service import station_pressure_of
from webapp.surveys.queries import current_settings
from webapp.surveys.service import remember

# What never changes of a meter, and what a change may touch.
_FACTS = (
    "method",
    "maker",
    "model",
    "serial",
    "cap_changed_on",
    "serviced_on",
    "resolution_mg_l",
    "percent_basis",
    "out_of_service",
    "note",
)
# What a repeat must share with the stored check; what is converted on the way is compared as it was typed.
_CONTENT = (
    "meter_id",
    "checked_at",
    "kind",
    "parameter",
    "standard",
    "conductance_us_cm",
    "pressure_source",
    "place",
    "lot",
    "expires_on",
    "action",
    "note",
)
_AS_TYPED = ("value", "water_temp_c", "compared", "pressure")


def add_meter(db, survey, new, by_id):
    """Store a meter and return it; the stored one for a double tap. Raises Conflict for a name that is taken."""
    if (stored := db.get(Meter, new.id)) is not None:
        if stored.survey_id == survey.id and stored.name == new.name:
            return stored
        raise Conflict("This form's meter is stored already under another name. Open the form again.")
    _lock(db, survey)
    if _named(db, survey.id, new.name):
        raise Conflict(f"There is a meter “{new.name}” already. Change that one, or give this one another name.")
    meter = Meter(survey_id=survey.id, **asdict(new))
    db.add(meter)
    remember(db, survey.id, by_id, "meter added", "meter", meter.id, {"name": meter.name})
    db.commit()
    return meter


def change_meter(db, survey, meter_id, new, by_id):
    """Store changed facts of a meter and return it; what they were stays in the history. Raises NotFound."""
    meter = queries.get_meter(db, survey.id, meter_id)
    changes = {}
    for name in _FACTS:
        old, value = getattr(meter, name), getattr(new, name)
        if old != value:
            changes[name] = [old, value]
            setattr(meter, name, value)
    if changes:
        remember(db, survey.id, by_id, "meter changed", "meter", meter.id, {"name": meter.name, **changes})
    db.commit()
    return meter


def bring_meters(db, survey, other, by_id):
    """Register another survey's meters here, but not those of a name that is here already; return them.

    Their checks stay where they were made.
    """
    _lock(db, survey)
    known = {one.name.casefold() for one in queries.meters_of(db, survey.id)}
    brought = []
    for one in queries.meters_of(db, other.id):
        if one.name.casefold() in known:
            continue
        known.add(one.name.casefold())
        meter = Meter(id=new_id(), survey_id=survey.id, name=one.name, **{name: getattr(one, name) for name in _FACTS})
        db.add(meter)
        brought.append(meter)
        remember(db, survey.id, by_id, "meter added", "meter", meter.id, {"name": meter.name, "from": other.name})
    db.commit()
    return brought


def _lock(db, survey):
    """Let one writer at a time at the names of a survey's meters; SQLite has one writer anyway."""
    db.execute(select(type(survey).id).where(type(survey).id == survey.id).with_for_update())


def _named(db, survey_id, name):
    return any(one.name.casefold() == name.casefold() for one in queries.meters_of(db, survey_id))


def add_check(db, survey, new, by_id, received_at):
    """Store the check once, however often it is sent, and return the stored one.

    Raises NotFound for a meter the survey does not have, Conflict where the id is that of another check.
    """
    check = put_check(db, survey, new, by_id, received_at)
    try:
        db.commit()
    except IntegrityError:  # two processes took the same check at once
        db.rollback()
        check = _the_same(queries.find_check(db, new.id), survey, new)
    return check


def put_check(db, survey, new, by_id, received_at):
    """Do what add_check does, without the commit: for a caller that stores many or none."""
    if (stored := queries.find_check(db, new.id)) is not None:
        return _the_same(stored, survey, new)
    meter = queries.get_meter(db, survey.id, new.meter_id)
    values = asdict(new)
    values.pop("kept")
    values["pressure_mmhg"] = station_pressure_of(new, survey.elevation_m)
    check = MeterCheck(
        survey_id=survey.id,
        author_id=by_id,
        received_at=received_at,
        expected=expected_of(new, survey.elevation_m),
        events=[],
        **values,
    )
    check.meter = meter
    check.judged = _said_now(db, survey, check, new.kept)
    db.add(check)
    remember(db, survey.id, by_id, "meter check saved", "meter_check", new.id, {"meter": meter.name, "kind": new.kind})
    return check


def expected_of(new, elevation_m):
    """Return what the meter should have shown, None where it can't be told. [the parameter's]"""
    expected = expected_value(
        new.standard,
        water_temp_c=_or_nan(new.water_temp_c),
        pressure_mmhg=station_pressure_of(new, elevation_m),
        conductance_us_cm=_or_nan(new.conductance_us_cm),
        compared=_or_nan(new.compared),
    )
    return expected if math.isfinite(expected) else None


def _said_now(db, survey, check, kept):
    """Return what the settings of this moment say of a check, as it is kept beside it.

    kept holds the questions that were asked before it was stored, and answered with "keep it".
    """
    version = current_settings(db, survey.id)
    verdict = judged_checks([check], thresholds(version))[0].verdict
    return {
        "settings": version.number if version else 0,
        "error": _plain(verdict.error),
        "limit": _plain(verdict.limit),
        "passes": verdict.passes,
        "grade": verdict.grade,
        "says": verdict.says,
        "kept": list(kept),
    }


def _or_nan(value):
    return math.nan if value is None else value


def _plain(value):
    return value if math.isfinite(value) else None


def _the_same(stored, survey, new):
    """Return the stored check if the new one repeats it. Raises Conflict."""
    if stored.survey_id != survey.id:
        raise Conflict("Another survey holds a meter check with this form's id. Open the form again.")
    if _content(stored) != _content(new):
        raise Conflict(
            f"This form's check of {stored.meter.name} is stored already, with other values. It was not changed. To "
            "record another check, open the form again; if the stored one is wrong, set it aside."
        )
    return stored


def _content(check):
    typed = [(check.entered.get(name) or {}).get("text") for name in _AS_TYPED]
    return [getattr(check, name) for name in _CONTENT] + typed


def may_decide(person, check):
    """Return whether somebody may set a check aside: lead and office any, the crew their own."""
    return person.may("correct") or check.author_id == person.id


def set_aside(db, survey_id, check_id, reason, based_on, person):
    """Keep a check in the record, but out of use, and return it. Raises NotFound, NotAllowed, Conflict."""
    return _decide(db, survey_id, check_id, "set_aside", reason, based_on, person)


def restore(db, survey_id, check_id, reason, based_on, person):
    """Use a check again that was set aside, and return it. Raises NotFound, NotAllowed, Conflict."""
    return _decide(db, survey_id, check_id, "restored", reason, based_on, person)


def _decide(db, survey_id, check_id, kind, reason, based_on, person):
    """Store the event if the check is as the person saw it; the same decision sent twice is one."""
    # A database that lets several write at once lets only one of them at this check; SQLite has one writer anyway.
    db.execute(select(MeterCheck.id).where(MeterCheck.id == check_id).with_for_update())
    check = queries.get_check(db, survey_id, check_id)
    if not may_decide(person, check):
        raise NotAllowed("You can set aside your own checks. For others', ask the lead or the office.")
    events = check.events
    if events and based_on == len(events) - 1:
        last = events[-1]
        if (last.kind, last.reason, last.made_by_id) == (kind, reason, person.id):
            return check
    if based_on != len(events):
        raise Conflict("Somebody decided about this check since you opened it. See what, then decide again.")
    aside = bool(events) and events[-1].kind == "set_aside"
    if aside == (kind == "set_aside"):
        raise Conflict("It is set aside already." if aside else "It is in use already.")
    events.append(MeterCheckEvent(kind=kind, reason=reason, made_by_id=person.id))
    what = "meter check set aside" if kind == "set_aside" else "meter check used again"
    remember(db, survey_id, person.id, what, "meter_check", check.id, {"meter": check.meter.name, "reason": reason})
    db.commit()
    return check
