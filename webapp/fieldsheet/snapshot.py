"""The run of a snapshot survey: how long it has taken, until when it may go on, and whether it mixes times of day."""

from dataclasses import dataclass
from datetime import datetime, timedelta

from astral import Observer
from astral.sun import sunrise, sunset

from webapp.display import Show, hours
from webapp.readings.layers import final
from webapp.readings.surroundings import OCCASION
from webapp.sag.budget import position_of

# Oxygen is near its daily low until about then.
_AFTER_SUNRISE = timedelta(hours=1)


@dataclass(frozen=True)
class Window:
    """The latest run: its first and last reading, until when stations still compare, and warnings in sentences."""

    first_at: datetime
    last_at: datetime
    span_h: float
    until: datetime
    warnings: tuple[str, ...]


def window_of(survey, plan_version, settings, readings):
    """Return the Window of a snapshot survey, None for another survey or before the first reading that counts."""
    times = sorted(one.taken_at for one in map(final, readings) if not one.set_aside)
    if survey.sampling != "snapshot" or not times:
        return None
    first = last = times[-1]
    for each in reversed(times):
        if first - each > OCCASION:
            break
        first = each
    span_h = (last - first).total_seconds() / 3600
    warnings = []
    if span_h > settings.snapshot_h:
        warnings.append(
            f"This run has taken {hours(span_h)}; beyond {hours(settings.snapshot_h)} stations hardly compare. Read "
            "the first station again; where it moved, plan a second run before dawn."
        )
    if crossed := _crossed(Show.of(survey), plan_version, first, last):
        warnings.append(
            f"This run goes over {crossed}, so readings mix times of day: oxygen rises and falls with the sun, which "
            "looks like a change along the river. Read the first station again."
        )
    return Window(first, last, span_h, first + timedelta(hours=settings.snapshot_h), tuple(warnings))


def _crossed(show, plan_version, first, last):
    """Return in words the turn of the day that lies within a run; nothing without a position or in polar seasons."""
    position = position_of(plan_version.tables if plan_version else {})
    if position is None:
        return ""
    local = show.local(first)
    days = {local.date(), show.local(last).date()}
    for day in sorted(days):
        for turn, after, words in ((sunrise, _AFTER_SUNRISE, "an hour after sunrise"), (sunset, timedelta(), "sunset")):
            try:
                at = turn(Observer(*position), day, tzinfo=local.tzinfo) + after
            except ValueError:  # the sun does not cross the horizon on this day
                continue
            if first < at < last:
                return f"{words} ({show.clock(at)})"
    return ""
