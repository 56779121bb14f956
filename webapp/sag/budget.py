"""How long the crew may go on, and whether a further station fits into that.

What is left is the earliest of: off the water before sunset, the bottles at the laboratory in time, and the end of the
crew's hours; less the minutes to close out. Minutes and times come from what the day showed (plan.tables.DAY), the
sunset from a position typed there, else from the first access point that has one. No position: no sunset is counted.
"""

from dataclasses import dataclass, field
from datetime import datetime, timedelta

from astral import Observer
from astral.sun import elevation, noon, sunset

from webapp.display import Show, hours
from webapp.plan.day import day_of

OFF_WATER_MIN, LAB_MARGIN_MIN, CLOSEOUT_MIN = 30.0, 30.0, 45.0
STATION_MIN = 15.0
# The sun's upper edge is on the horizon when its middle is this far below, with the air's refraction. [degrees]
_HORIZON_DEG = -0.833
_NO_LIMIT = "No time limit is known: enter how long the crew may stay under “What the day showed”."


@dataclass(frozen=True)
class Budget:
    """until is when closing out must begin, None without any limit; because is a sentence; sun is today's sunset."""

    remaining_min: float | None
    until: datetime | None
    because: str
    sun: datetime | None
    show: Show = field(repr=False, compare=False)


def time_budget(survey, plan_version, now):
    """Return the Budget of a survey at an instant."""
    show = Show.of(survey)
    tables = plan_version.tables if plan_version else {}
    day = day_of(tables)
    sun, limits = _daylight(show, day, tables, now)
    limits += _deadlines(show, day)
    if not limits:
        return Budget(None, None, _NO_LIMIT, sun, show)
    closeout_min = _or(day.get("closeout_min"), CLOSEOUT_MIN)
    limit, why = min(limits, key=lambda one: one[0])
    until = limit - timedelta(minutes=closeout_min)
    remaining_min = (until - now).total_seconds() / 60
    because = f"Begin to close out by {show.when(until, now)}: {why}, and closing out takes {_minutes(closeout_min)}."
    return Budget(remaining_min, until, because, sun, show)


def fits(budget, now, drive_min, parcel_at, station_minutes=STATION_MIN):
    """Return (whether a station fits, why in words); a parcel that comes later than the crew is waited for.

    drive_min or parcel_at may be None where it is not known or does not count.
    """
    there = now + timedelta(minutes=drive_min or 0.0)
    done = max(there, parcel_at or there) + timedelta(minutes=station_minutes)
    words = f"done by {budget.show.when(done, now)}"
    if drive_min is None:
        words += ", without the drive, which is not known"
    if budget.until is None:
        return True, f"{words}; no time limit is known"
    minutes = (budget.until - done).total_seconds() / 60
    if minutes >= 0:
        return True, f"{words}, {_minutes(minutes)} before closing out must begin"
    return (
        False,
        f"{words}, {_minutes(minutes)} after closing out must begin, at {budget.show.when(budget.until, now)}",
    )


def position_of(tables):
    """Return (latitude, longitude): as typed for the day, else of the first access point that has one, else None."""
    places = [day_of(tables), *((tables or {}).get("access") or [])]
    found = [(one.get("latitude"), one.get("longitude")) for one in places]
    return next((pair for pair in found if None not in pair), None)


def _daylight(show, day, tables, now):
    """Return (sunset or None, limits) of the local day."""
    position = position_of(tables)
    if position is None:
        return None, []
    here, local = Observer(*position), show.local(now)
    try:
        sun = sunset(here, local.date(), tzinfo=local.tzinfo)
    except ValueError:  # the sun does not cross the horizon on this day
        if elevation(here, noon(here, local.date(), tzinfo=local.tzinfo)) > _HORIZON_DEG:
            return None, []
        return None, [(now, "the sun does not rise today, and work in the dark needs a plan of its own")]
    before_min = _or(day.get("off_water_before_sunset_min"), OFF_WATER_MIN)
    why = f"sunset is at {show.clock(sun)}, off the water {_minutes(before_min)} before"
    return sun, [(sun - timedelta(minutes=before_min), why)]


def _deadlines(show, day):
    limits = []
    if day.get("bottles_until"):
        by = datetime.fromisoformat(day["bottles_until"])
        drive_min, margin_min = day.get("drive_to_lab_min"), _or(day.get("lab_margin_min"), LAB_MARGIN_MIN)
        drive = "the drive there is not entered" if drive_min is None else f"{_minutes(drive_min)} to drive"
        why = f"bottles are due at the laboratory at {show.day_clock(by)}, {drive}, {_minutes(margin_min)} to hand over"
        limits.append((by - timedelta(minutes=(drive_min or 0.0) + margin_min), why))
    if day.get("crew_until"):
        by = datetime.fromisoformat(day["crew_until"])
        limits.append((by, f"the crew works until {show.day_clock(by)}"))
    return limits


def _minutes(minutes):
    return hours(abs(minutes) / 60)


def _or(value, default):
    return default if value is None else value
