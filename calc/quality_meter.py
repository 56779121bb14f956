"""Checks of a meter: what it should read, and whether it does.

The names of calc.quality_bracket and calc.quality_due, which build on it, can be had from here as well.
"""

import math
from dataclasses import dataclass

from calc.errors import CalcError
from calc.findings import exceeds, known, or_nan, shown
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.quality_bracket import KINDS, Bracket, MeterCheckTime, bracket, bracket_finding, brackets
from calc.quality_drift import DO_NOT_REPORT, drift_limit, grade
from calc.quality_due import (
    calibration_missing,
    meter_in_two_places,
    outside_standards,
    recheck_due,
    standard_expired,
    thermometer_differs,
    thermometer_due,
    winkler_pair,
    zero_check_due,
)
from calc.quality_series import PARAMETERS

__all__ = [
    "KINDS",
    "PARAMETERS",
    "STANDARDS",
    "Bracket",
    "CheckVerdict",
    "MeterCheckTime",
    "bracket",
    "bracket_finding",
    "brackets",
    "calibration_missing",
    "check_verdict",
    "expected_value",
    "meter_in_two_places",
    "outside_standards",
    "recheck_due",
    "standard_expired",
    "thermometer_differs",
    "thermometer_due",
    "winkler_pair",
    "zero_check_due",
]

STANDARDS = (
    "air_saturated_water",
    "water_saturated_air",
    "zero_solution",
    "winkler",
    "second_meter",
    "reference_thermometer",
    "conductance_standard",
    "ph_buffer",
)


def expected_value(
    standard, *, water_temp_c=math.nan, pressure_mmhg=math.nan, conductance_us_cm=math.nan, compared=math.nan
):
    """Return what a meter should read in a standard; NaN where it can't be told.

    Parameters
    ----------
    standard : str
        One of STANDARDS.
    water_temp_c, pressure_mmhg, conductance_us_cm : float
        Temperature of the standard, air pressure at the station, and specific conductance of the standard; without
        conductance it is fresh. [°C, mmHg, µS/cm at 25 °C] Used for the two standards made with air.
    compared : float
        The other value: titration, second meter, thermometer, or what the standard's label says. [the parameter's]

    Returns
    -------
    float
        Saturation for the two standards made with air, 0 for zero solution, else the other value. [mg/L or the
        parameter's]

    Raises
    ------
    CalcError
        If the standard is another.
    """
    _require("standard", standard, STANDARDS)
    water_temp, pressure, conductance, compared = known(water_temp_c, pressure_mmhg, conductance_us_cm, compared)
    if standard == "zero_solution":
        return 0.0
    if standard not in ("air_saturated_water", "water_saturated_air"):
        return compared
    # Air over water holds no salt: a probe in it reads as in fresh water.
    fresh = standard == "water_saturated_air" or math.isnan(conductance)
    return or_nan(saturation_mg_l, water_temp, pressure, 0.0 if fresh else or_nan(salinity_psu, conductance))


@dataclass(frozen=True)
class CheckVerdict:
    """What a check says of a meter.

    Attributes
    ----------
    error, error_percent : float
        Reading less expected, and its share of what is expected; NaN where that is 0 or not known.
    limit : float
        Largest error that passes, in the parameter's unit.
    passes : bool or None
        None where it can't be told.
    grade : str
        One of calc.quality_drift.GRADES for a check that ends a day; else empty.
    correctable : bool
        The error is beyond the drift limit, yet small enough for the readings before to be corrected and reported.
    says : str
        All that as one plain sentence.
    reportable : bool
        False where the error is beyond what is reported at all.
    closes : bool or None
        Whether readings taken before this check stand as they are: the error is within the drift limit, which for
        oxygen is wider than what passes before the first station.
    """

    error: float
    error_percent: float
    limit: float
    passes: bool | None
    grade: str
    correctable: bool
    says: str
    reportable: bool = True
    closes: bool | None = None


def check_verdict(parameter, kind, standard, expected, reading, settings):
    """Return what a check says of a meter.

    Parameters
    ----------
    parameter, kind, standard : str
        Of calc.quality_series.PARAMETERS, KINDS and STANDARDS.
    expected, reading : float
        Value expected, from expected_value, and what the meter read. [mg/L, °C, µS/cm or pH]
    settings : Settings

    Returns
    -------
    CheckVerdict

    Raises
    ------
    CalcError
        If parameter, kind or standard is none of these.
    """
    _require("parameter", parameter, PARAMETERS)
    _require("kind", kind, KINDS)
    _require("standard", standard, STANDARDS)
    expected, reading = known(expected, reading)
    zero = kind == "zero" or standard == "zero_solution"
    error = reading - expected
    percent = 100 * error / expected if expected > 0 else math.nan
    limit = _limit(parameter, kind, standard, expected, zero, settings)
    unknown = math.isnan(error)
    graded = "" if zero else grade(error, expected, settings, parameter)
    drifted = not zero and exceeds(abs(error), drift_limit(expected, settings, parameter))
    return CheckVerdict(
        error=error,
        error_percent=percent,
        limit=limit,
        passes=None if unknown else not exceeds(abs(error), limit),
        grade=graded if kind in ("end_of_day", "after_cleaning") else "",
        correctable=drifted and graded != DO_NOT_REPORT,
        says=_says(parameter, expected, reading, percent, limit),
        reportable=not drifted or graded != DO_NOT_REPORT,
        closes=None if unknown or zero else not drifted,
    )


def _limit(parameter, kind, standard, expected, zero, settings):
    if kind in ("end_of_day", "after_cleaning") and not zero:
        return drift_limit(expected, settings, parameter)
    # max keeps its first value against NaN: without the expected value the fixed limit counts.
    if parameter != "do":
        conductance = max(settings.conductance_check_us_cm, settings.conductance_check_percent / 100 * expected)
        limits = {"temperature": settings.thermometer_c, "conductance": conductance, "ph": settings.ph_check}
        return limits[parameter]
    if zero:
        return settings.zero_mg_l
    if standard in ("winkler", "second_meter"):
        return settings.second_method_mg_l
    if kind == "field":
        return settings.field_check_mg_l
    return max(settings.check_mg_l, settings.check_percent / 100 * expected)


def _says(parameter, expected, reading, percent, limit):
    unit, digits = {"do": (" mg/L", 2), "temperature": (" °C", 2), "conductance": (" µS/cm", 0), "ph": ("", 2)}[
        parameter
    ]
    error = reading - expected
    if math.isnan(error):
        return "This check can't be judged: the reading or the value expected is not known."
    # A difference of temperatures is told as warmer or colder: so it can be told in °F as well.
    high, low = ("warmer", "colder") if parameter == "temperature" else ("high", "low")
    either = " warmer or colder" if parameter == "temperature" else ""
    share = "" if math.isnan(percent) or parameter in ("temperature", "ph") else f" ({shown(abs(percent), 1)} %)"
    verdict = "more than" if exceeds(abs(error), limit) else "within"
    off = f"{shown(abs(error), digits)}{unit} {high if error > 0 else low}{share}"
    if float(shown(abs(error), digits)) == 0:
        off = "exactly right"
    return (
        f"{shown(reading, digits)}{unit} where {shown(expected, digits)}{unit} is expected: {off}, {verdict} the "
        f"{shown(limit, max(digits, 1))}{unit}{either} that passes."
    )


def _require(name, value, allowed):
    if value not in allowed:
        raise CalcError(f"{name} must be one of {', '.join(allowed)}, got {value!r}")
