"""The raw values of one reading: have they settled, and what is their median?"""

import math
from dataclasses import dataclass
from statistics import median

from calc.errors import CalcError
from calc.findings import Finding, exceeds, known, shown

PARAMETERS = ("do", "temperature", "conductance", "ph")


@dataclass(frozen=True)
class Stability:
    """Whether the last values of a reading agree.

    Attributes
    ----------
    stable : bool or None
        None where there are fewer values than needed to tell.
    n : int
        How many values are known, the earlier ones included.
    low, high, spread, median : float
        Of the last values, those that are judged; NaN without any. The median is what is reported.
    span_s : float
        From the first to the last of these; NaN where a time is not known. [s]
    why : str
        What is not as it should be, as a plain sentence; empty if stable.
    """

    stable: bool | None
    n: int
    low: float
    high: float
    spread: float
    median: float
    span_s: float
    why: str


def stability(values, after_s, settings, *, parameter="do"):
    """Return whether the last values of a reading are stable.

    Parameters
    ----------
    values : iterable of float
        The raw values in the order they were read. [mg/L, °C, µS/cm or pH] Missing ones are left out.
    after_s : iterable of float or None
        When each was read, since the probe went in. [s] As long as values, or empty or None where nobody timed it;
        where the times of the last values are not all known, only the values are judged.
    settings : Settings
    parameter : str
        One of PARAMETERS.

    Returns
    -------
    Stability

    Raises
    ------
    CalcError
        If the parameter is another, or there are times, but not one for each value.
    """
    if parameter not in PARAMETERS:
        raise CalcError(f"parameter must be one of {', '.join(PARAMETERS)}, got {parameter!r}")
    values = known(*values)
    times = known(*(() if after_s is None else after_s)) or (math.nan,) * len(values)
    if len(times) != len(values):
        raise CalcError(f"after_s must have one time for each value, got {len(times)} for {len(values)}")
    taken = [(value, time) for value, time in zip(values, times, strict=True) if not math.isnan(value)]
    if not taken:
        return Stability(None, 0, *(math.nan,) * 5, "No value was read.")
    needed = max(1, round(settings.stable_values))
    last = [value for value, _ in taken[-needed:]]
    when = [time for _, time in taken[-needed:]]
    span = max(when) - min(when) if not any(map(math.isnan, when)) else math.nan
    why = _too_few(len(taken), needed) or _spread_out(last, parameter, settings) or _too_soon(when, span, settings)
    return Stability(
        stable=None if len(taken) < needed else not why,
        n=len(taken),
        low=min(last),
        high=max(last),
        spread=max(last) - min(last),
        median=float(median(last)),
        span_s=span,
        why=why,
    )


def _too_few(n, needed):
    if n >= needed:
        return ""
    return f"{n} {'value is' if n == 1 else 'values are'} too few to tell: {needed} are needed."


def _spread_out(values, parameter, settings):
    middle = median(values)
    furthest = max(values, key=lambda value: abs(value - middle))
    low_conductance = not exceeds(middle, settings.stable_conductance_low_us_cm)
    percent = settings.stable_conductance_low_percent if low_conductance else settings.stable_conductance_percent
    # A difference of temperatures is told as warmer or colder: so it can be told in °F as well.
    limit, digits, unit, limit_as = {
        "do": (settings.stable_mg_l, 2, " mg/L", f"{settings.stable_mg_l:g} mg/L"),
        "temperature": (settings.stable_c, 2, " °C", f"{settings.stable_c:g} °C warmer or colder"),
        "conductance": (percent / 100 * abs(middle), 0, " µS/cm", f"{percent:g} %"),
        "ph": (settings.stable_ph, 2, "", f"{settings.stable_ph:g}"),
    }[parameter]
    if not exceeds(abs(furthest - middle), limit):
        return ""
    return (
        f"{shown(furthest, digits)}{unit} is further than {limit_as} from the median of the last {len(values)}, "
        f"{shown(middle, digits)}{unit}."
    )


def _too_soon(times, span, settings):
    if math.isnan(span):
        return ""
    if exceeds(settings.soak_s, min(times)):
        return f"The first counts {shown(min(times), 0)} s after the probe went in; {settings.soak_s:g} s are needed."
    if exceeds(settings.stable_span_s, span):
        return f"The last {len(times)} values span {shown(span, 0)} s; {settings.stable_span_s:g} s are needed."
    return ""


def unstable(stability, settings):
    """Return a finding when the values of a reading were still moving; none where too few were taken to tell."""
    if stability is None or stability.stable is not False:
        return ()
    return (
        Finding(
            name="unstable",
            field="do_mg_l",
            says=f"Not stable: {stability.why[0].lower()}{stability.why[1:]}",
            cause="The probe had not settled, bubbles or slack water at the sensor, or water that is not mixed.",
            do=f"Keep the probe still, wait {settings.soak_s:g} s and read {settings.stable_values:g} values again. "
            "If it stays so, save the median and say why.",
        ),
    )
