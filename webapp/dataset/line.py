"""A reading with all that the dataset says of it."""

import math
from dataclasses import dataclass

from webapp.readings.judging import Judged
from webapp.readings.layers import FinalReading
from webapp.review.derived import Derived

# Four decimals are far more than was measured, and the same on every machine.
_DECIMALS = 4


@dataclass(frozen=True)
class Line:
    """A reading as it is stored, as the dataset keeps it, as it stands, what follows from it and is said of it.

    limit_mg_l is the reporting limit, repeat_mg_l how far a repeat of such a reading may differ.
    """

    reading: object
    stored: dict
    final: FinalReading
    derived: Derived
    judged: Judged
    censor: str
    limit_mg_l: float
    repeat_mg_l: float
    status: str
    reviewer: str
    meter_id: str

    @property
    def spread_mg_l(self):
        """Return the highest less the lowest of the several raw values, or None."""
        values = [one["do_mg_l"] for one in self.reading.series or () if one.get("do_mg_l") is not None]
        return max(values) - min(values) if len(values) > 1 else None

    @property
    def values(self):
        """Return how many raw values the reading rests on, or None where it holds no oxygen."""
        return len(self.reading.series or ()) or (None if self.final.raw["do_mg_l"] is None else 1)

    @property
    def uncertainty_mg_l(self):
        """Return how far oxygen may be off; None without a check on both sides, or where drift was corrected."""
        checks = (self.judged.check_before, self.judged.check_after)
        if self.final.do_mg_l is None or self.final.drift is not None or None in checks:
            return None
        return may_be_off_mg_l([one.verdict.error for one in checks], self.repeat_mg_l, self.spread_mg_l or 0.0)

    @property
    def final_do_mg_l(self):
        """Return oxygen to use: without dust where it was computed, None below the reporting limit."""
        if self.censor == "less_than":
            return None
        return self.final.do_mg_l if self.final.drift is None else rounded_off(self.final.do_mg_l)


def may_be_off_mg_l(errors, repeat_mg_l, spread_mg_l):
    """Return how far oxygen may be off, None where an error is not known. [mg/L]

    That is the larger error of the checks around it, or how far a repeat may differ where that is more, and half the
    spread of the raw values, as the root of the sum of their squares.
    """
    if not all(math.isfinite(one) for one in errors):
        return None
    return math.hypot(max(repeat_mg_l, *(abs(one) for one in errors)), spread_mg_l / 2)


def rounded_off(value):
    """Return a computed number as the dataset tells it; None where there is none."""
    return None if value is None or not math.isfinite(value) else round(float(value), _DECIMALS)
