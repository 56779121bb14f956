"""A design by one who knows the true river, as a mark for ways of siting without that knowledge.

It places stations, no more: its readings have the same errors and go through the same estimate as everyone's. Three
designs are made for each river. Two are optimal for a river with the true structure (greedy, then exchanges), for the
variance left in the lowest oxygen and its place when the response is taken as linear about the truth, with a small and
a large smooth misfit; one spreads stations about the true critical point. Of the three, that with the smallest expected
loss is taken, found by running the estimate on simulated readings at each.
"""

from dataclasses import replace

import numpy as np

from calc.fit import refine
from calc.sag import critical_point, predict
from tests.bench.siting_rivers import BIAS_MG_L, matern

_SPREAD = (0.35, 0.7, 0.9, 1.1, 1.4, 1.9, 2.4, 0.15, 2.8, 0.55)
_MISFITS_MG_L = (0.05, 0.2)
_STEP = 0.25
_TRIALS = 4
_DO_SCALE_MG_L, _PLACE_SCALE = 0.15, 0.15


def oracle_stations(sim, n):
    """Return the access points, as indices downstream, that one who knows the river would take for n stations."""
    designs = [linear_design(sim, n, misfit) for misfit in _MISFITS_MG_L] + [_spread_design(sim, n)]
    designs = sorted({tuple(sorted(design)) for design in designs})
    errors = np.random.default_rng([7, sim.index]).standard_normal((_TRIALS, len(sim.access_km) + 1))
    return list(min(designs, key=lambda design: _expected_loss(sim, list(design), errors)))


def _expected_loss(sim, design, errors):
    """Return the mean loss of the estimate over simulated readings at a design."""
    places = sim.access_km[design]
    losses = []
    for error in errors:
        readings = sim.do_mg_l(places) + sim.noise_mg_l * error[design] + BIAS_MG_L * error[-1]
        estimate = refine(sim.plan.river, places, np.maximum(readings, 0.0))
        do_error = (estimate.critical_do_mg_l.median - sim.critical_do_mg_l) / _DO_SCALE_MG_L
        place_error = (estimate.critical_km.median / sim.critical_km - 1) / _PLACE_SCALE
        losses.append(do_error**2 + place_error**2)
    return np.nan_to_num(np.mean(losses), nan=np.inf)


def _spread_design(sim, n):
    """Return access points nearest to usual multiples of the true critical distance."""
    order = []
    for multiple in _SPREAD[:n]:
        free = np.setdiff1d(np.arange(len(sim.access_km)), order)
        order.append(int(free[np.abs(sim.access_km[free] - multiple * sim.critical_km).argmin()]))
    return order


def linear_design(sim, n, misfit_mg_l):
    """Return n access points that leave the least variance in lowest oxygen and place, taking the river as linear."""
    response, targets = _gradients(sim)
    places = np.append(sim.access_km, sim.critical_km)
    smooth = matern(places[:, None] - places, misfit_mg_l, 0.3 * sim.critical_km)
    readings = response @ response.T + smooth[:-1, :-1] + BIAS_MG_L**2 + sim.noise_mg_l**2 * np.eye(len(response))
    together = targets @ response.T
    together[0] += smooth[-1, :-1]

    def explained(design):
        part = together[:, design]
        kept = (part @ np.linalg.inv(readings[np.ix_(design, design)]) * part).sum(axis=1)
        return kept[0] / _DO_SCALE_MG_L**2 + kept[1] / (_PLACE_SCALE * sim.critical_km) ** 2

    design, points = [], range(len(response))
    for _ in range(n):
        design.append(max((each for each in points if each not in design), key=lambda each: explained([*design, each])))
    for _ in range(n):
        rest = design[1:]
        design = [*rest, max((each for each in points if each not in rest), key=lambda each: explained([*rest, each]))]
    return design


def _gradients(sim):
    """Return how oxygen at the access points, and lowest oxygen and its place, change per unit of each unknown."""
    unknowns = 9
    steps = _STEP * np.concatenate([np.eye(unknowns), -np.eye(unknowns)])
    river = _perturbed(sim.truth, steps)
    lowest = critical_point(river)
    values = (predict(river, sim.access_km).do_mg_l.T, np.array([lowest.do_mg_l, lowest.distance_km]))
    return tuple((value[:, :unknowns] - value[:, unknowns:]) / (2 * _STEP) for value in values)


def _perturbed(truth, z):
    """Return the plausible rivers about a true one for standard normal unknowns of shape (n, 9)."""
    factor = np.exp(z * (0.35, 0.40, 0.15, 0.20, 0, 0, 0.4, 0.2, 0.4)).T
    reaches = []
    for at, reach in enumerate(truth.reaches):
        further = at > 0 and len(truth.reaches) == 2
        net = (0.2 + 0.5 / reach.depth_m) * z[:, 5]
        reaches.append(
            replace(
                reach,
                kd20_per_day=reach.kd20_per_day * factor[0],
                ka20_per_day=reach.ka20_per_day * factor[1] * (factor[6] if further else 1),
                velocity_m_s=reach.velocity_m_s * factor[2] * (factor[7] if further else 1),
                respiration_mg_l_per_day=reach.respiration_mg_l_per_day + net,
            )
        )
    outfall, *tributaries = truth.inflows
    strong = replace(outfall, water=replace(outfall.water, cbod_mg_l=outfall.water.cbod_mg_l * factor[3]))
    joining = [
        replace(inflow, water=replace(inflow.water, flow_m3_s=inflow.water.flow_m3_s * factor[6]))
        for inflow in tributaries
    ]
    return replace(
        truth,
        reaches=tuple(reaches),
        inflows=(strong, *joining),
        settling_ends_km=truth.settling_ends_km * factor[8],
        initial_deficit_shift_mg_l=0.3 * z[:, 4],
    )
