"""Replicates: whether a crew owes one, and how far a repeated reading lies from the first."""

from dataclasses import dataclass
from zoneinfo import ZoneInfo

from calc.quality_day import replicate_due
from calc.quality_oxygen import replicate_spread
from webapp.readings.layers import FinalReading


@dataclass(frozen=True)
class Repeat:
    """A replicate against the reading it repeats; agrees is None where one of the two has no oxygen. [mg/L]"""

    first: FinalReading
    difference_mg_l: float | None
    agrees: bool | None


def repeat_of(reading, first, settings):
    """Return the Repeat of a FinalReading that repeats another; None where it repeats none."""
    if first is None:
        return None
    if None in (reading.do_mg_l, first.do_mg_l):
        return Repeat(first, None, None)
    agrees = not replicate_spread(reading.do_mg_l, first.do_mg_l, settings)
    return Repeat(first, reading.do_mg_l - first.do_mg_l, agrees)


def due_of(readings, settings):
    """Return a sentence where the readings of one crew on one day want a replicate; empty where not."""
    used = [one for one in readings if not one.set_aside]
    repeated = sum(one.replicate for one in used)
    return replicate_due(len(used) - repeated, repeated, settings)


def local_day(survey, instant):
    """Return the calendar day of an instant where the survey is."""
    return instant.astimezone(ZoneInfo(survey.time_zone)).date()
