"""Oxygen in water in equilibrium with air, and the pressure and salinity it depends on.

References
----------
.. [1] B. B. Benson and D. Krause, "The concentration and isotopic fractionation of gases dissolved in freshwater in
   equilibrium with the atmosphere. 1. Oxygen", Limnol. Oceanogr., vol. 25, no. 4, pp. 662-671, 1980.
   doi:10.4319/lo.1980.25.4.0662
.. [2] B. B. Benson and D. Krause, "The concentration and isotopic fractionation of oxygen dissolved in freshwater and
   seawater in equilibrium with the atmosphere", Limnol. Oceanogr., vol. 29, no. 3, pp. 620-632, 1984.
   doi:10.4319/lo.1984.29.3.0620
.. [3] "Change to solubility equations for oxygen in water", USGS Office of Water Quality Technical Memorandum 2011.03,
   2011. The equations of [1]_ and [2]_ as used here, their ranges, and salinity from conductance.
.. [4] U.S. Standard Atmosphere, NOAA-S/T 76-1562, 1976, equation 33a; the same as ISO 2533:1975.
"""

import numpy as np

from calc.checks import require_range
from calc.units import KELVIN_AT_0_C, MMHG_PER_ATM

# Coefficients of powers of 1/T, the highest first; T in kelvin.
_LN_FRESH_MG_L = (-8.621949e11, 1.243800e10, -6.642308e7, 1.575701e5, -139.34411)
_LN_SALINITY = (2140.7, -10.754, 0.017674)
_LN_VAPOUR_ATM = (-216961.0, -3840.70, 11.8571)
# Powers of the temperature in °C, the highest first.
_THETA_PER_ATM = (6.436e-8, -1.426e-5, 0.000975)

_LAPSE_PER_M = 2.25577e-5
_LAPSE_EXPONENT = 5.25588


def saturation_mg_l(water_temp_c, pressure_mmhg=760.0, salinity_psu=0.0):
    """Return the oxygen concentration of water in equilibrium with moist air.

    Parameters
    ----------
    water_temp_c : float or array_like, shape (...)
        Water temperature. [°C] Valid from 0 to 40.
    pressure_mmhg : float or array_like, broadcastable
        Air pressure at the station, not reduced to sea level. [mmHg] Valid from 380 to 836 (0.5 to 1.1 atm).
    salinity_psu : float or array_like, broadcastable
        Practical salinity. [-] Valid from 0 to 40.

    Returns
    -------
    float or ndarray, shape (...)
        Saturation concentration. [mg/L] NaN where any argument is NaN.

    Raises
    ------
    OutOfRangeError
        If any argument leaves its range.

    Notes
    -----
    Benson and Krause [2]_ as in [3]_: ln of the fresh-water value at 1 atm less the salinity term, times the pressure
    factor (P-u)(1-θP) / [(1-u)(1-θ)].
    """
    celsius = require_range("water_temp_c", water_temp_c, 0, 40, "°C")
    pressure = require_range("pressure_mmhg", pressure_mmhg, 380, 836, "mmHg")
    salinity = require_range("salinity_psu", salinity_psu, 0, 40, "")
    per_kelvin = 1 / (celsius + KELVIN_AT_0_C)
    ln_saturation = _horner(_LN_FRESH_MG_L, per_kelvin)
    if salinity.ndim or salinity != 0:
        ln_saturation = ln_saturation - salinity * _horner(_LN_SALINITY, per_kelvin)
    saturation = np.exp(ln_saturation)
    if pressure.ndim or pressure != MMHG_PER_ATM:
        saturation = saturation * _pressure_factor(celsius, per_kelvin, pressure * (1 / MMHG_PER_ATM))
    return saturation


def percent_saturation(do_mg_l, water_temp_c, pressure_mmhg=760.0, salinity_psu=0.0):
    """Return the oxygen concentration as a percentage of saturation. [%] Above 100 when supersaturated, never clipped.

    do_mg_l is any finite value: a meter in zero solution may read just below 0. [mg/L] The other arguments and what
    they raise are those of saturation_mg_l; with the station's pressure the percentage is relative to local air, with
    760 it is relative to 1 atm.
    """
    do = require_range("do_mg_l", do_mg_l, -np.inf, np.inf, "mg/L")
    return 100 * do / saturation_mg_l(water_temp_c, pressure_mmhg, salinity_psu)


def concentration_mg_l(percent, water_temp_c, pressure_mmhg=760.0, salinity_psu=0.0):
    """Return the oxygen concentration at a percentage of saturation. [mg/L] The inverse of percent_saturation."""
    share = require_range("percent", percent, -np.inf, np.inf, "%")
    return share / 100 * saturation_mg_l(water_temp_c, pressure_mmhg, salinity_psu)


def deficit_mg_l(do_mg_l, water_temp_c, pressure_mmhg=760.0, salinity_psu=0.0):
    """Return saturation less concentration. [mg/L] Negative when supersaturated, never clipped.

    The arguments and what they raise are those of percent_saturation.
    """
    do = require_range("do_mg_l", do_mg_l, -np.inf, np.inf, "mg/L")
    return saturation_mg_l(water_temp_c, pressure_mmhg, salinity_psu) - do


def standard_pressure_mmhg(elevation_m):
    """Return the air pressure of the standard atmosphere, which a barometer on the day overrides. [mmHg]

    elevation_m is the height above sea level. [m] Valid from -500 to 11000, the lowest layer of the atmosphere [4]_;
    OutOfRangeError outside.
    """
    return MMHG_PER_ATM * _standard_ratio(elevation_m)


def station_pressure_mmhg(sea_level_mmhg, elevation_m):
    """Return the pressure at a station from a weather service's, which is reduced to sea level. [mmHg]

    Parameters
    ----------
    sea_level_mmhg : float or array_like, shape (...)
        Pressure reduced to sea level. [mmHg] Valid from 600 to 850; records are about 652 and 814.
    elevation_m : float or array_like, broadcastable
        Height of the station above sea level. [m] Valid from -500 to 11000.

    Raises
    ------
    OutOfRangeError
        If an argument leaves its range.

    Notes
    -----
    The standard atmosphere [4]_ scaled by the day's pressure. The reduction a weather service makes also depends on
    the day's air temperature, which is not known here: expect a few mmHg of error at 1000 m.
    """
    return require_range("sea_level_mmhg", sea_level_mmhg, 600, 850, "mmHg") * _standard_ratio(elevation_m)


def salinity_psu(conductance_us_cm):
    """Return the salinity that corresponds to a specific conductance at 25 °C. [-]

    conductance_us_cm is valid from 0 to 59000 µS/cm, which gives a salinity of 40 [3]_; OutOfRangeError outside.
    """
    conductance = require_range("conductance_us_cm", conductance_us_cm, 0, 59000, "µS/cm")
    return (5.572e-4 + 2.02e-9 * conductance) * conductance


def _standard_ratio(elevation_m):
    elevation = require_range("elevation_m", elevation_m, -500, 11000, "m")
    return (1 - _LAPSE_PER_M * elevation) ** _LAPSE_EXPONENT


def _pressure_factor(celsius, per_kelvin, pressure_atm):
    """Return saturation at a pressure relative to that at 1 atm."""
    vapour = np.exp(_horner(_LN_VAPOUR_ATM, per_kelvin))
    theta = _horner(_THETA_PER_ATM, celsius)
    return (pressure_atm - vapour) * (1 - theta * pressure_atm) / ((1 - vapour) * (1 - theta))


def _horner(coefficients, x):
    """Return the polynomial, the highest power first; numpy's own starts from zeros and costs one pass more."""
    highest, *others = coefficients
    total = highest * x + others[0]
    for coefficient in others[1:]:
        total *= x
        total += coefficient
    return total
