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
    """A reading as it is stored, as the dataset keeps it, as it stands, what follows from it and is said of it."""

    reading: object
    stored: dict
    final: FinalReading
    derived: Derived
    judged: Judged
    censor: str
    limit_mg_l: float
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
        """Return how far oxygen may be off, or None where it can't be told.

        It is told between two checks of the meter, for a reading that was not corrected for drift: the larger error of
        the two, and half the spread of the raw values, as the root of the sum of their squares.
        """
        checks = (self.judged.check_before, self.judged.check_after)
        if self.final.do_mg_l is None or self.final.drift is not None or None in checks:
            return None
        errors = [abs(one.verdict.error) for one in checks]
        if not all(math.isfinite(one) for one in errors):
            return None
        return math.hypot(max(errors), (self.spread_mg_l or 0) / 2)

    @property
    def final_do_mg_l(self):
        """Return oxygen to use: without dust where it was computed, None below the reporting limit."""
        if self.censor == "less_than":
            return None
        return self.final.do_mg_l if self.final.drift is None else rounded_off(self.final.do_mg_l)


def rounded_off(value):
    """Return a computed number as the dataset tells it; None where there is none."""
    return None if value is None or not math.isfinite(value) else round(float(value), _DECIMALS)
