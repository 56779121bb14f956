"""How uncertain a plan is before any reading: plausible rivers around it, and the bands they make.

The plan's rates are guesses. Each plausible river has the plan's reaches with one factor on kd in all of them, one on
ka, one on velocity, one on the mixed demand and one on the nitrogenous, a shift of the initial deficit and one of the
background. The same plan always gives the same rivers.
"""

from dataclasses import dataclass, fields, replace

import numpy as np
from scipy.special import ndtri

from calc.checks import require_range
from calc.critical import STILL_FALLING
from calc.errors import OutOfRangeError
from calc.sag import critical_point, predict

_FIRST = 0.5


@dataclass(frozen=True)
class PlanSpread:
    """Standard deviations of what a plan guesses: of the natural logarithm (log_), or in mg/L (per day).

    The background's is net_demand_mg_l_per_day + net_demand_g_m2_per_day / depth. For a measured quantity enter less.

    Raises
    ------
    OutOfRangeError
        If one is negative or above 3.
    """

    log_kd: float = 0.35
    log_ka: float = 0.40
    log_velocity: float = 0.15
    log_cbod: float = 0.20
    log_nbod: float = 0.30
    initial_deficit_mg_l: float = 0.3
    net_demand_mg_l_per_day: float = 0.2
    net_demand_g_m2_per_day: float = 0.5

    def __post_init__(self):
        for deviation in fields(self):
            require_range(deviation.name, getattr(self, deviation.name), 0, 3, "")


@dataclass(frozen=True)
class Band:
    """Oxygen along a river between two quantiles of plausible rivers, and their median: shape (m,). [mg/L]"""

    distance_km: np.ndarray
    low_mg_l: np.ndarray
    median_mg_l: np.ndarray
    high_mg_l: np.ndarray


@dataclass(frozen=True)
class Interval:
    """Two quantiles and the median."""

    low: float
    median: float
    high: float


@dataclass(frozen=True)
class CriticalInterval:
    """Where the critical point may be, and how low oxygen may go there.

    still_falling is the share of plausible rivers whose oxygen still falls where the plan ends. Their place is there:
    with more than (1 - level)/2 of them the place has no upper bound.
    """

    distance_km: Interval
    travel_time_h: Interval
    do_mg_l: Interval
    still_falling: float


def ensemble(river, spread=None, n=256):
    """Return n plausible rivers around a plan, as one River whose fields hold arrays of shape (n,).

    Parameters
    ----------
    river : River
        The plan: a single river.
    spread : PlanSpread, optional
        How uncertain it is; the defaults of PlanSpread if not given.
    n : int
        Number of rivers, 2 to 100 000.

    Raises
    ------
    OutOfRangeError
        If n leaves its range.

    Notes
    -----
    The factor on mixed demand applies to the head and the outfalls, that on nitrogenous demand too; tributaries keep
    theirs. The shift of the initial deficit is applied where the outfall has mixed.
    """
    if not 2 <= n <= 100_000:
        raise OutOfRangeError(f"n must be between 2 and 100000, got {n}")
    spread = spread or PlanSpread()
    kd, ka, velocity, cbod, nbod, deficit, net = ndtri(evenly_spread(n, 7)).T
    factors = {
        "kd20_per_day": np.exp(spread.log_kd * kd),
        "ka20_per_day": np.exp(spread.log_ka * ka),
        "velocity_m_s": np.exp(spread.log_velocity * velocity),
    }
    loads = {"cbod_mg_l": np.exp(spread.log_cbod * cbod), "nbod_mg_l": np.exp(spread.log_nbod * nbod)}
    reaches = []
    for reach in river.reaches:
        deviation = spread.net_demand_mg_l_per_day + spread.net_demand_g_m2_per_day / reach.depth_m
        respiration = reach.respiration_mg_l_per_day + deviation * net
        reaches.append(replace(_scaled(reach, factors), respiration_mg_l_per_day=respiration))
    return replace(
        river,
        head=_scaled(river.head, loads),
        reaches=tuple(reaches),
        inflows=tuple(
            replace(inflow, water=_scaled(inflow.water, loads)) if inflow.kind == "outfall" else inflow
            for inflow in river.inflows
        ),
        initial_deficit_shift_mg_l=river.initial_deficit_shift_mg_l + spread.initial_deficit_mg_l * deficit,
    )


def _scaled(part, factors):
    return replace(part, **{name: getattr(part, name) * factor for name, factor in factors.items()})


def band(river, distance_km, spread=None, level=0.90, n=256):
    """Return the Band of oxygen along a plan that holds a share of the plausible rivers at each distance.

    distance_km has shape (m,) [km]; level is between 0.01 and 0.999; the other arguments are those of ensemble.
    Raises OutOfRangeError as ensemble and predict do.
    """
    quantiles = _quantiles(level)
    do = predict(ensemble(river, spread, n), distance_km).do_mg_l
    low, median, high = np.quantile(do, quantiles, axis=0)
    return Band(np.asarray(distance_km, dtype=float), low, median, high)


def critical_interval(river, spread=None, level=0.90, n=256):
    """Return the CriticalInterval of a plan: where oxygen is lowest in a share of the plausible rivers, and how low.

    Arguments and what they raise are those of band.
    """
    quantiles = _quantiles(level)
    points = critical_point(ensemble(river, spread, n))
    distance, travel_time, do = (
        Interval(*(float(value) for value in np.quantile(values, quantiles)))
        for values in (points.distance_km, points.travel_time_h, points.do_mg_l)
    )
    return CriticalInterval(distance, travel_time, do, float(np.mean(points.kind == STILL_FALLING)))


def evenly_spread(n, dimensions):
    """Return n points that fill the unit cube evenly, always the same, shape (n, dimensions).

    Multiples of the powers of 1/g modulo 1, with g the root of x^(d + 1) = x + 1: the golden ratio in one dimension. No
    random numbers: a plan's band must not flicker.
    """
    root = 2.0
    for _ in range(60):
        root = (1 + root) ** (1 / (dimensions + 1))
    steps = root ** -np.arange(1, dimensions + 1)
    return (_FIRST + np.arange(1, n + 1)[:, None] * steps) % 1


def _quantiles(level):
    require_range("level", level, 0.01, 0.999, "")
    return [(1 - level) / 2, 0.5, (1 + level) / 2]
