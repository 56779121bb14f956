"""Checks on the air pressure: the barometer trap, unit slips, and pressure against elevation."""

import math
from functools import lru_cache

from calc.findings import Finding, exceeds, known, or_nan, shown, within
from calc.oxygen import saturation_mg_l, standard_pressure_mmhg, station_pressure_mmhg
from calc.units import UNITS, from_si, to_si

_USUAL_WATER_TEMP_C = 20.0


@lru_cache(maxsize=64)
def _standard_mmhg(elevation_m):
    """Return the standard pressure, NaN where it can't be told; a survey asks for the same one with each reading."""
    return or_nan(standard_pressure_mmhg, elevation_m)


def sea_level_pressure(pressure_mmhg, elevation_m, water_temp_c, settings, *, source="", unit="mm[Hg]"):
    """Return a finding when a pressure looks reduced to sea level, with its effect on saturation.

    Parameters
    ----------
    pressure_mmhg : float
        Pressure as entered, converted. [mmHg]
    elevation_m : float
        Elevation of the station. [m]
    water_temp_c : float
        Temperature the effect is told for; 20 where unknown. [°C]
    settings : Settings
    source : str
        "meter", "barometer", "weather" or "none". A weather value is meant to be at sea level: no finding.
    unit : str
        UCUM code of the unit as entered, for the sentences.

    Returns
    -------
    tuple of Finding
        Its suggestion keeps the entry and names it a weather value, so that both values stay on record.
    """
    pressure, elevation, water_temp = known(pressure_mmhg, elevation_m, water_temp_c)
    excess = pressure - _standard_mmhg(elevation)
    looks_so = within(pressure, settings.sea_level_low_mmhg, settings.sea_level_high_mmhg) and exceeds(
        elevation, settings.sea_level_elevation_m
    )
    if source == "weather" or not looks_so or not exceeds(excess, settings.sea_level_excess_mmhg):
        return ()
    here = or_nan(station_pressure_mmhg, pressure, elevation)
    at = f"{shown(elevation, 0)} m"
    if exceeds(settings.sea_level_firm_elevation_m, elevation):
        says, do = f"{_entered(pressure, unit)} at {at} may be a sea-level pressure.", "If so, mark"
    else:
        says, do = f"{_entered(pressure, unit)} at {at} is a sea-level pressure: too high for weather alone.", "Mark"
    return (
        Finding(
            name="sea_level_pressure",
            field="pressure_value",
            says=says + _effect(pressure, here, water_temp),
            cause=_sea_level_cause(source),
            do=f"{do} it as a weather value: {_entered(here, unit)} is then used here, and both are kept.",
            suggestion={"pressure_source": "weather"},
        ),
    )


def _effect(pressure, here, water_temp):
    if math.isnan(or_nan(saturation_mg_l, water_temp)):
        water_temp = _USUAL_WATER_TEMP_C
    too_high = or_nan(saturation_mg_l, water_temp, pressure) - or_nan(saturation_mg_l, water_temp, here)
    if math.isnan(too_high):
        return ""
    return f" Used as it is, it reads saturation {shown(too_high, 2)} mg/L too high at {shown(water_temp, 1)} °C."


def _sea_level_cause(source):
    if source == "meter":
        return "The meter's barometer may be set to sea level. Then its oxygen calibration is off as well."
    return "Weather reports, airports and many phones give pressure reduced to sea level."


def pressure_unit(pressure_value, unit, elevation_m, settings):
    """Return a finding when a pressure only makes sense in a unit other than the one claimed.

    Parameters
    ----------
    pressure_value : float
        Pressure as entered, in the unit claimed.
    unit : str
        UCUM code of the unit claimed.
    elevation_m : float
        Elevation of the station; high up it decides where the usual ranges can't. NaN where unknown. [m]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    value, elevation = known(pressure_value, elevation_m)
    standard = _standard_mmhg(elevation)
    if _is_usual(value, unit, standard, settings):
        return ()
    other = _unit_by_range(value, unit, settings) or _unit_by_elevation(value, unit, standard, settings)
    if other is None:
        return ()
    label = UNITS[other].label
    return (
        Finding(
            name="pressure_unit",
            field="pressure_value",
            says=f"{_number(value)} looks like {label}, not {_label(unit)}.",
            cause="The instrument shows another unit than the one chosen here.",
            do=f"If so, choose {label}: that is {shown(float(to_si(value, other)), 0)} mmHg.",
            suggestion={"pressure_value": value, "pressure_unit": other},
        ),
    )


def _unit_by_range(value, unit, settings):
    ranges = {
        "[in_i'Hg]": (settings.inhg_low, settings.inhg_high),
        "hPa": (settings.hpa_low, settings.hpa_high),
        "mbar": (settings.hpa_low, settings.hpa_high),
        "kPa": (settings.hpa_low / 10, settings.hpa_high / 10),
        "mm[Hg]": (settings.mmhg_low, settings.mmhg_high),
    }
    if unit not in ranges or within(value, *ranges[unit]):
        return None
    return next((other for other, limits in ranges.items() if within(value, *limits)), None)


def _unit_by_elevation(value, unit, standard, settings):
    """Return the unit in which the value is usual at the station's elevation. A claimed unit not known stays."""
    if unit not in UNITS:
        return None
    candidates = ("mm[Hg]", "hPa", "[in_i'Hg]")
    return next((other for other in candidates if _is_usual(value, other, standard, settings)), None)


def _is_usual(value, unit, standard, settings):
    """Return whether the value in this unit lies as near to the standard pressure as weather leaves it."""
    if unit not in UNITS:
        return False
    return within(abs(value * UNITS[unit].factor - standard), 0, settings.pressure_departure_mmhg)


def pressure_against_elevation(pressure_mmhg, elevation_m, settings):
    """Return a finding when the station pressure is further from standard than weather moves it.

    Parameters
    ----------
    pressure_mmhg : float
        Station pressure used. [mmHg]
    elevation_m : float
        Elevation of the station. [m]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    pressure, elevation = known(pressure_mmhg, elevation_m)
    standard = _standard_mmhg(elevation)
    if not exceeds(abs(pressure - standard), settings.pressure_departure_mmhg):
        return ()
    side = "above" if pressure > standard else "below"
    return (
        Finding(
            name="pressure_against_elevation",
            field="pressure_value",
            says=f"Station pressure {shown(pressure, 0)} mmHg is {shown(abs(pressure - standard), 0)} mmHg {side} "
            f"the {shown(standard, 0)} mmHg that is standard at {shown(elevation, 0)} m.",
            cause="A digit, the unit, the source of the pressure or the elevation of the station is wrong. "
            f"Weather seldom moves it by more than {settings.pressure_departure_mmhg:g} mmHg.",
            do="Read the barometer again. Check the station's elevation, and whether a weather value was meant.",
        ),
    )


def _entered(pressure_mmhg, unit):
    """Return a pressure in the unit the crew entered."""
    if unit not in UNITS or UNITS[unit].quantity != "pressure":
        unit = "mm[Hg]"
    digits = {"[in_i'Hg]": 2, "kPa": 1, "atm": 3}.get(unit, 0)
    return f"{shown(float(from_si(pressure_mmhg, unit)), digits)} {UNITS[unit].label}"


def _label(unit):
    return UNITS[unit].label if unit in UNITS else unit


def _number(value):
    return f"{value:.6g}"
