"""What a check on a reading answers with, and the few helpers the checks share."""

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass
from math import inf, isfinite, nan

from calc.errors import OutOfRangeError

# Entries are decimals: 8.3 - 7.3 must count as a step of exactly 1, not of 1.0000000000000009.
_ROUND_OFF = 1e-9
_ENDLESS = (inf, -inf)


@dataclass(frozen=True)
class Finding:
    """Something odd about a reading, as a question to the crew. It never blocks.

    Attributes
    ----------
    name : str
        Stable snake_case name of the finding.
    field : str
        The form field it belongs to.
    says, cause, do : str
        What is odd, with its numbers; the likely cause; what to do. Plain sentences in SI.
    suggestion : mapping, optional
        Field to value: what to enter instead, if the crew agrees.
    hazard : bool
        True when it is about people rather than about the number, and is to be shown first.
    """

    name: str
    field: str
    says: str
    cause: str
    do: str
    suggestion: Mapping | None = dataclasses.field(default=None, hash=False)
    hazard: bool = False

    @property
    def label(self):
        """The name in plain words."""
        return self.name.replace("_", " ").capitalize()


def known(*values):
    """Return the values as floats, NaN for those missing (None, NaN) or infinite. No comparison with NaN holds."""
    # This runs twenty times for each reading of a survey: floats are handed back as they are, and a list is made first,
    # for a generator would take twice as long.
    for value in values:
        if type(value) is not float or value in _ENDLESS:
            break
    else:
        return values
    return tuple([nan if value is None or not isfinite(value) else float(value) for value in values])


def exceeds(value, limit):
    """Return whether the value lies above the limit by more than round-off."""
    return value > limit + _ROUND_OFF


def reaches(value, limit):
    """Return whether the value lies at or above the limit, give or take round-off."""
    return value >= limit - _ROUND_OFF


def within(value, low, high):
    """Return whether the value lies between the limits, both included, give or take round-off."""
    return reaches(value, low) and reaches(high, value)


def or_nan(function, *values):
    """Return function(*values) as a float, NaN where a value lies outside the range of its equation."""
    try:
        return float(function(*values))
    except OutOfRangeError:
        return nan


def shown(value, digits):
    """Return the value with so many decimals, never as -0.0."""
    return f"{value:z.{digits}f}"
