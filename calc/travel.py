"""Travel time along a river: from its reaches, from a float or a rated flow, or from a regression.

No clock here: times are hours of travel, or hours after the release of a parcel of water.

References
----------
.. [1] H. E. Jobson, "Prediction of traveltime and longitudinal dispersion in rivers and streams", U.S. Geological
   Survey Water-Resources Investigations Report 96-4013, 1996.
.. [2] H. E. Jobson, "Predicting travel time and dispersion in rivers and streams", J. Hydraul. Eng., vol. 123, no. 11,
   pp. 971-978, 1997. doi:10.1061/(ASCE)0733-9429(1997)123:11(971)
.. [3] L. B. Leopold and T. Maddock, "The hydraulic geometry of stream channels and some physiographic implications",
   U.S. Geological Survey Professional Paper 252, 1953.
"""

from dataclasses import dataclass

import numpy as np

from calc.checks import require_positive, require_range
from calc.errors import OutOfRangeError
from calc.units import GRAVITY_M_S2

KM_PER_HOUR = 3.6
KM_PER_DAY = 86.4

# The leading edge of a parcel comes at this share of the time of its peak [2].
LEADING_EDGE_SHARE = 0.89
# Mean velocity over surface velocity (common practice).
FLOAT_FACTOR = 0.85
# At-a-station exponents of flow [3]; they sum to 1.
WIDTH_EXPONENT, DEPTH_EXPONENT, VELOCITY_EXPONENT = 0.26, 0.40, 0.34


@dataclass(frozen=True)
class Arrival:
    """When a parcel passes, in hours after its release: the first of it, and its peak."""

    distance_km: np.ndarray
    leading_edge_h: np.ndarray
    peak_h: np.ndarray


def hours_from_head(river, distance_km):
    """Return the travel time from the first reach's head to one place in the river. [h] A float, or (n,)."""
    return sum(
        (min(max(distance_km, reach.from_km), reach.to_km) - reach.from_km) / (KM_PER_HOUR * reach.velocity_m_s)
        for reach in river.reaches
    )


def zero_km(river):
    """Return the place travel time counts from: the outfall at 0 km, or the end nearest it where 0 is outside. [km]"""
    return min(max(0.0, river.from_km), river.to_km)


def travel_time_h(river, distance_km):
    """Return the travel time from the outfall at 0 km, dx / U reach by reach; negative above the outfall. [h]

    Parameters
    ----------
    river : River
        Its velocities may be arrays of shape (n,).
    distance_km : float or array_like, shape (...)
        Within the river. [km] Where 0 km lies outside the river, time counts from the end nearest to it.

    Returns
    -------
    float or ndarray, shape (...) or (n, ...)
        Travel time. [h] NaN where the distance is NaN.

    Raises
    ------
    OutOfRangeError
        If a distance lies outside the river.
    """
    distance = require_range("distance_km", distance_km, river.from_km, river.to_km, "km")
    edges, hours = _table(river)
    place = np.clip(np.searchsorted(edges, distance, side="right") - 1, 0, len(edges) - 2)
    beyond = distance - edges[place]
    if hours.ndim == 1:
        return (hours[place] + beyond * (np.diff(hours) / np.diff(edges))[place])[()]
    slowness = np.diff(hours, axis=0) / np.diff(edges)[:, None]
    return np.moveaxis(hours[place] + slowness[place] * beyond[..., None], -1, 0)


def distance_at_travel_time_km(river, travel_time_h):
    """Return where the water is that many hours after it passed the outfall, the inverse of travel_time_h. [km]

    Parameters
    ----------
    river : River
        A single one: no arrays in it.
    travel_time_h : float or array_like, shape (...)
        Hours of travel; negative above the outfall. [h]

    Raises
    ------
    OutOfRangeError
        If the water is outside the river by then, or the river holds arrays.
    """
    edges, hours = _table(river)
    if hours.ndim > 1:
        raise OutOfRangeError("river must be a single river, got arrays of velocities")
    time_h = require_range("travel_time_h", travel_time_h, hours[0], hours[-1], "h")
    return np.interp(time_h, hours, edges)[()]


def arrival_times(river, distance_km, release_km=None):
    """Return when a parcel released at release_km passes each distance below it, as an Arrival.

    Parameters
    ----------
    river : River
        Its velocities may be arrays of shape (n,).
    distance_km : float or array_like, shape (...)
        At or below the release. [km]
    release_km : float, optional
        Where the parcel starts. [km] The outfall at 0 km if not given.

    Raises
    ------
    OutOfRangeError
        If a distance lies above the release or outside the river: a parcel doesn't travel upstream.

    Notes
    -----
    The velocity of a reach is that of the peak; dispersion brings the leading edge at 0.89 of its time [2]_.
    """
    release = zero_km(river) if release_km is None else float(release_km)
    distance = require_range("distance_km", distance_km, release, river.to_km, "km")
    peak_h = travel_time_h(river, distance) - _beside(travel_time_h(river, release), distance)
    return Arrival(distance[()], LEADING_EDGE_SHARE * peak_h, peak_h)


def velocity_from_flow_m_s(flow_m3_s, width_m, depth_m):
    """Return the mean velocity Q / (W H). [m/s] Flow at least 0 [m³/s], mean width and depth above 0 [m]."""
    flow = require_range("flow_m3_s", flow_m3_s, 0, np.inf, "m³/s")
    return (flow / (require_positive("width_m", width_m, "m") * require_positive("depth_m", depth_m, "m")))[()]


def mean_velocity_from_float_m_s(surface_velocity_m_s, factor=FLOAT_FACTOR):
    """Return the mean velocity from that of a surface float, × 0.85 (common practice; 0.6 to 1 allowed). [m/s]"""
    surface = require_range("surface_velocity_m_s", surface_velocity_m_s, 0, 20, "m/s")
    return (surface * require_range("factor", factor, 0.6, 1.0, ""))[()]


def velocity_at_flow_m_s(velocity_m_s, rated_flow_m3_s, flow_m3_s, exponent=VELOCITY_EXPONENT):
    """Return the velocity at another flow than it was rated at: V2 = V1 (Q2/Q1)^0.34 [3]_. [m/s] All above 0."""
    return _at_flow("velocity_m_s", velocity_m_s, "m/s", rated_flow_m3_s, flow_m3_s, exponent)


def depth_at_flow_m(depth_m, rated_flow_m3_s, flow_m3_s, exponent=DEPTH_EXPONENT):
    """Return the mean depth at another flow: H2 = H1 (Q2/Q1)^0.40 [3]_. [m] All above 0."""
    return _at_flow("depth_m", depth_m, "m", rated_flow_m3_s, flow_m3_s, exponent)


def width_at_flow_m(width_m, rated_flow_m3_s, flow_m3_s, exponent=WIDTH_EXPONENT):
    """Return the width at another flow: W2 = W1 (Q2/Q1)^0.26 [3]_. [m] All above 0."""
    return _at_flow("width_m", width_m, "m", rated_flow_m3_s, flow_m3_s, exponent)


def jobson_peak_velocity_m_s(flow_m3_s, mean_annual_flow_m3_s, drainage_area_m2, slope=None):
    """Return the most probable velocity of a parcel's peak [1]_. [m/s]

    Parameters
    ----------
    flow_m3_s, mean_annual_flow_m3_s : float or array_like
        Flow on the day and its mean over years, at the same place. [m³/s] Above 0.
    drainage_area_m2 : float or array_like
        Area drained at that place. [m²] Above 0; note: not km².
    slope : float or array_like, optional
        Fall over distance. [m/m] Above 0. Without it the equation that needs none is used.

    Raises
    ------
    OutOfRangeError
        If an argument is not above 0.

    Notes
    -----
    Vp = 0.094 + 0.0143 D'^0.919 Q'^-0.469 S^0.159 Q/D, without slope 0.020 + 0.051 D'^0.821 Q'^-0.465 Q/D, with
    D' = D^1.25 g^0.5 / Qa and Q' = Q/Qa.
    """
    flow, area, area_ratio, flow_ratio = _jobson_ratios(flow_m3_s, mean_annual_flow_m3_s, drainage_area_m2)
    if slope is None:
        return (0.020 + 0.051 * area_ratio**0.821 * flow_ratio**-0.465 * flow / area)[()]
    steepness = require_positive("slope", slope, "")
    return (0.094 + 0.0143 * area_ratio**0.919 * flow_ratio**-0.469 * steepness**0.159 * flow / area)[()]


def jobson_fastest_velocity_m_s(flow_m3_s, mean_annual_flow_m3_s, drainage_area_m2, slope):
    """Return the maximum probable velocity of a parcel's peak, 0.25 + 0.02 D'^0.919 Q'^-0.469 S^0.159 Q/D [1]_. [m/s]

    Arguments and what they raise as in jobson_peak_velocity_m_s; the slope must be given.
    """
    flow, area, area_ratio, flow_ratio = _jobson_ratios(flow_m3_s, mean_annual_flow_m3_s, drainage_area_m2)
    steepness = require_positive("slope", slope, "")
    return (0.25 + 0.02 * area_ratio**0.919 * flow_ratio**-0.469 * steepness**0.159 * flow / area)[()]


def changing_velocity_time_h(length_km, head_velocity_m_s, end_velocity_m_s):
    """Return the travel time of a length in which velocity changes linearly from head to end: dx / U summed. [h]

    length_km at least 0, both velocities above 0. It is longer than the length over the mean velocity.
    """
    length = require_range("length_km", length_km, 0, np.inf, "km")
    head = require_positive("head_velocity_m_s", head_velocity_m_s, "m/s")
    end = require_positive("end_velocity_m_s", end_velocity_m_s, "m/s")
    # ln(u2/u1)/(u2 - u1) through u1 = u2: log1p(x)/x with x = (u2 - u1)/u1.
    change = np.where(end == head, 1.0, (end - head) / head)
    slowness = np.where(end == head, 1.0, np.log1p(change) / change) / head
    return (length * slowness / KM_PER_HOUR)[()]


def _table(river):
    """Return the reaches' edges and the travel times there: shapes (r + 1,) and (r + 1,) or (r + 1, n)."""
    edges = np.array([*(reach.from_km for reach in river.reaches), river.to_km])
    steps = [
        np.asarray((to_km - from_km) / (KM_PER_HOUR * reach.velocity_m_s))
        for reach, from_km, to_km in zip(river.reaches, edges[:-1], edges[1:], strict=True)
    ]
    steps = np.stack(np.broadcast_arrays(*steps))
    hours = np.concatenate([np.zeros_like(steps[:1]), np.cumsum(steps, axis=0)])
    return edges, hours - hours_from_head(river, zero_km(river))


def _beside(time_h, distance_km):
    """Return a time, float or (n,), shaped to subtract from times of shape (n, ...)."""
    return np.reshape(time_h, np.shape(time_h) + (1,) * distance_km.ndim) if np.ndim(time_h) else time_h


def _at_flow(name, value, unit, rated_flow_m3_s, flow_m3_s, exponent):
    rated = require_positive("rated_flow_m3_s", rated_flow_m3_s, "m³/s")
    ratio = require_positive("flow_m3_s", flow_m3_s, "m³/s") / rated
    return (require_positive(name, value, unit) * ratio ** require_range("exponent", exponent, 0, 1, ""))[()]


def _jobson_ratios(flow_m3_s, mean_annual_flow_m3_s, drainage_area_m2):
    """Return flow, area, and the two dimensionless numbers of the regressions."""
    flow = require_positive("flow_m3_s", flow_m3_s, "m³/s")
    mean_flow = require_positive("mean_annual_flow_m3_s", mean_annual_flow_m3_s, "m³/s")
    area = require_positive("drainage_area_m2", drainage_area_m2, "m²")
    return flow, area, area**1.25 * np.sqrt(GRAVITY_M_S2) / mean_flow, flow / mean_flow
