"""Whether a reading lies between two passing checks of its meter."""

import itertools
import math
from dataclasses import dataclass

import numpy as np

from calc.errors import CalcError
from calc.findings import Finding, exceeds, known
from calc.settings import Settings

KINDS = ("as_found", "adjusted", "read_back", "field", "zero", "end_of_day", "after_cleaning")

_AFTER_READINGS = ("end_of_day", "after_cleaning")
_CLOSING = ("as_found", "field", "end_of_day", "read_back")
# Checks typed with the same minute, in the order in which they are made.
_ORDER = ("as_found", "field", "end_of_day", "after_cleaning", "adjusted", "read_back", "zero")
_DEFAULTS = Settings()


@dataclass(frozen=True)
class MeterCheckTime:
    """One check of a meter, as much of it as bracketing needs.

    Attributes
    ----------
    at_h : float
        When, on the axis of the readings. [h]
    kind : str
        One of KINDS.
    passes : bool or None
        None, where it can't be told, counts as not passing.
    correctable, reportable : bool
        As in CheckVerdict.
    closes : bool, optional
        Whether the readings before it stand, as in CheckVerdict; where missing, whether it passes.

    Raises
    ------
    CalcError
        If the kind is another.
    """

    at_h: float
    kind: str
    passes: bool | None
    correctable: bool = False
    reportable: bool = True
    closes: bool | None = None

    def __post_init__(self):
        if self.kind not in KINDS:
            raise CalcError(f"kind must be one of {', '.join(KINDS)}, got {self.kind!r}")

    @classmethod
    def of(cls, at_h, kind, verdict):
        """Return the check that was made at a time and judged so."""
        return cls(at_h, kind, verdict.passes, verdict.correctable, verdict.reportable, verdict.closes)


@dataclass(frozen=True)
class Bracket:
    """Whether a reading lies between two passing checks; before and after are places in the checks, or None.

    state is "bracketed", "drift" (the check after asks for a correction), "not_reportable", "no_check_before",
    "check_before_failed", "no_check_after" or "check_after_failed".
    """

    state: str
    before: int | None
    after: int | None


def bracket(time_h, checks, settings=_DEFAULTS):
    """Return whether a reading lies between two passing checks, and between which.

    Parameters
    ----------
    time_h : float
        Time of the reading. [h] Where missing, there is no check before it.
    checks : sequence of MeterCheckTime
        The checks of one meter and one parameter, in any order. Those of kind zero, and those without a time, are
        passed over; checks in zero solution of another kind are to be left out.
    settings : Settings
        For bracket_longest_h, which neither check may be further from the reading, nor from the other check.

    Returns
    -------
    Bracket

    Notes
    -----
    Before: the latest check at or before the reading, whatever its kind. A meter found wrong, adjusted and read back
    is right from then on; found wrong and left so, it is not. After: the first check as found, field, end of day or
    read back later than the reading. So the next morning's check as found closes a day that had no end check, and a
    failed one speaks against the readings before it, even if the meter is then put right.

    A meter that is adjusted or cleaned before it is checked can't tell any more what it would have read: such a check
    comes too late for the readings before it, and they have no check after.

    In the same minute as a reading, checks at the end of day and after cleaning count as after it, a field check as
    both, the others as before.
    """
    return brackets((time_h,), checks, settings)[0]


def brackets(times_h, checks, settings=_DEFAULTS):
    """Return the Bracket of each of many readings, as bracket does for one, with the checks put in order once."""
    timed = [(*known(check.at_h), place) for place, check in enumerate(checks) if check.kind != "zero"]
    order = sorted((at, _ORDER.index(checks[place].kind), place) for at, place in timed if not math.isnan(at))
    starts = [at for at, _, _ in order]
    times = known(*times_h)
    firsts = np.searchsorted(starts, times, side="left").tolist()
    return [
        Bracket("no_check_before", None, None) if math.isnan(time) else _bracket(time, order, first, checks, settings)
        for time, first in zip(times, firsts, strict=True)
    ]


def _bracket(time, order, first, checks, settings):
    """Return the bracket of a reading; first is the place in the order of the first check not before it."""
    before, after = _check_before(time, order, first, checks), _check_after(time, order, first, checks)
    longest = settings.bracket_longest_h
    if before is not None and exceeds(time - checks[before].at_h, longest):
        before = None
    if after is not None and exceeds(checks[after].at_h - (time if before is None else checks[before].at_h), longest):
        after = None
    if before is None:
        state = "no_check_before"
    elif checks[before].passes is not True:
        state = "check_before_failed"
    elif after is None:
        state = "no_check_after"
    else:
        state = _state_after(checks[after])
    return Bracket(state, before, after)


def _check_before(time, order, first, checks):
    before = order[first - 1][2] if first else None
    for at, _, place in itertools.islice(order, first, None):
        if at > time:
            break
        if checks[place].kind not in _AFTER_READINGS:
            before = place
    return before


def _check_after(time, order, first, checks):
    for at, _, place in itertools.islice(order, first, None):
        kind = checks[place].kind
        if at == time and kind not in ("field", *_AFTER_READINGS):
            continue
        # Adjusted or cleaned before it was checked, it can't tell.
        return place if kind in _CLOSING else None
    return None


def _state_after(check):
    closes = check.passes if check.closes is None else check.closes
    if closes is True:
        return "bracketed"
    if not check.reportable:
        return "not_reportable"
    return "drift" if check.correctable else "check_after_failed"


_CHECK_NOW = "Check the meter now, as found, before it is cleaned or adjusted."
_FINDINGS = {
    "no_check_before": (
        "not_bracketed",
        "No meter check was made in time before this reading.",
        "The day began without a check, or the check was kept for another meter or with another time.",
        "Enter the check if it was made. If not, the reading stays questionable.",
    ),
    "check_before_failed": (
        "not_bracketed",
        "The last meter check before this reading did not pass.",
        "The meter was not adjusted, or not read back after it was.",
        "Adjust the meter and read it back before the next reading. This one stays questionable.",
    ),
    "no_check_after": (
        "not_bracketed",
        "No meter check follows in time that tells whether the meter still read right.",
        "The day is not closed yet, or the meter was adjusted or cleaned before it was checked.",
        _CHECK_NOW,
    ),
    "check_after_failed": (
        "not_bracketed",
        "The first meter check after this reading did not pass.",
        "The meter drifted or was knocked, the sensor is fouled, or the check was not done well.",
        "Repeat the check. If it stays, the reading stays questionable.",
    ),
    "drift": (
        "drift_uncorrected",
        "The meter drifted by more than may stay, as the check after this reading shows.",
        "The sensor aged or fouled between the two checks.",
        "Look at the correction that the two checks give, and apply it or say why not.",
    ),
    "not_reportable": (
        "not_reportable",
        "The check after this reading is so far off that the reading is not to be reported.",
        "The sensor failed, was fouled or dried out, or the check was not done well.",
        "Repeat the check. If it stays, set the reading aside.",
    ),
}


def bracket_finding(bracket):
    """Return a finding when a reading does not lie between two passing checks; none for None."""
    if bracket is None or bracket.state == "bracketed":
        return ()
    name, *sentences = _FINDINGS[bracket.state]
    return (Finding(name, "do_mg_l", *sentences),)
