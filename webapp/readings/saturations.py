"""Oxygen saturation of many readings at once: calc is called once over arrays."""

import numpy as np

from calc.oxygen import salinity_psu, saturation_mg_l

_SATURATION_RANGE_C = (0, 40)
_PRESSURE_RANGE_MMHG = (380, 836)
_CONDUCTANCE_RANGE_US_CM = (0, 59000)


def saturations_of(finals):
    """Return each reading's saturation, NaN where a value is missing or outside the equations. [mg/L]"""
    temperature = _within([final.water_temp_c for final in finals], *_SATURATION_RANGE_C)
    pressure = _within([final.pressure_mmhg for final in finals], *_PRESSURE_RANGE_MMHG)
    # Without a conductance the water is taken for fresh; one beyond the equation leaves saturation unknown.
    conductance = [0.0 if final.conductance_us_cm is None else final.conductance_us_cm for final in finals]
    salinity = _within(salinity_psu(_within(conductance, *_CONDUCTANCE_RANGE_US_CM)), 0, 40)
    return saturation_mg_l(temperature, pressure, salinity)


def _within(values, low, high):
    numbers = np.array([np.nan if value is None else value for value in values], dtype=float)
    return np.where((numbers >= low) & (numbers <= high), numbers, np.nan)
