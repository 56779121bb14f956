"""Drift corrections: which readings the checks on either side of them ask to move, and what was applied of that."""

import hashlib
import json
import math
from dataclasses import dataclass

from calc.quality_drift import DO_NOT_REPORT, DriftCorrection, drift_correction, grade
from webapp.meters.verdicts import JudgedCheck, hours
from webapp.readings.layers import FinalReading
from webapp.readings.surroundings import OCCASION

ASKING = ("drift", "not_reportable")
_SAME = 1e-9


@dataclass(frozen=True)
class DriftLine:
    """One reading between two checks: oxygen before and after the correction offered; after is None without one.

    applied is the event of the correction that is in use, or None; matches tells whether that is the one offered.
    """

    reading: FinalReading
    scale: float | None
    shift: float | None
    after_mg_l: float | None
    applied: object
    matches: bool

    @property
    def before_mg_l(self):
        """Return oxygen before any drift correction. [mg/L]"""
        return self.reading.before_drift_mg_l


@dataclass(frozen=True)
class DriftPair:
    """Two checks between which a meter drifted, and the readings between them.

    zero is the check in zero solution beside the check after, or None. grade is that of the readings; correction is
    None where they are not to be reported, or none can be computed.
    """

    meter: str
    start: JudgedCheck
    end: JudgedCheck
    zero: JudgedCheck | None
    grade: str
    correction: DriftCorrection | None
    lines: tuple

    @property
    def state(self):
        """Return "not_reportable", "impossible", "offered", "applied", "changed" or "partly"."""
        if self.correction is None:
            return "not_reportable" if self.grade == DO_NOT_REPORT else "impossible"
        applied = [line for line in self.lines if line.applied is not None]
        if not applied:
            return "offered"
        if any(not line.matches for line in applied):
            return "changed"
        return "applied" if len(applied) == len(self.lines) else "partly"

    @property
    def check_ids(self):
        """Return the ids of the check before and the check after."""
        return self.start.check.id, self.end.check.id

    @property
    def applied_ids(self):
        """Return the ids of the checks that the correction in use rests on, which need not be these."""
        return next((_checks_of(line.applied) for line in self.lines if line.applied is not None), self.check_ids)

    @property
    def open_lines(self):
        """Return the lines that are not corrected as offered."""
        return [line for line in self.lines if not line.matches]

    @property
    def seen(self):
        """Return what tells this offer, and every number in it, from any other."""
        numbers = [
            (line.reading.id, line.before_mg_l, line.scale, line.shift, line.applied.id if line.applied else "")
            for line in self.lines
        ]
        return hashlib.sha256(json.dumps(numbers).encode()).hexdigest()[:16]


@dataclass(frozen=True)
class Applied:
    """A correction in use that today's checks and settings do not ask for; event is one of its events."""

    start_id: str
    end_id: str
    event: object
    readings: tuple


def drift_pairs(judged, checks, settings):
    """Return (DriftPairs, Applied that no pair asks for any more).

    judged are objects with reading, bracket, check_before and check_after; checks every JudgedCheck of the survey.
    """
    between, orphans = {}, {}
    for one in judged:
        if one.reading.before_drift_mg_l is None:
            continue
        if one.bracket is not None and one.bracket.state in ASKING:
            between.setdefault((one.check_before.check.id, one.check_after.check.id), []).append(one)
        elif one.reading.drift is not None:
            orphans.setdefault(_checks_of(one.reading.drift), []).append(one.reading)
    pairs = [_pair(some, checks, settings) for some in between.values()]
    pairs.sort(key=lambda pair: (pair.end.check.checked_at, pair.meter))
    left = [Applied(*key, readings[0].drift, tuple(readings)) for key, readings in orphans.items()]
    return pairs, sorted(left, key=lambda one: (one.event.made_at, one.event.id))


def _pair(some, checks, settings):
    start, end = some[0].check_before, some[0].check_after
    zero = _zero_beside(end, checks)
    expected, read = _known(end.expected), end.check.value
    correction = drift_correction(
        hours(start.check.checked_at),
        hours(end.check.checked_at),
        expected,
        read,
        _known(zero.check.value if zero else None),
        settings,
    )
    lines = [_line(one.reading, start, end, correction) for one in some]
    return DriftPair(
        meter=end.check.meter.name,
        start=start,
        end=end,
        zero=zero,
        grade=grade(read - expected, expected, settings),
        correction=correction,
        lines=tuple(sorted(lines, key=lambda line: (line.reading.taken_at, line.reading.id))),
    )


def _line(reading, start, end, correction):
    moved = correction.at(hours(reading.taken_at)) if correction else None
    if moved is None:
        return DriftLine(reading, None, None, None, reading.drift, False)
    scale, shift = moved
    after = scale * reading.before_drift_mg_l + shift
    return DriftLine(reading, scale, shift, after, reading.drift, _matches(reading.drift, start, end, moved))


def _matches(event, start, end, moved):
    if event is None or _checks_of(event) != (start.check.id, end.check.id):
        return False
    applied = (float(event.particulars["scale"]), float(event.particulars["shift"]))
    return all(math.isclose(*two, rel_tol=_SAME, abs_tol=_SAME) for two in zip(applied, moved, strict=True))


def _checks_of(event):
    return str(event.particulars.get("start_check", "")), str(event.particulars.get("end_check", ""))


def _zero_beside(end, checks):
    """Return the check in zero solution that tells what the meter did at another check: nothing was touched between."""
    own = [
        one
        for one in checks
        if one.check.meter_id == end.check.meter_id and one.check.parameter == "do" and not one.set_aside
    ]
    at = end.check.checked_at
    touched = [one.check.checked_at for one in own if one.check.kind in ("adjusted", "after_cleaning")]
    zeros = [
        one
        for one in own
        if one.of_zero
        and abs(one.check.checked_at - at) <= OCCASION
        and not any(min(at, one.check.checked_at) < then < max(at, one.check.checked_at) for then in touched)
    ]
    return min(zeros, key=lambda one: (abs(one.check.checked_at - at), one.check.id), default=None)


def _known(value):
    return math.nan if value is None else value


def particulars_of(pair, line, batch):
    """Return what an event keeps of a correction: its line, the checks it rests on and how they were judged."""
    return {
        "scale": line.scale,
        "shift": line.shift,
        "method": pair.correction.method,
        "start_check": pair.start.check.id,
        "end_check": pair.end.check.id,
        "zero_check": pair.zero.check.id if pair.zero else "",
        "start_h": pair.correction.start_h,
        "end_h": pair.correction.end_h,
        "expected": pair.end.expected,
        "read": pair.end.check.value,
        "error": pair.end.verdict.error,
        "grade": pair.grade,
        "batch": batch,
    }
