"""What is odd about a meter check: asked about once before it is stored, and kept with it."""

from datetime import date, timedelta

from calc.findings import Finding
from calc.quality_meter import standard_expired
from calc.quality_pressure import pressure_against_elevation, pressure_unit, sea_level_pressure
from calc.units import convert
from webapp.meters.words import MADE_WITH_AIR
from webapp.readings.asking import THIS_MOMENT
from webapp.readings.service import station_pressure_of

# After these a meter can't tell any more what it would have shown.
CHANGED = ("adjusted", "after_cleaning")
# Work that goes on past midnight is still of the day it began.
NIGHT = timedelta(hours=8)


def asks(survey, show, settings, new, checks, now, saved_at=None):
    """Return the findings to ask about before a NewCheck is stored; checks are JudgedChecks of the survey.

    saved_at is when it was saved on a phone without signal. Hours later nobody stands beside the meter to answer: what
    is odd is then not asked about. Nor is anything that is stored already.
    """
    if now - (saved_at or now) > THIS_MOMENT or any(one.check.id == new.id for one in checks):
        return []
    before = [
        one.check for one in checks if one.check.meter_id == new.meter_id and not one.set_aside and not one.of_zero
    ]
    today = [
        one
        for one in before
        if one.parameter == new.parameter
        and one.checked_at <= new.checked_at
        and same_day(show, one.checked_at, new.checked_at)
    ]
    return [
        *_order(show, new, today),
        *_pressure(survey, settings, new),
        *_expiry(show, new),
    ]


def same_day(show, instant, now):
    """Return whether an instant belongs to the working day of now: the same date, or the same night's work."""
    return show.local(instant).date() == show.local(now).date() or abs(now - instant) <= NIGHT


def _order(show, new, today):
    """Return a question where a check comes too late for the readings before it."""
    if new.kind == "adjusted" and not today:
        return [
            Finding(
                name="as_found_missing",
                field="meter",
                says="This meter has no check as found today, before it was adjusted.",
                cause="What it would have shown before can't be told any more, so nothing closes the readings before.",
                do="If you did check it first, enter that check as found, then this one.",
            )
        ]
    last = today[-1] if today else None
    if new.kind == "end_of_day" and last is not None and last.kind in CHANGED:
        done = "adjusted" if last.kind == "adjusted" else "cleaned"
        return [
            Finding(
                name="end_check_late",
                field="meter",
                says=f"This meter was {done} at {show.clock(last.checked_at)}, and not checked between then and now.",
                cause=f"It can't tell any more how far it had drifted before it was {done}.",
                do="If this check was made first, give it that time. Otherwise keep it: it closes what was read since.",
            )
        ]
    return []


def _pressure(survey, settings, new):
    """Return what is odd about the air pressure, where the check rests on it."""
    if new.standard not in MADE_WITH_AIR or new.pressure_mmhg is None:
        return ()
    unit = (new.entered.get("pressure") or {}).get("unit", "mm[Hg]")
    slips = sea_level_pressure(
        new.pressure_mmhg,
        survey.elevation_m,
        new.water_temp_c,
        settings,
        source=new.pressure_source,
        unit=unit,
    ) + pressure_unit(
        float(convert(new.pressure_mmhg, "mm[Hg]", unit)),
        unit,
        0.0 if new.pressure_source == "weather" else survey.elevation_m,
        settings,
    )
    here = station_pressure_of(new, survey.elevation_m)
    return slips or pressure_against_elevation(here, survey.elevation_m, settings)


def _expiry(show, new):
    if not new.expires_on:
        return ()
    return standard_expired((show.local(new.checked_at).date() - date.fromisoformat(new.expires_on)).days)
