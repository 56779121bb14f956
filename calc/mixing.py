"""Mixing where waters meet: flow-weighted means, and the distance the river needs to mix across.

References
----------
.. [1] H. B. Fischer, E. J. List, R. C. Y. Koh, J. Imberger and N. H. Brooks, "Mixing in Inland and Coastal Waters",
   Academic Press, 1979, chapter 5, equations 5.5 to 5.10.
"""

from dataclasses import dataclass

import numpy as np

from calc.checks import require_positive, require_range
from calc.errors import OutOfRangeError
from calc.river import Water
from calc.units import GRAVITY_M_S2

_CENTRE = 0.1
_BANK = 0.4
_NATURAL = 0.6
_STRAIGHT = 0.15
# The transverse coefficient of a natural channel is known to half its size either way.
_UNCERTAINTY = 0.5


@dataclass(frozen=True)
class MixingDistance:
    """Distance from an outfall to complete mixing across the river: the estimate and its range. [km]"""

    low_km: float
    best_km: float
    high_km: float


def mixed(flows_m3_s, values):
    """Return the flow-weighted mean of temperature, concentration or conductance.

    Parameters
    ----------
    flows_m3_s : array_like, shape (k) or (k, ...)
        Flow of each of k waters, not negative. [m³/s] The sum must be above 0.
    values : array_like, shape (k) or (k, ...)
        Value of each water. A water without flow adds nothing, whatever its value; else NaN passes.

    Returns
    -------
    float or ndarray, shape (...)
        The mixed value, in the values' unit.

    Raises
    ------
    OutOfRangeError
        If a flow is negative or all are 0, or there are not as many values as flows.
    """
    flows = np.atleast_1d(require_range("flows_m3_s", flows_m3_s, 0, np.inf, "m³/s"))
    values = np.atleast_1d(np.asarray(values, dtype=float))
    if len(values) != len(flows):
        raise OutOfRangeError(f"values must hold one for each of the {len(flows)} flows_m3_s, got {len(values)}")
    rank = max(flows.ndim, values.ndim)
    flows, values = (array.reshape(array.shape + (1,) * (rank - array.ndim)) for array in (flows, values))
    return _weighted(_shares(flows), values)


def mix_waters(waters):
    """Return the Water that several become where they meet.

    Each field of a Water may be a float or an array of shape (n); the mixed field is then of shape (n). A water
    whose conductance is not known counts as fresh, as everywhere; when none is known the mixture's is NaN too.

    Raises
    ------
    OutOfRangeError
        If there is no water, or all flows are 0.
    """
    waters = tuple(waters)
    if not waters:
        raise OutOfRangeError("waters must hold at least one water, got none")
    fields = ("do_mg_l", "water_temp_c", "cbod_mg_l", "nbod_mg_l", "conductance_us_cm")
    flows, *columns = _columns(waters, ("flow_m3_s", *fields))
    shares = _shares(flows)
    unknown = np.isnan(columns[-1])
    columns[-1] = np.where(unknown & ~unknown.all(axis=0), 0.0, columns[-1])
    values = (flows.sum(axis=0)[()], *(_weighted(shares, column) for column in columns))
    return Water(*(value if value.ndim else float(value) for value in values))


def complete_mix_km(velocity_m_s, depth_m, width_m, slope, *, at_bank, straight=False):
    """Return the distance from an outfall to complete mixing across the river, as a range.

    Parameters
    ----------
    velocity_m_s, depth_m, width_m, slope : float or array_like, broadcastable
        Means along the way, above 0. [m/s], [m], [m], [m/m]
    at_bank : bool
        True where the outfall lies at a bank, False in the middle of the river.
    straight : bool
        True for a straight uniform channel, which mixes four times more slowly than a natural one.

    Returns
    -------
    MixingDistance
        L = k U W² / Ey, k 0.4 or 0.1, Ey 0.6 or 0.15 times H sqrt(g H S) [1]_; half of it, and half as much again.

    Raises
    ------
    OutOfRangeError
        If an argument is not above 0.
    """
    velocity = require_positive("velocity_m_s", velocity_m_s, "m/s")
    depth = require_positive("depth_m", depth_m, "m")
    width = require_positive("width_m", width_m, "m")
    shear_velocity = np.sqrt(GRAVITY_M_S2 * depth * require_positive("slope", slope, ""))
    transverse_m2_s = (_STRAIGHT if straight else _NATURAL) * depth * shear_velocity
    best = (_BANK if at_bank else _CENTRE) * velocity * width**2 / transverse_m2_s / 1000
    return MixingDistance(best * (1 - _UNCERTAINTY), best, best * (1 + _UNCERTAINTY))


def _columns(waters, names):
    """Return each field of all waters as an array of shape (k) or (k, n), the same for every field."""
    table = [[getattr(water, name) for water in waters] for name in names]
    if any(np.ndim(value) for row in table for value in row):
        shape = np.broadcast_shapes(*(np.shape(value) for row in table for value in row))
        table = [[np.broadcast_to(value, shape) for value in row] for row in table]
    return list(np.array(table, dtype=float))


def _shares(flows):
    """Return each flow's share of the total."""
    total = flows.sum(axis=0)
    if (total == 0).any():
        raise OutOfRangeError("flows must add up to more than 0 m³/s, got 0 m³/s")
    return flows / total


def _weighted(shares, values):
    """Return the mean over the leading axis; a share of 0 silences its value even when that is NaN."""
    return np.where(shares == 0, 0.0, shares * values).sum(axis=0)[()]
