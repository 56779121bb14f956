"""The tables that a phone interpolates in: oxygen saturation by temperature, pressure and conductance.

The steps are chosen so that a straight line between two entries stays within 0.003 mg/L of calc; a test asserts it.
"""

from functools import lru_cache

import numpy as np

from calc.oxygen import salinity_psu, saturation_mg_l, standard_pressure_mmhg, station_pressure_mmhg

TEMPERATURES_C = np.arange(0.0, 41.0)
PRESSURES_MMHG = np.linspace(380.0, 836.0, 39)
COARSE_TEMPERATURES_C = np.arange(0.0, 41.0, 4.0)
SALINITIES_PSU = np.arange(0.0, 41.0, 2.0)
CONDUCTANCES_US_CM = np.concatenate([[0.0], np.round(np.geomspace(20.0, 59000.0, 60))])
SEA_LEVEL_MMHG = np.array([600.0, 850.0])


@lru_cache(maxsize=1)
def saturation_tables():
    """Return the tables that are the same for every survey, as plain lists: {"saturation", "salinity", "salted"}.

    saturation holds that of fresh water by temperature and pressure [mg/L], salinity that of a conductance, salted the
    share of the fresh-water saturation that is left at a salinity, by temperature.
    """
    fresh = saturation_mg_l(TEMPERATURES_C[:, None], PRESSURES_MMHG)
    salinity = salinity_psu(CONDUCTANCES_US_CM)
    unsalted = saturation_mg_l(COARSE_TEMPERATURES_C)[:, None]
    salted = saturation_mg_l(COARSE_TEMPERATURES_C[:, None], 760.0, SALINITIES_PSU) / unsalted
    return {
        "saturation": _surface(TEMPERATURES_C, PRESSURES_MMHG, fresh, 3),
        "salinity": {"x": _plain(CONDUCTANCES_US_CM, 0), "y": _plain(np.minimum(salinity, SALINITIES_PSU[-1]), 4)},
        "salted": _surface(COARSE_TEMPERATURES_C, SALINITIES_PSU, salted, 5),
    }


def pressure_tables(elevation_m):
    """Return the standard pressure of an elevation, and the station's pressure by that of a weather report. [mmHg]"""
    return {
        "standard": round(float(standard_pressure_mmhg(elevation_m)), 3),
        "weather": {"x": _plain(SEA_LEVEL_MMHG, 0), "y": _plain(station_pressure_mmhg(SEA_LEVEL_MMHG, elevation_m), 3)},
    }


def _surface(rows, columns, values, digits):
    return {"x": _plain(rows, 1), "y": _plain(columns, 1), "z": [_plain(row, digits) for row in values]}


def _plain(values, digits):
    return np.round(values, digits).tolist()
