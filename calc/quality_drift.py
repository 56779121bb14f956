"""How far a sensor drifted between two checks: its grade, and the correction that grows from one check to the other."""

import math
from dataclasses import dataclass

from calc.errors import CalcError
from calc.findings import exceeds, known, shown
from calc.quality_series import PARAMETERS

GRADES = ("excellent", "good", "fair", "poor", "do not report")
DO_NOT_REPORT = GRADES[-1]


def grade(error, expected, settings, parameter="do"):
    """Return the grade of the readings that a check closes.

    Parameters
    ----------
    error : float
        Reading of the check less the value expected, either sign. [mg/L, °C, µS/cm or pH]
    expected : float
        Value expected. Its share counts for oxygen and conductance; for oxygen of 0 only the mg/L limits count.
    settings : Settings
        With grade_both_limits (1) a grade must hold in mg/L and in percent; with 0 the larger of the two allowances
        counts. In air-saturated water of 9 mg/L, 5 % allow more than 0.3 mg/L: too lax where the river holds little.
    parameter : str
        One of calc.quality_series.PARAMETERS.

    Returns
    -------
    str
        One of GRADES; empty where the error, or the value it is a share of, is not known.

    Raises
    ------
    CalcError
        If the parameter is another.
    """
    error, expected = known(error, expected)
    error, expected = abs(error), abs(expected)
    if parameter not in PARAMETERS:
        raise CalcError(f"parameter must be one of {', '.join(PARAMETERS)}, got {parameter!r}")
    share = 100 * error / expected if expected > 0 else math.nan
    if parameter == "conductance":
        return _graded(share, _limits(settings, "conductance_percent"))
    if parameter != "do":
        return _graded(error, _limits(settings, {"temperature": "c", "ph": "ph"}[parameter]))
    if math.isnan(expected):
        return ""
    amounts, shares = _limits(settings, "mg_l"), _limits(settings, "percent")
    if exceeds(settings.grade_both_limits, 0):
        return max(_graded(error, amounts), _graded(share, shares), key=("", *GRADES).index)
    return _graded(error, [max(one, part / 100 * expected) for one, part in zip(amounts, shares, strict=True)])


def _limits(settings, unit):
    return [getattr(settings, f"grade_{name}_{unit}") for name in ("excellent", "good", "fair", "report")]


def _graded(size, limits):
    if math.isnan(size):
        return ""
    return GRADES[sum(exceeds(size, limit) for limit in limits)]


def drift_limit(expected, settings, parameter="do"):
    """Return the error above which a drift is corrected, in the parameter's unit.

    For conductance a share of the expected value counts where it is larger.
    """
    (expected,) = known(expected)
    return {
        "do": settings.drift_mg_l,
        "temperature": settings.drift_c,
        # max keeps its first value against NaN: without the expected value the fixed limit counts.
        "conductance": max(settings.drift_conductance_us_cm, settings.drift_conductance_percent / 100 * expected),
        "ph": settings.drift_ph,
    }[parameter]


@dataclass(frozen=True)
class DriftCorrection:
    """A correction that grows in a straight line from nothing at one check to what the next check asks for.

    Attributes
    ----------
    method : str
        "ratio" (the slope moved), "two_point" (slope and zero moved), or "offset" (for temperature and pH, whose zero
        is no natural one).
    start_h, end_h : float
        Times of the two checks. [h]
    scale_end, shift_end : float
        At the end: corrected = scale · value + shift.
    says : str
        What is done, with its numbers, in plain sentences.
    """

    method: str
    start_h: float
    end_h: float
    scale_end: float
    shift_end: float
    says: str

    def at(self, time_h):
        """Return (scale, shift) at a time, so that corrected = scale · value + shift; None outside the two checks."""
        (time,) = known(time_h)
        if not self.start_h <= time <= self.end_h:
            return None
        part = (time - self.start_h) / (self.end_h - self.start_h)
        return 1 + part * (self.scale_end - 1), part * self.shift_end


def drift_correction(start_h, end_h, expected, reading, zero_reading, settings, parameter="do"):
    """Return the correction of the readings between two checks; None where there is to be none.

    Parameters
    ----------
    start_h, end_h : float
        Time of the check before, after which the meter was right, and of the check after. [h]
    expected, reading : float
        Value expected at the check after, and what the meter read. [mg/L, °C, µS/cm or pH]
    zero_reading : float
        Reading in zero solution at the check after; NaN where none was made. Used for oxygen. [mg/L]
    settings : Settings
    parameter : str
        One of calc.quality_series.PARAMETERS.

    Returns
    -------
    DriftCorrection or None
        None where the error is within the drift limit, beyond the limit of what is reported, or not known, and where
        the times or the readings make no correction.

    Raises
    ------
    CalcError
        If the parameter is none of these.

    Notes
    -----
    Linear in time, as in USGS Techniques and Methods 1-D3. Only the saturated check moved: a ratio, expected over
    reading, so that zero stays zero. Zero moved too: the straight line through both checks.
    """
    start, end, expected, reading, zero = known(start_h, end_h, expected, reading, zero_reading)
    error = reading - expected
    graded = grade(error, expected, settings, parameter)
    if graded in ("", DO_NOT_REPORT) or not exceeds(abs(error), drift_limit(expected, settings, parameter)):
        return None
    if not start < end:
        return None
    if parameter in ("temperature", "ph"):
        says = f"Offset, linear in time: nothing at the check before, {-error:+.2f} at the check after."
        return DriftCorrection("offset", start, end, 1.0, -error, says)
    moved = parameter == "do" and exceeds(abs(zero), settings.zero_mg_l)
    span = reading - zero if moved else reading
    if not (expected > 0 and span > 0):
        return None
    scale = expected / span
    if moved:
        shift = -scale * zero
        says = f"Two points, linear in time: ×1 at the check before, ×{scale:.3f} {shift:+.2f} mg/L at the check after."
        return DriftCorrection("two_point", start, end, scale, shift, f"{says} Zero read {shown(zero, 2)} mg/L.")
    says = f"Ratio, linear in time: ×1 at the check before, ×{scale:.3f} at the check after."
    return DriftCorrection("ratio", start, end, scale, 0.0, says + _zero_says(zero, parameter))


def _zero_says(zero, parameter):
    if parameter != "do":
        return ""
    if math.isnan(zero):
        return " No zero check was made: zero is taken as unmoved."
    return f" The zero check passed at {shown(zero, 2)} mg/L."
