"""The two-slope line: how fast demand leaves the water along a river, and where settling ends.

On a plot of the logarithm of demand over travel time, what settles and decays falls with slope -(kd+ks); once what can
settle has settled, only decay is left and the line breaks to slope -kd (common practice).

References
----------
.. [1] D. J. Hudson, "Fitting segmented curves whose join points have to be estimated", J. Am. Stat. Assoc., vol. 61,
   no. 316, pp. 1097-1129, 1966. The least-squares broken line.
.. [2] G. A. F. Seber and C. J. Wild, "Nonlinear Regression", 1989, section 9.3: a break that one line does not have
   upsets the usual F test, so its significance is simulated here.
"""

from dataclasses import dataclass
from math import inf, nan

import numpy as np
from scipy.stats import f as f_distribution

from calc.checks import require_positive, require_range, require_same_shape
from calc.errors import FitError

_CONFIDENCE = 0.90
_SUPPORT_LEVEL = 0.05
_FEWEST_FOR_A_BREAK = 5
_STEPS_PER_GAP = 200
_SIMULATIONS = 1999


@dataclass(frozen=True)
class RemovalFit:
    """One line, and the line that breaks, through the logarithm of demand over travel time.

    Rates are base e, at the water's temperature [1/d]; break_days is travel time [d]; every interval is 90 % and may
    be open (0 or inf). above_per_day is kd + ks, below_per_day kd, settling_per_day ks. Where two_slopes_supported is
    False the readings do not tell the broken line from the single one: use single_per_day. p_value is the chance of so
    good a break in readings that have none. residuals are in logarithms, of the line that is supported. Where
    converged is False, and wherever something could not be estimated (NaN), reason says why.
    """

    single_per_day: float
    single_interval_per_day: tuple[float, float]
    above_per_day: float
    above_interval_per_day: tuple[float, float]
    below_per_day: float
    below_interval_per_day: tuple[float, float]
    settling_per_day: float
    settling_interval_per_day: tuple[float, float]
    break_days: float
    break_interval_days: tuple[float, float]
    initial_mg_l: float
    two_slopes_supported: bool
    p_value: float
    n: int
    residuals: np.ndarray
    converged: bool
    reason: str


def fit_removal(travel_days, bod_mg_l):
    """Return the RemovalFit of demand along a river.

    Parameters
    ----------
    travel_days, bod_mg_l : array_like, shape (n)
        Travel time, not negative [d], and ultimate demand there, above 0 [mg/L]. A pair with NaN is left out.

    Raises
    ------
    FitError
        If fewer than three readings at different times are left.
    OutOfRangeError
        If a time is negative, a demand is not above 0, or the two are not of one shape.

    Notes
    -----
    The broken line is continuous [1]_, flatter below the break, with two stations or more on each side; it needs five.
    Intervals are those of the profile of the sum of squares. The p-value compares the break with the best breaks of
    1999 simulated series without one at the same travel times, with a fixed seed [2]_.
    """
    time, logs = _log_readings(travel_days, bod_mg_l)
    n, stations = len(time), len(np.unique(time))
    single = _single(time, logs)
    if n < _FEWEST_FOR_A_BREAK or stations < _FEWEST_FOR_A_BREAK:
        return _result(single, None, 1.0, f"a break needs {_FEWEST_FOR_A_BREAK} stations, got {stations}")
    breaks, hinges = _hinges(time)
    falls = hinges @ single.residuals
    if single.squares <= 1e-20 * (logs @ logs) or not (falls > 0).any():
        return _result(single, None, 1.0, "the readings do not flatten downstream")
    best = int(falls.argmax())
    p_value = _chance_of_such_a_break(falls[best] ** 2 / single.squares, hinges, time)
    return _result(single, _broken(time, logs, breaks, best), p_value, "")


@dataclass(frozen=True)
class _Line:
    rate: float
    interval: tuple[float, float]
    intercept: float
    squares: float
    residuals: np.ndarray


@dataclass(frozen=True)
class _Broken:
    rates: np.ndarray
    intervals: list[tuple[float, float]]
    place: float
    place_interval: tuple[float, float]
    intercept: float
    residuals: np.ndarray


def _single(time, logs):
    design = np.column_stack([np.ones_like(time), -time])
    intercept, rate = np.linalg.lstsq(design, logs, rcond=None)[0]
    residuals = logs - design @ [intercept, rate]
    squares, free = float(residuals @ residuals), len(time) - 2
    reach = np.sqrt(squares / free * f_distribution.ppf(_CONFIDENCE, 1, free) * np.linalg.inv(design.T @ design)[1, 1])
    return _Line(float(rate), (float(rate - reach), float(rate + reach)), float(intercept), squares, residuals)


def _broken(time, logs, breaks, best):
    """Return the line broken at the best break; its intervals are the union of those at every break allowed."""
    rates, spreads, intercepts, residuals = _broken_at(time, logs, breaks)
    squares, free = (residuals**2).sum(axis=1), len(time) - 4
    limit = squares[best] * (1 + f_distribution.ppf(_CONFIDENCE, 1, free) / free)
    allowed = squares <= limit
    reach = np.sqrt((limit - squares[allowed])[:, None] * spreads[allowed])
    low, high = (rates[allowed] - reach).min(axis=0), (rates[allowed] + reach).max(axis=0)
    # The search ends two stations from either end: a break that gets there may lie anywhere beyond.
    places = breaks[allowed]
    place_interval = (0.0 if allowed[0] else float(places[0]), inf if allowed[-1] else float(places[-1]))
    intervals = [(float(a), float(b)) for a, b in zip(low, high, strict=True)]
    return _Broken(
        rates[best], intervals, float(breaks[best]), place_interval, float(intercepts[best]), residuals[best]
    )


def _broken_at(time, logs, breaks):
    """Return kd+ks, kd and ks for every break, the spread of each, the intercepts and the residuals."""
    past = np.maximum(time - breaks[:, None], 0)
    design = np.stack([np.ones_like(past), past - time, -past], axis=2)
    inverse = np.linalg.inv(design.swapaxes(1, 2) @ design)
    intercepts, above, below = (inverse @ (design.swapaxes(1, 2) @ logs)[:, :, None])[:, :, 0].T
    residuals = logs - (design @ np.stack([intercepts, above, below], axis=1)[:, :, None])[:, :, 0]
    settling_spread = inverse[:, 1, 1] + inverse[:, 2, 2] - 2 * inverse[:, 1, 2]
    spreads = np.stack([inverse[:, 1, 1], inverse[:, 2, 2], settling_spread], axis=1)
    return np.stack([above, below, above - below], axis=1), spreads, intercepts, residuals


def _hinges(time):
    """Return the possible breaks and, for each, its hinge made perpendicular to a straight line and of length one."""
    stations = np.unique(time)[1:-1]
    steps = [np.linspace(a, b, _STEPS_PER_GAP, endpoint=False) for a, b in zip(stations, stations[1:], strict=False)]
    breaks = np.concatenate([*steps, stations[-1:]])
    hinges = np.maximum(time - breaks[:, None], 0)
    line, _ = np.linalg.qr(np.column_stack([np.ones_like(time), time]))
    hinges = hinges - (hinges @ line) @ line.T
    return breaks, hinges / np.linalg.norm(hinges, axis=1)[:, None]


def _chance_of_such_a_break(share, hinges, time):
    """Return how often noise about one straight line is explained as well by a break: this share of its squares."""
    noise = np.random.default_rng(1966).standard_normal((_SIMULATIONS, len(time)))
    line, _ = np.linalg.qr(np.column_stack([np.ones_like(time), time]))
    noise -= (noise @ line) @ line.T
    # Every eighth break is near enough for the best of a series that has none.
    gains = np.maximum(noise @ hinges[::8].T, 0).max(axis=1) ** 2
    return float((1 + np.sum(gains / (noise**2).sum(axis=1) >= share)) / (1 + _SIMULATIONS))


def _result(single, broken, p_value, reason):
    supported = broken is not None and p_value < _SUPPORT_LEVEL
    unknown = (0.0, inf)
    rates = broken.rates if broken else (nan, nan, nan)
    intervals = broken.intervals if broken else (unknown, unknown, unknown)
    falling = (rates[1] if supported else single.rate) > 0
    if not falling:
        reason = "the demand does not fall downstream: look for an inflow or a bad result"
    elif broken and not supported:
        reason = "the readings do not tell two slopes from one"
    used = broken if supported else single
    return RemovalFit(
        single_per_day=single.rate,
        single_interval_per_day=single.interval,
        above_per_day=float(rates[0]),
        above_interval_per_day=intervals[0],
        below_per_day=float(rates[1]),
        below_interval_per_day=intervals[1],
        settling_per_day=float(rates[2]),
        settling_interval_per_day=intervals[2],
        break_days=broken.place if broken else nan,
        break_interval_days=broken.place_interval if broken else unknown,
        initial_mg_l=float(np.exp(used.intercept)),
        two_slopes_supported=supported,
        p_value=p_value,
        n=len(single.residuals),
        residuals=used.residuals,
        converged=bool(falling),
        reason=reason,
    )


def _log_readings(travel_days, bod_mg_l):
    time, bod = require_same_shape(travel_days=np.atleast_1d(travel_days), bod_mg_l=np.atleast_1d(bod_mg_l))
    require_range("travel_days", time, 0, inf, "d")
    require_positive("bod_mg_l", bod, "mg/L")
    known = ~(np.isnan(time) | np.isnan(bod))
    if len(np.unique(time[known])) < 3:
        raise FitError(f"bod_mg_l must hold readings at three or more travel_days, got {len(np.unique(time[known]))}")
    return time[known], np.log(bod[known])
