"""Ways of choosing stations, and what each makes of a simulated river.

Every strategy reads the same river at the same access points with the same errors. The adaptive ones start with the two
stations nearest to 0.7 and 1.5 of the predicted critical distance. Driving is the distance along the river from the
outfall to the first station and from each station to the next, in the order they are measured.
"""

from dataclasses import dataclass, replace
from math import nan
from time import process_time

import numpy as np

from calc.fit import refine
from calc.siting import next_station, verdict
from tests.bench.siting_oracle import oracle_stations

LOWEST = "even spacing, lowest reading"
EVEN = "even spacing, this estimate"
HALVE = "bracket and halve"
NEXT = "where next"
UNRESTRAINED = "where next, unrestrained"
TOLD = "where next, changes told"
EVEN_TOLD = "even spacing, changes told"
ORACLE = "oracle design"
STRATEGIES = (LOWEST, EVEN, HALVE, NEXT, UNRESTRAINED, TOLD, EVEN_TOLD, ORACLE)
SIZES = (4, 6, 8, 10)
ASKED_FROM = 4
_START = (0.7, 1.5)
# The plan default of the trade, as multiples of the predicted critical distance.
_EVEN_FROM, _EVEN_TO = 0.25, 2.0
_EXTEND = 0.375
_MINUTES_PER_KM = 2.0


@dataclass(frozen=True)
class Outcome:
    """What a strategy gave at one river with n stations. Errors are estimate less truth; place is a share of the truth.

    do_inside and place_inside tell whether the 90 % interval holds the truth, NaN without an interval; word is the
    verdict's, where one was asked; fit is the estimate's word on itself. Times are milliseconds of processor
    time of the last step.
    """

    strategy: str
    index: int
    kind: str
    n: int
    do_error_mg_l: float
    place_error: float
    regret_mg_l: float
    between: bool
    driving_km: float
    do_inside: float = nan
    place_inside: float = nan
    do_half_mg_l: float = nan
    place_half: float = nan
    word: str = ""
    fit: str = ""
    estimate_ms: float = nan
    suggest_ms: float = nan
    verdict_ms: float = nan


def outcomes(sim, strategies, sizes):
    """Return the Outcomes of strategies at one simulated river, for each number of stations it has access for."""
    sizes = [n for n in sizes if n <= len(sim.access_km)]
    found = []
    for strategy in strategies:
        if strategy in (LOWEST, EVEN, EVEN_TOLD):
            found += [_even(sim, strategy, n) for n in sizes]
        elif strategy == ORACLE:
            found += [_estimated(sim, ORACLE, sim.plan, oracle_stations(sim, n))[0] for n in sizes if n == 6]
        else:
            found += _adaptive(sim, strategy, sizes)
    return found


def _even(sim, strategy, n):
    targets = np.linspace(_EVEN_FROM, _EVEN_TO, n) * sim.plan.critical_km
    order = sorted(nearest_free(sim.access_km, targets))
    if strategy != LOWEST:
        return _estimated(sim, strategy, sim.told if strategy == EVEN_TOLD else sim.plan, order)[0]
    lowest = min(order, key=lambda station: sim.readings_mg_l[station])
    return _outcome(sim, strategy, order, sim.readings_mg_l[lowest], sim.access_km[lowest])


def nearest_free(access_km, targets_km):
    """Return for each target the index of the nearest access point that no target before it took."""
    order = []
    for target in targets_km:
        free = np.setdiff1d(np.arange(len(access_km)), order)
        order.append(int(free[np.abs(access_km[free] - target).argmin()]))
    return order


def _adaptive(sim, strategy, sizes):
    """Return the Outcomes of one survey that goes on to the largest size; "where next" is asked after every station."""
    plan = sim.told if strategy == TOLD else sim.plan
    order = nearest_free(sim.access_km, np.multiply(_START, sim.plan.critical_km))
    asked = range(ASKED_FROM, max(sizes) + 1) if strategy == NEXT else sizes
    found, spent_ms = [], nan
    while True:
        estimate = None
        if len(order) in asked:
            outcome, estimate = _estimated(sim, strategy, plan, order, suggest_ms=spent_ms, asks=strategy == NEXT)
            found.append(outcome)
        if len(order) >= max(sizes):
            return found
        if strategy == HALVE:
            order.append(halving(sim, order))
            continue
        estimate = estimate or refine(plan.river, sim.access_km[order], sim.readings_mg_l[order])
        began = process_time()
        order.append(_where_next(sim, plan, order, estimate, free_to_drive=strategy == UNRESTRAINED))
        spent_ms = 1e3 * (process_time() - began)


def _where_next(sim, plan, order, estimate, *, free_to_drive):
    """Return the access point that next_station puts first, or the nearest free to the estimate when it names none.

    Who is free to drive takes the best gain, however far.
    """
    free = np.ones(len(sim.access_km), dtype=bool)
    free[order] = False
    settings = replace(estimate.settings, enough_of_best=1.0) if free_to_drive else estimate.settings
    costs = _MINUTES_PER_KM * np.abs(sim.access_km - sim.access_km[order[-1]])
    stations_km, readings = sim.access_km[order], sim.readings_mg_l[order]
    found = next_station(
        plan.river,
        stations_km,
        readings,
        sim.access_km,
        estimate=estimate,
        costs_min=costs,
        usable=free,
        settings=settings,
    )
    if found:
        return int(found[0].access_index)
    return int(np.where(free, np.abs(sim.access_km - estimate.critical_km.median), np.inf).argmin())


def halving(sim, order):
    """Return the next access point by the trade's rule: extend past an open end, else halve the wider gap beside it."""
    access_km, last_km = sim.access_km, len(sim.access_km) - 1
    stations = sorted(order)
    at = int(np.argmin(sim.readings_mg_l[stations]))
    step_km = _EXTEND * sim.plan.critical_km
    free = np.setdiff1d(np.arange(last_km + 1), order)
    below, above = free[free > stations[-1]], free[free < stations[0]]
    if at == len(stations) - 1 and len(below):
        return _closest(access_km, below, access_km[stations[-1]] + step_km)
    if at == 0 and len(above):
        return _closest(access_km, above, access_km[stations[0]] - step_km)
    gaps = [gap for gap in (at - 1, at) if 0 <= gap < len(stations) - 1]
    wider = max(gaps, key=lambda gap: access_km[stations[gap + 1]] - access_km[stations[gap]])
    return _closest(access_km, free, (access_km[stations[wider]] + access_km[stations[wider + 1]]) / 2)


def _closest(access_km, free, target_km):
    return int(free[np.abs(access_km[free] - target_km).argmin()])


def _estimated(sim, strategy, plan, order, *, suggest_ms=nan, asks=False):
    """Return the Outcome of readings taken in an order, and the estimate made of them."""
    stations_km, readings = sim.access_km[order], sim.readings_mg_l[order]
    began = process_time()
    estimate = refine(plan.river, stations_km, readings)
    done = process_time()
    word, verdict_ms = "", nan
    if asks:
        left = np.delete(sim.access_km, order)
        word = verdict(plan.river, stations_km, readings, estimate=estimate, access_km=left).word
        verdict_ms = 1e3 * (process_time() - done)
    do, place = estimate.critical_do_mg_l, estimate.critical_km
    outcome = _outcome(
        sim,
        strategy,
        order,
        do.median,
        place.median,
        do_inside=float(do.low <= sim.critical_do_mg_l <= do.high),
        place_inside=float(place.low <= sim.critical_km <= place.high),
        do_half_mg_l=(do.high - do.low) / 2,
        place_half=(place.high - place.low) / 2 / sim.critical_km,
        word=word,
        fit=estimate.fit.word,
        estimate_ms=1e3 * (done - began),
        suggest_ms=suggest_ms,
        verdict_ms=verdict_ms,
    )
    return outcome, estimate


def _outcome(sim, strategy, order, do_mg_l, place_km, **more):
    """Return an Outcome; without a finite estimate the lowest reading stands for it, as a crew would have to do."""
    places = sim.access_km[order]
    if not np.isfinite([do_mg_l, place_km]).all():
        at = sim.readings_mg_l[order].argmin()
        do_mg_l, place_km = sim.readings_mg_l[order][at], places[at]
    return Outcome(
        strategy,
        sim.index,
        sim.kind,
        len(order),
        float(do_mg_l - sim.critical_do_mg_l),
        float(place_km / sim.critical_km - 1),
        float(sim.do_mg_l(max(place_km, 0.0)) - sim.critical_do_mg_l),
        bool(places.min() < sim.critical_km < places.max()),
        float(np.abs(np.diff(places, prepend=0.0)).sum()),
        **more,
    )
