"""Today's sag from today's readings: rates, the critical point with its interval, and how far to trust the estimate.

The estimate is a posterior over plausible rivers around the plan: its rates, its reaches, inflows and weirs, and what
the plan may have missed (calc.beliefs), weighed by the readings (calc.posterior).
"""

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from calc.beliefs import FitSettings, Latents, gap_edges, hypotheses
from calc.critical import MIXING_POINT
from calc.evidence import Evidence, gather
from calc.fitness import FitVerdict, judge, standardised
from calc.plausible import frame_of
from calc.posterior import Draws, Likelihood, draws, modes
from calc.rates import RateEstimate, rate_estimates
from calc.sag import critical_point
from calc.spread import Interval, PlanSpread
from calc.weighted import quantiles

__all__ = ["Estimate", "FitSettings", "FitVerdict", "Interval", "PlanSpread", "RateEstimate", "refine"]

LEVEL = (0.05, 0.5, 0.95)
_FINE, _COARSE = 80, 32
_JUST_ABOVE_KM = 1e-6


@dataclass(frozen=True)
class Estimate:
    """Today's sag given the readings. Intervals hold 90 % of the probability.

    critical_km [km], critical_do_mg_l, critical_travel_time_h: the critical point. rates: RateEstimates. p_in_gap: the
    probability that the critical point lies above the first station read, in each gap, below the last. regret_mg_l:
    how much lower than at the middle of its interval oxygen may be expected to go elsewhere. differences: for each
    reading given, how many standard deviations it lies from what the others say, NaN where it does not count. fit: a
    FitVerdict. grid_km (g), with draws (g, n) of oxygen there, weight (n), place_km (n) and lowest_mg_l (n), is what
    siting works with; bias_mg_l (n) is the error of the meter most read.
    """

    plan: object = field(repr=False)
    settings: FitSettings = field(repr=False)
    evidence: Evidence = field(repr=False)
    critical_do_mg_l: Interval
    critical_km: Interval
    critical_travel_time_h: Interval
    rates: tuple[RateEstimate, ...]
    stations_km: np.ndarray
    p_in_gap: np.ndarray
    regret_mg_l: float
    effective_draws: float
    differences: np.ndarray
    fit: FitVerdict
    outfall_km: float
    scale_km: float
    grid_km: np.ndarray = field(repr=False)
    draws: Draws = field(repr=False)
    place_km: np.ndarray = field(repr=False)
    lowest_mg_l: np.ndarray = field(repr=False)
    bias_mg_l: np.ndarray = field(repr=False)

    @property
    def weight(self):
        """The weight of each draw; they sum to 1."""
        return self.draws.weight

    @cached_property
    def _bands(self):
        return quantiles(self.draws.do_mg_l, self.weight, LEVEL)

    def do_at(self, distance_km):
        """Return oxygen at distances along the plan's river as an Interval of arrays. [mg/L]

        distance_km: float or array_like, shape (...) [km]; outside the river, the value at its end.
        """
        low, median, high = (np.interp(distance_km, self.grid_km, band) for band in self._bands)
        return Interval(low, median, high)


def refine(
    plan,
    stations_km,
    do_mg_l,
    *,
    water_temp_c=None,
    meters=None,
    visits=None,
    used=None,
    bod=None,
    spread=None,
    settings=None,
):
    """Return the Estimate of today's sag around a plan, given readings.

    Parameters
    ----------
    plan : River
        A single river, as planned. Stations may lie above its outfall: those tell of the water that arrives.
    stations_km, do_mg_l : array_like, shape (m,)
        Where and what was read. [km, mg/L] NaN is missing; the order does not matter. Several readings of one meter in
        one visit are replicates: averaged, and their scatter tells the error of a reading.
    water_temp_c : array_like, shape (m,), optional
        Water temperature of each reading. [°C] The plan is warmed by the middle difference from it; what remains at a
        station is taken as saturation, so that deficits are compared. Oxygen returned is at the plan's warmed
        temperature.
    meters, visits : sequence of m labels, optional
        Readings of one meter share a bias. Replicates belong to one visit.
    used : array_like of bool, shape (m,), optional
        False sets a reading aside.
    bod : tuple of three array_like, optional
        Distance [km], ultimate carbonaceous demand [mg/L] and its standard deviation, where it was measured.
    spread : PlanSpread, optional
        How uncertain the plan is.
    settings : FitSettings, optional

    Raises
    ------
    OutOfRangeError
        If arguments differ in length, or the plan holds arrays or lacks a number that its prediction needs. Nothing
        that is read raises: what cannot be used is named in the verdict.
    """
    settings = settings or FitSettings()
    plan, evidence = gather(
        plan,
        stations_km,
        do_mg_l,
        water_temp_c=water_temp_c,
        meters=meters,
        visits=visits,
        used=used,
        bod=bod,
        settings=settings,
    )
    outfall_km = plan.from_km if plan.outfall_km is None else plan.outfall_km
    scale_km = _scale_km(plan, outfall_km)
    above = bool((evidence.distance_km < outfall_km).any())
    latents = Latents(plan, spread, settings, scale_km, head_known=above)
    likelihood = Likelihood(frame_of(plan), latents, evidence, settings, scale_km)
    last_km = max([outfall_km + settings.structure_to * scale_km, *evidence.distance_km])
    edges = gap_edges(outfall_km, min(last_km, plan.to_km), evidence.distance_km)
    best = modes(likelihood, hypotheses(edges, settings))
    grid_km = _grid(plan, outfall_km, scale_km, evidence)
    found = draws(likelihood, best, grid_km, scale_km, settings)
    return _estimate(plan, settings, evidence, likelihood, best, found, grid_km, outfall_km, scale_km)


def _scale_km(plan, outfall_km):
    """Return the distance over which the plan's sag develops: to its critical point, or a third of the river."""
    lowest = critical_point(plan)
    length = plan.to_km - outfall_km
    if lowest.kind == MIXING_POINT or lowest.distance_km - outfall_km < 0.02 * length:
        return length / 3
    return lowest.distance_km - outfall_km


def _grid(plan, outfall_km, scale_km, evidence):
    """Return places from the first reading or the outfall to the end, closest where the sag is. [km]"""
    begin = min([outfall_km, *evidence.distance_km])
    near = min(outfall_km + 2.5 * scale_km, plan.to_km)
    far = np.geomspace(near - outfall_km, plan.to_km - outfall_km, _COARSE) + outfall_km if near < plan.to_km else []
    features = [one.distance_km for one in (*plan.inflows, *plan.weirs)] + [reach.from_km for reach in plan.reaches]
    features = np.array([km for km in features if km > outfall_km])
    places = np.concatenate([np.linspace(outfall_km, near, _FINE), far, features, features - _JUST_ABOVE_KM])
    if begin < outfall_km:
        places = np.concatenate([[begin, outfall_km - _JUST_ABOVE_KM], places])
    places = np.unique(np.clip(places, begin, plan.to_km))
    return places


def _estimate(plan, settings, evidence, likelihood, best, found, grid_km, outfall_km, scale_km):
    """Return the Estimate of draws."""
    place, lowest = _lowest(grid_km, found.do_mg_l, outfall_km)
    weight, meter = found.weight, _meter_most_read(evidence)
    stations_km = evidence.stations_km[evidence.stations_km >= outfall_km]
    places = _stretched(quantiles(place, weight, LEVEL), settings.place_stretch, outfall_km, plan.to_km)
    hours = found.rivers.travel_time_h(place)
    differences = standardised(likelihood, best)
    edges = np.searchsorted(stations_km, place)
    middle = np.array([np.interp(places.median, grid_km, one) for one in found.do_mg_l.T])
    return Estimate(
        plan=plan,
        settings=settings,
        evidence=evidence,
        critical_do_mg_l=_stretched(quantiles(lowest, weight, LEVEL), settings.do_stretch, 0.0, np.inf),
        critical_km=places,
        critical_travel_time_h=_stretched(quantiles(hours, weight, LEVEL), settings.place_stretch, 0.0, np.inf),
        rates=rate_estimates(plan, likelihood.latents, found, outfall_km),
        stations_km=stations_km,
        p_in_gap=np.bincount(edges, weights=weight, minlength=len(stations_km) + 1),
        regret_mg_l=float(weight @ (middle - lowest)),
        effective_draws=found.effective,
        differences=np.where(evidence.row >= 0, np.append(differences, np.nan)[evidence.row], np.nan),
        fit=judge(evidence, stations_km, differences, best, found, settings),
        outfall_km=outfall_km,
        scale_km=scale_km,
        grid_km=grid_km,
        draws=found,
        place_km=place,
        lowest_mg_l=lowest,
        bias_mg_l=found.truth[len(grid_km) + meter],
    )


def _meter_most_read(evidence):
    return int(np.bincount(evidence.meter, minlength=1).argmax())


def _stretched(values, factor, least, most):
    """Return an Interval with its half-widths stretched by a calibrated factor, within bounds."""
    low, median, high = np.asarray(values, dtype=float)
    low, high = median + factor * (low - median), median + factor * (high - median)
    return Interval(float(max(low, least)), float(median), float(min(high, most)))


def _lowest(grid_km, do_mg_l, outfall_km):
    """Return where oxygen is lowest in each draw and how low, between grid points by the parabola through three."""
    first = int(np.searchsorted(grid_km, outfall_km))
    grid_km, do = grid_km[first:], do_mg_l[first:]
    draw = np.arange(do.shape[1])
    at = do.argmin(axis=0)
    inner = np.clip(at, 1, len(grid_km) - 2)
    x0, x1, x2 = (grid_km[inner + shift] for shift in (-1, 0, 1))
    y0, y1, y2 = (do[inner + shift, draw] for shift in (-1, 0, 1))
    left, right = (y1 - y0) / (x1 - x0), (y2 - y1) / (x2 - x1)
    bend = (right - left) / (x2 - x0)
    # A change of slope at a weir or inflow is no parabola: its points are on the grid, a hair apart.
    smooth = (bend > 0) & (at == inner) & (np.minimum(x1 - x0, x2 - x1) > 10 * _JUST_ABOVE_KM)
    slope = (left * (x2 - x1) + right * (x1 - x0)) / (x2 - x0)
    shift = np.where(smooth, -slope / (2 * np.where(smooth, bend, 1.0)), 0.0)
    shift = np.clip(shift, (x0 - x1) / 2, (x2 - x1) / 2)
    place = np.where(smooth, x1 + shift, grid_km[at])
    lowest = np.where(smooth, y1 + slope * shift + bend * shift**2, do[at, draw])
    return place, np.maximum(lowest, 0.0)
