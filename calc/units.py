"""Units by their UCUM code, exact conversions between them, and the physical constants calc uses.

calc itself holds one unit for each quantity: SI, with °C for temperature, mmHg for air pressure and days for kinetics,
as the trade reads them. Conversion happens once, at the edge.

References
----------
.. [1] G. Schadow and C. J. McDonald, "The Unified Code for Units of Measure", version 2.1, 2017. Codes.
.. [2] B. N. Taylor and A. Thompson, "The International System of Units", NIST SP 330, and NIST SP 811 appendix B, 2008.
   The foot (0.3048 m), the US gallon (231 in³), the pound (0.453 592 37 kg) and the atmosphere (101 325 Pa) are exact.
"""

from dataclasses import dataclass

import numpy as np

from calc.errors import OutOfRangeError

FOOT_M = 0.3048
MILE_M = 5280 * FOOT_M
INCH_M = FOOT_M / 12
GALLON_M3 = 231 * INCH_M**3
POUND_KG = 0.45359237
# One atmosphere is 760 mmHg here, so the mmHg is the torr; the conventional mmHg differs from it by 1.4e-7.
MMHG_PER_ATM = 760.0
HPA_PER_ATM = 1013.25
KELVIN_AT_0_C = 273.15
GRAVITY_M_S2 = 9.80665
SECONDS_PER_DAY = 86400.0


@dataclass(frozen=True)
class Unit:
    """A unit: its UCUM code, its label on screen, the quantity it measures, and value in calc's unit = a·value + b."""

    code: str
    label: str
    quantity: str
    factor: float = 1.0
    offset: float = 0.0


UNITS = {
    unit.code: unit
    for unit in (
        Unit("Cel", "°C", "temperature"),
        Unit("K", "K", "temperature", 1.0, -KELVIN_AT_0_C),
        Unit("[degF]", "°F", "temperature", 5 / 9, -160 / 9),
        Unit("m", "m", "length"),
        Unit("km", "km", "length", 1000.0),
        Unit("cm", "cm", "length", 0.01),
        Unit("mm", "mm", "length", 0.001),
        Unit("[in_i]", "in", "length", INCH_M),
        Unit("[ft_i]", "ft", "length", FOOT_M),
        Unit("[mi_i]", "mi", "length", MILE_M),
        Unit("m/s", "m/s", "velocity"),
        Unit("m/d", "m/d", "velocity", 1 / SECONDS_PER_DAY),
        Unit("[ft_i]/s", "ft/s", "velocity", FOOT_M),
        Unit("[ft_i]/d", "ft/d", "velocity", FOOT_M / SECONDS_PER_DAY),
        Unit("[mi_i]/d", "mi/d", "velocity", MILE_M / SECONDS_PER_DAY),
        Unit("m2/s", "m²/s", "depth times velocity"),
        Unit("[ft_i]2/s", "ft²/s", "depth times velocity", FOOT_M**2),
        Unit("m3/s", "m³/s", "flow"),
        Unit("L/s", "L/s", "flow", 0.001),
        Unit("m3/d", "m³/d", "flow", 1 / SECONDS_PER_DAY),
        Unit("[ft_i]3/s", "ft³/s", "flow", FOOT_M**3),
        Unit("10*6.[gal_us]/d", "Mgal/d", "flow", 1e6 * GALLON_M3 / SECONDS_PER_DAY),
        Unit("mm[Hg]", "mmHg", "pressure"),
        Unit("hPa", "hPa", "pressure", MMHG_PER_ATM / HPA_PER_ATM),
        Unit("mbar", "mbar", "pressure", MMHG_PER_ATM / HPA_PER_ATM),
        Unit("kPa", "kPa", "pressure", 10 * MMHG_PER_ATM / HPA_PER_ATM),
        Unit("[in_i'Hg]", "inHg", "pressure", 25.4),
        Unit("atm", "atm", "pressure", MMHG_PER_ATM),
        Unit("mg/L", "mg/L", "concentration"),
        Unit("ug/L", "µg/L", "concentration", 0.001),
        Unit("kg/d", "kg/d", "load"),
        Unit("[lb_av]/d", "lb/d", "load", POUND_KG),
        Unit("uS/cm", "µS/cm", "conductance"),
        Unit("mS/cm", "mS/cm", "conductance", 1000.0),
        Unit("d", "d", "time"),
        Unit("h", "h", "time", 1 / 24),
        Unit("min", "min", "time", 1 / 1440),
        Unit("s", "s", "time", 1 / SECONDS_PER_DAY),
        Unit("/d", "1/d", "rate"),
        Unit("/h", "1/h", "rate", 24.0),
        Unit("mg/L/d", "mg/L/d", "volumetric rate"),
        Unit("g/m2/d", "g/m²/d", "areal rate"),
        Unit("1", "", "ratio"),
        Unit("%", "%", "ratio", 0.01),
        Unit("[ft_i]/[mi_i]", "ft/mi", "ratio", FOOT_M / MILE_M),
        Unit("[pH]", "pH", "acidity"),
    )
}


def to_si(value, unit):
    """Return the value in the unit calc uses for the quantity.

    Parameters
    ----------
    value : float or array_like, shape (...)
        NaN passes.
    unit : str
        UCUM code, a key of UNITS.

    Returns
    -------
    float or ndarray, shape (...)
        In °C, m, m/s, m²/s, m³/s, mmHg, mg/L, kg/d, µS/cm, d, 1/d, mg/L/d, g/m²/d, as a ratio or in pH.

    Raises
    ------
    OutOfRangeError
        If the unit is not in UNITS.
    """
    known = _unit("unit", unit)
    return np.asarray(value, dtype=float) * known.factor + known.offset


def from_si(value, unit):
    """Return a value that is in calc's unit for its quantity in another unit. The inverse of to_si."""
    known = _unit("unit", unit)
    return (np.asarray(value, dtype=float) - known.offset) / known.factor


def convert(value, from_unit, to_unit):
    """Return the value in another unit of the same quantity, unchanged when the units are the same.

    Raises
    ------
    OutOfRangeError
        If a unit is not in UNITS, or the two measure different quantities.
    """
    source, target = _same_quantity(from_unit, to_unit)
    values = np.asarray(value, dtype=float)
    if source is target:
        return values[()]
    return (values * source.factor + (source.offset - target.offset)) / target.factor


def convert_difference(value, from_unit, to_unit):
    """Return a difference or tolerance in another unit: 1 °C is a difference of 1.8 °F. Raises as convert does."""
    source, target = _same_quantity(from_unit, to_unit)
    return np.asarray(value, dtype=float) * (source.factor / target.factor)


def load_kg_per_day(flow_m3_s, concentration_mg_l):
    """Return the load a flow carries. [kg/d] 1 m³/s at 1 mg/L is 86.4 kg/d."""
    return np.multiply(flow_m3_s, concentration_mg_l) * (SECONDS_PER_DAY / 1000)


def _same_quantity(from_unit, to_unit):
    source, target = _unit("from_unit", from_unit), _unit("to_unit", to_unit)
    if source.quantity != target.quantity:
        raise OutOfRangeError(
            f"to_unit must measure {source.quantity} as {from_unit} does, got {to_unit} ({target.quantity})"
        )
    return source, target


def _unit(name, code):
    if code not in UNITS:
        raise OutOfRangeError(f"{name} must be one of {', '.join(UNITS)}, got {code}")
    return UNITS[code]
