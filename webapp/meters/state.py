"""How each meter stands now: ready or not, what it is due for, and which check comes next in the trade's order."""

import math
from dataclasses import dataclass
from datetime import date, timedelta

from calc.findings import Finding
from calc.quality_due import recheck_due, thermometer_due, zero_check_due
from webapp.meters.asking import same_day
from webapp.meters.words import SHORT_KINDS, value_text
from webapp.models import Meter
from webapp.readings.layers import final

ENDS_THE_DAY = ("end_of_day", "after_cleaning")
# Readings older than this, before the meter's last one, are of another day.
DAY = timedelta(hours=24)
# How far back from the last reading of a survey its meters are looked at: a longer time no check closes any more.
LATELY = timedelta(hours=72)

# Checks typed with the same minute, in the order in which they are made.
SAME_MINUTE = ("as_found", "field", "end_of_day", "after_cleaning", "adjusted", "read_back", "zero")


@dataclass(frozen=True)
class MeterState:
    """A meter as it stands.

    ready is None out of service. says is the sentence, lines what else is open, due the findings on checks that are
    due. last is its latest oxygen check (a JudgedCheck) other than in zero solution, whenever that was; unclosed are
    the readings since, which no check closes yet. next_kind is the check that comes next.
    """

    meter: Meter
    ready: bool | None
    says: str
    lines: tuple[str, ...]
    due: tuple[Finding, ...]
    last: object
    unclosed: tuple
    next_kind: str


def meter_states(show, meters, judged, readings, settings, now, lowest_mg_l=None):
    """Return the MeterState of each meter; two rows of one name are one meter.

    judged are all JudgedChecks of the survey in_order, readings at least its Readings LATELY, lowest_mg_l the lowest
    oxygen it expects.
    """
    named = {}
    for meter in meters:
        named.setdefault(meter.name.casefold(), meter)
    used = readings_by_meter(readings, named)
    return [
        _state(
            show,
            meter,
            [one for one in judged if not one.set_aside and one.check.meter.name.casefold() == name],
            used.get(name, []),
            settings,
            now,
            lowest_mg_l,
        )
        for name, meter in named.items()
    ]


def in_order(judged):
    """Return JudgedChecks in the order they were made: those of one minute in the order of the trade."""
    return sorted(judged, key=lambda one: (one.check.checked_at, SAME_MINUTE.index(one.check.kind), one.check.id))


def readings_by_meter(readings, names):
    """Return the readings that count and have oxygen, by their meter's name in small letters.

    Without a name they belong to the only meter there is, where there is just one. Of each meter those of its last day.
    """
    only = next(iter(names)) if len(names) == 1 else ""
    found = {}
    for one in readings:
        found.setdefault(one.meter.casefold() or only, []).append(one)
    return {name: _of_last_day(some) for name, some in found.items()}


def _of_last_day(readings):
    since = max(one.taken_at for one in readings) - DAY
    return [
        one
        for one in readings
        if one.taken_at >= since and not (now := final(one)).set_aside and now.do_mg_l is not None
    ]


def unregistered(meters, names):
    """Return the names of meters that readings were taken with and the register does not know."""
    read_with = {name.casefold(): name for name in names}
    return sorted(read_with[name] for name in read_with.keys() - {one.name.casefold() for one in meters})


def _state(show, meter, checks, readings, settings, now, lowest_mg_l):
    last = last_oxygen(checks)
    unclosed = unclosed_since(last, readings)
    today = last if last is not None and _counts_today(show, last.check, now) else None
    ready, says, next_kind = _stands(show, today, last, unclosed, now)
    due = _due(show, meter, checks, today, readings, settings, now, lowest_mg_l)
    if ready and any(one.name == "zero_check_due" for one in due) and not unclosed:
        next_kind = "zero"
    if meter.out_of_service:
        ready, says, due = None, "Out of service.", ()
    return MeterState(meter, ready, says, _lines(show, checks, unclosed, ready), due, last, unclosed, next_kind)


def last_oxygen(checks):
    """Return the latest oxygen check that brackets readings, None where there is none."""
    return next((one for one in reversed(checks) if one.check.parameter == "do" and not one.of_zero), None)


def unclosed_since(last, readings):
    """Return the readings after the last check, as a tuple: nothing tells yet whether the meter still read right."""
    return tuple(one for one in readings if last is None or one.taken_at > last.check.checked_at)


def _counts_today(show, check, now):
    of_today = show.local(check.checked_at).date() == show.local(now).date()
    return of_today or (check.kind not in ENDS_THE_DAY and same_day(show, check.checked_at, now))


def _stands(show, today, last, unclosed, now):
    """Return (ready, sentence, next kind) of a meter in service; next is the one in the trade's order."""
    if today is None:
        if unclosed and last is not None:
            since = show.when(last.check.checked_at, now)
            return False, f"End check missing since {since}: check it as found, before anything else.", "as_found"
        return False, "No check yet today: check it as found first.", "as_found"
    check, verdict, at = today.check, today.verdict, show.when(today.check.checked_at, now)
    if check.action == "withdrawn":
        return False, f"Taken out of use at {at}.", "as_found"
    if check.kind == "adjusted" or (check.action == "adjusted" and check.kind in ("as_found", "field")):
        return False, f"Adjusted at {at}: read it back.", "read_back"
    if verdict.passes is None:
        return False, f"The check at {at} can't be judged: repeat it.", check.kind
    what = f"{SHORT_KINDS[check.kind].lower()} {off(show, today)} at {at}"
    if check.kind in ENDS_THE_DAY:
        word = "Closed" if verdict.closes else "Off"
        graded = f", grade {verdict.grade}" if verdict.grade else ""
        return bool(verdict.closes), f"{word}: {what}{graded}.", _after_the_end(check, verdict)
    if verdict.passes:
        return True, f"Ready: {what}.", "field"
    return False, f"Not ready: {what}. Adjust it, then read it back.", "adjusted"


def _after_the_end(check, verdict):
    if check.kind == "after_cleaning":
        return "as_found"
    return "after_cleaning" if verdict.closes else "zero"


def off(show, judged):
    """Return how far a check was off, in words: "0.05 mg/L low", "exactly right"."""
    verdict, check = judged.verdict, judged.check
    size = value_text(show, check.parameter, abs(verdict.error))
    if float(size.split()[0].replace("–", "0")) == 0:
        return "exactly right"
    return f"{size} {'high' if verdict.error > 0 else 'low'}"


def _lines(show, checks, unclosed, ready):
    """Return what else is open: readings that no check closes, and other sensors of the meter that did not pass."""
    lines = []
    if unclosed and ready is not None:
        many = "1 reading waits" if len(unclosed) == 1 else f"{len(unclosed)} readings wait"
        lines.append(f"{many} for a check after: questionable until then.")
    for parameter in ("temperature", "conductance", "ph"):
        latest = next((one for one in reversed(checks) if one.check.parameter == parameter), None)
        if latest is not None and latest.verdict.passes is False:
            lines.append(f"{show.day_clock(latest.check.checked_at)}: {latest.verdict.says}")
    return tuple(lines)


def _due(show, meter, checks, today, readings, settings, now, lowest_mg_l):
    found = []
    if today is not None and today.check.kind not in ENDS_THE_DAY and today.verdict.passes:
        found += _recheck(show, meter, today.check, readings, settings, now)
    found += zero_check_due(_days_since(now, checks, lambda one: one.of_zero), _or_nan(lowest_mg_l), settings)
    compared = _days_since(now, checks, lambda one: one.check.standard == "reference_thermometer")
    return tuple(found) + tuple(thermometer_due(compared, settings))


def _recheck(show, meter, check, readings, settings, now):
    """Return the finding that conditions moved since a check: up to now, or as the latest reading after it shows."""
    since = [one for one in readings if one.taken_at > check.checked_at]
    latest = since[-1] if since else None
    changed = _parsed(meter.cap_changed_on)
    disturbed = changed is not None and changed > show.local(check.checked_at).date()
    return recheck_due(
        (now - check.checked_at).total_seconds() / 3600,
        math.nan,  # the survey has one elevation
        _change(latest, check, "pressure_mmhg") if _both_measured(latest, check) else math.nan,
        _change(latest, check, "water_temp_c"),
        settings,
        disturbed=disturbed or check.action == "cap_changed",
    )


def _both_measured(latest, check):
    return latest is not None and "standard" not in (latest.pressure_source, check.pressure_source)


def _change(latest, check, name):
    if latest is None or getattr(latest, name) is None or getattr(check, name) is None:
        return math.nan
    return getattr(latest, name) - getattr(check, name)


def _days_since(now, checks, wanted):
    """Return the days since the latest check of a kind; infinity where there never was one."""
    latest = next((one for one in reversed(checks) if wanted(one)), None)
    return math.inf if latest is None else (now - latest.check.checked_at).total_seconds() / 86400


def _or_nan(value):
    return math.nan if value is None else value


def _parsed(text):
    try:
        return date.fromisoformat(text)
    except ValueError:
        return None
