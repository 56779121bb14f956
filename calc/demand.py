"""Oxygen demand: its decay, settling and dependence on depth, and the rates in bottles and along a river.

Rates are base e and per day; a published rate to base 10 goes through base_e_rate_per_day first.

References
----------
.. [1] H. W. Streeter and E. B. Phelps, "A study of the pollution and natural purification of the Ohio River, III",
   US Public Health Bulletin 146, 1925.
.. [2] Hydroscience Inc., "Simplified mathematical modeling of water quality", US EPA, 1971, figure of kd over depth.
.. [3] H. A. Thomas Jr., "Graphical determination of B.O.D. curve constants", Water & Sewage Works, vol. 97, p. 123,
   1950.
.. [4] Metcalf & Eddy Inc., "Wastewater Engineering: Treatment, Disposal and Reuse", 3rd ed., 1991: least squares on the
   slope of the BOD curve.
.. [5] D. M. Bates and D. G. Watts, "Nonlinear Regression Analysis and Its Applications", 1988, chapter 6: profiles.
"""

from dataclasses import dataclass
from math import inf, log, nan

import numpy as np
from scipy.optimize import brentq, minimize_scalar
from scipy.stats import f as f_distribution

from calc.checks import require_positive, require_range, require_same_shape
from calc.errors import FitError

# The two-slope line is part of this topic; it stands in a module of its own for its length.
from calc.removal import RemovalFit as RemovalFit
from calc.removal import fit_removal as fit_removal
from calc.units import FOOT_M

OXYGEN_PER_NITROGEN = 4.57
OXYGEN_PER_NITROGEN_WITH_SYNTHESIS = 4.33
STANDARD_BOTTLE_DAYS = 5.0

_BED_DEPTH_FT = 8.0
_CONFIDENCE = 0.90
_RATE_LOW, _RATE_HIGH = 1e-3, 50.0
# k·t at which all but a thousandth is exerted.
_ALL_EXERTED = 6.9


def remaining_mg_l(initial_mg_l, days, rate_per_day):
    """Return the demand left after a time, L = L0 e^(-k t) [1]_. [mg/L]

    Parameters
    ----------
    initial_mg_l : float or array_like, shape (...)
        Ultimate demand at the start, not negative. [mg/L]
    days : float or array_like, broadcastable
        Time, not negative. [d]
    rate_per_day : float or array_like, broadcastable
        Rate of removal, base e, not negative; in a river decay and settling together. [1/d]

    Raises
    ------
    OutOfRangeError
        If an argument is negative.
    """
    initial, time, rate = _first_order(initial_mg_l, days, rate_per_day)
    return initial * np.exp(-rate * time)


def exerted_mg_l(initial_mg_l, days, rate_per_day):
    """Return the demand exerted within a time, y = L0 (1 - e^(-k t)). [mg/L] Arguments as in remaining_mg_l."""
    initial, time, rate = _first_order(initial_mg_l, days, rate_per_day)
    return -initial * np.expm1(-rate * time)


def ultimate_mg_l(bod_mg_l, days, rate_per_day):
    """Return the ultimate demand of which a bottle has exerted bod_mg_l in days. [mg/L] The inverse of exerted_mg_l.

    bod_mg_l is not negative; days and rate_per_day (base e) are above 0, else OutOfRangeError.
    """
    bod = require_range("bod_mg_l", bod_mg_l, 0, inf, "mg/L")
    time, rate = require_positive("days", days, "d"), require_positive("rate_per_day", rate_per_day, "per day")
    return -bod / np.expm1(-rate * time)


def base_e_rate_per_day(rate_base10_per_day):
    """Return the base-e rate of a rate published to base 10. [1/d] Not negative, else OutOfRangeError."""
    return require_range("rate_base10_per_day", rate_base10_per_day, 0, inf, "per day") * log(10)


def nbod_mg_l(nitrogen_mg_l, with_synthesis=False):
    """Return the oxygen that oxidising this much nitrogen takes. [mg/L]

    4.57 g of oxygen per g of nitrogen; 4.33 where part of the nitrogen is built into cells. nitrogen_mg_l is not
    negative, else OutOfRangeError.
    """
    factor = OXYGEN_PER_NITROGEN_WITH_SYNTHESIS if with_synthesis else OXYGEN_PER_NITROGEN
    return factor * require_range("nitrogen_mg_l", nitrogen_mg_l, 0, inf, "mg/L")


def hydroscience_kd_per_day(depth_m):
    """Return kd20 = 0.3 (H/8)^-0.434, H in feet, and 0.3 deeper than 8 ft (2.44 m) [2]_. [1/d]

    depth_m is the mean depth, above 0 [m], else OutOfRangeError.
    """
    depth_ft = require_positive("depth_m", depth_m, "m") / FOOT_M
    return 0.3 * (np.minimum(depth_ft, _BED_DEPTH_FT) / _BED_DEPTH_FT) ** -0.434


def settling_rate_per_day(velocity_m_per_day, depth_m):
    """Return ks = vs / H. [1/d] vs is not negative [m/d], H above 0 [m], else OutOfRangeError."""
    velocity = require_range("velocity_m_per_day", velocity_m_per_day, 0, inf, "m/d")
    return velocity / require_positive("depth_m", depth_m, "m")


@dataclass(frozen=True)
class LineFit:
    """A bottle's rate and ultimate demand from a straight line, with the line's own intercept and slope."""

    rate_per_day: float
    ultimate_mg_l: float
    intercept: float
    slope: float


def thomas_slope(days, bod_mg_l):
    """Return a LineFit of (t/y)^(1/3) over t: k = 6 B/A, L0 = 1/(k A³), by Thomas [3]_.

    For comparison with old records; fit_bottle is better. Times and demands are above 0, else OutOfRangeError;
    FitError with fewer than two readings or where the line does not rise.
    """
    time, bod = _readings(days, bod_mg_l, at_least=2)
    slope, intercept = np.polyfit(time, np.cbrt(time / require_positive("bod_mg_l", bod, "mg/L")), 1)
    if slope <= 0 or intercept <= 0:
        raise FitError("bod_mg_l must curve as a first-order demand does for the Thomas line, but it does not")
    rate = 6 * slope / intercept
    return LineFit(float(rate), float(1 / (rate * intercept**3)), float(intercept), float(slope))


def slope_least_squares(days, bod_mg_l):
    """Return a LineFit of the curve's slope over the demand, dy/dt = k L0 - k y [4]_.

    The slope at each reading but the last comes from its two neighbours, the first from time 0, where nothing is
    exerted. For comparison with old records; fit_bottle is better. Times are above 0, else OutOfRangeError; FitError
    with fewer than three readings or where the slope does not fall.
    """
    time, bod = _readings(days, bod_mg_l, at_least=3)
    time, bod = np.append(0.0, time), np.append(0.0, bod)
    slope, intercept = np.polyfit(bod[1:-1], (bod[2:] - bod[:-2]) / (time[2:] - time[:-2]), 1)
    if slope >= 0:
        raise FitError("bod_mg_l must level off for a first-order rate, but its slope does not fall")
    return LineFit(float(-slope), float(-intercept / slope), float(intercept), float(slope))


@dataclass(frozen=True)
class BottleFit:
    """A first-order curve through the readings of one bottle series.

    Rate [1/d] and ultimate demand [mg/L] with standard errors and 90 % intervals, which may be open (0 or inf).
    residuals [mg/L] are readings less curve. Where converged is False the estimates are NaN and reason says why; where
    it is True, reason tells what the readings leave open, or is empty.
    """

    rate_per_day: float
    ultimate_mg_l: float
    rate_se_per_day: float
    ultimate_se_mg_l: float
    rate_interval_per_day: tuple[float, float]
    ultimate_interval_mg_l: tuple[float, float]
    n: int
    residuals: np.ndarray
    converged: bool
    reason: str


def fit_bottle(days, bod_mg_l):
    """Return the BottleFit of y = L0 (1 - e^(-k t)) to a bottle series by least squares.

    Parameters
    ----------
    days, bod_mg_l : array_like, shape (n)
        Times of the readings, above 0 [d], and demand exerted by then [mg/L]. A pair with NaN is left out.

    Returns
    -------
    BottleFit
        Intervals are those of the profile of the sum of squares [5]_.

    Raises
    ------
    FitError
        If fewer than three readings, or fewer than two different times, are left.
    OutOfRangeError
        If a time is not above 0, or the two are not of one shape.

    Notes
    -----
    For a given rate the best ultimate demand is known exactly, so only the rate is searched for, over the whole of
    0.001 to 50 per day: there is no starting value to get wrong.
    """
    time, bod = _readings(days, bod_mg_l, at_least=3)
    rates = np.geomspace(_RATE_LOW, _RATE_HIGH, 400)
    at = int(np.argmin([_bottle_at(rate, time, bod)[1] for rate in rates]))
    if _bottle_at(rates[at], time, bod)[0] <= 0:
        return _unfit_bottle(len(time), "the readings do not show a demand")
    if at == 0:
        return _unfit_bottle(len(time), "the readings do not level off, so the ultimate demand is not known")
    if rates[at] * time.min() > _ALL_EXERTED:
        return _unfit_bottle(len(time), "all is exerted by the first reading, so the rate is not known")
    found = minimize_scalar(
        lambda log_rate: _bottle_at(np.exp(log_rate), time, bod)[1],
        bounds=(log(rates[at - 1]), log(rates[min(at + 1, len(rates) - 1)])),
        method="bounded",
        options={"xatol": 1e-10},
    )
    rate = float(np.exp(found.x))
    ultimate, squares = _bottle_at(rate, time, bod)
    if not found.success:
        return _unfit_bottle(len(time), f"the search for the rate ended early: {found.message}")
    free = len(time) - 2
    limit = squares * (1 + f_distribution.ppf(_CONFIDENCE, 1, free) / free)
    rate_interval, ultimate_interval = _bottle_intervals(rate, limit, time, bod)
    gradient = np.column_stack([ultimate * time * np.exp(-rate * time), -np.expm1(-rate * time)])
    errors = np.sqrt(np.diag(np.linalg.inv(gradient.T @ gradient)) * squares / free)
    return BottleFit(
        rate_per_day=rate,
        ultimate_mg_l=float(ultimate),
        rate_se_per_day=float(errors[0]),
        ultimate_se_mg_l=float(errors[1]),
        rate_interval_per_day=rate_interval,
        ultimate_interval_mg_l=ultimate_interval,
        n=len(time),
        residuals=bod - exerted_mg_l(ultimate, time, rate),
        converged=True,
        reason=_open_sides(rate_interval),
    )


def _bottle_at(rate, time, bod):
    """Return the best ultimate demand at a rate, and the sum of squares it leaves."""
    share = -np.expm1(-rate * time)
    ultimate = (share @ bod) / (share @ share)
    return ultimate, float(((bod - ultimate * share) ** 2).sum())


def _bottle_intervals(rate, limit, time, bod):
    """Return the intervals of rate and ultimate demand within which the sum of squares stays below the limit."""

    def over(log_rate):
        return _bottle_at(np.exp(log_rate), time, bod)[1] - limit

    ends = []
    for bound, opened in ((_RATE_LOW, 0.0), (_RATE_HIGH, inf)):
        ends.append(
            float(np.exp(brentq(over, log(bound), log(rate)))) if over(log(bound)) > 0 > over(log(rate)) else opened
        )
    if limit <= 1e-20 * (bod @ bod):
        ends = [rate, rate]
    rates = np.geomspace(max(ends[0], _RATE_LOW), min(ends[1], _RATE_HIGH), 201)
    ultimates, squares = np.array([_bottle_at(each, time, bod) for each in rates]).T
    shares = np.array([(np.expm1(-each * time) ** 2).sum() for each in rates])
    reach = np.sqrt(np.maximum(limit - squares, 0) / shares)
    high = inf if ends[0] == 0 else float((ultimates + reach).max())
    return tuple(ends), (float((ultimates - reach).min()), high)


def _open_sides(rate_interval):
    if rate_interval[0] == 0:
        return "the readings do not level off enough to bound the ultimate demand from above"
    return "the readings begin too late to bound the rate from above" if rate_interval[1] == inf else ""


def _unfit_bottle(n, reason):
    return BottleFit(nan, nan, nan, nan, (0.0, inf), (0.0, inf), n, np.full(n, nan), False, reason)


def _first_order(initial_mg_l, days, rate_per_day):
    return (
        require_range("initial_mg_l", initial_mg_l, 0, inf, "mg/L"),
        require_range("days", days, 0, inf, "d"),
        require_range("rate_per_day", rate_per_day, 0, inf, "per day"),
    )


def _readings(days, bod_mg_l, at_least):
    """Return the pairs without NaN, or raise when too few are left."""
    time, bod = require_same_shape(days=np.atleast_1d(days), bod_mg_l=np.atleast_1d(bod_mg_l))
    require_positive("days", time, "d")
    require_range("bod_mg_l", bod, -inf, inf, "mg/L")
    known = ~(np.isnan(time) | np.isnan(bod))
    if known.sum() < at_least or len(np.unique(time[known])) < 2:
        raise FitError(f"bod_mg_l must hold at least {at_least} readings at two or more times, got {known.sum()}")
    return time[known], bod[known]
