"""Simulated rivers to try siting on: a true river, the plan made for it, where a crew can get at it, and its readings.

Depth, velocity, temperature and rates are drawn over the ranges that surveys meet. Reaeration follows Covar's choice,
and decay the bed effect of Hydroscience, each with scatter. A third of the rivers is one reach, a third changes reach,
a third takes in a tributary. The plan is the truth with the errors that plans have, as one reach without tributary; the
told plan also knows where the reach changes or the tributary joins, but not how large the change is.
"""

from dataclasses import dataclass, replace

import numpy as np

from calc.critical import MIXING_POINT, STILL_FALLING
from calc.demand import hydroscience_kd_per_day
from calc.oxygen import saturation_mg_l
from calc.reaeration import covar_per_day
from calc.river import Inflow, Reach, River, Water
from calc.sag import critical_point, predict

KINDS = ("one reach", "two reaches", "tributary")
WORLDS = ("base", "misfit", "production", "dispersion", "plan", "noise")
BIAS_MG_L = 0.10
# Long enough for three times the critical distance of any plan.
_LENGTH_KM = 600.0
_PLAN_LENGTH = 4.0
_CRITICAL_KM = (2.0, 60.0)
_GRID = np.concatenate([np.linspace(0, 3, 1201), np.linspace(3, 12, 601)[1:]])


@dataclass(frozen=True)
class Plan:
    """A plan as a crew has it: the river, whether changes are told, and where and how low it predicts the sag."""

    river: River
    critical_km: float
    critical_do_mg_l: float


@dataclass(frozen=True)
class Simulated:
    """A river to try siting on. access_km is sorted; readings_mg_l holds what a crew would read at each of them.

    shape_km and shape_mg_l are what the true profile has beside the closed form, nothing in the base world.
    """

    index: int
    kind: str
    truth: River
    plan: Plan
    told: Plan
    access_km: np.ndarray
    readings_mg_l: np.ndarray
    noise_mg_l: float
    bias_mg_l: float
    critical_km: float
    critical_do_mg_l: float
    shape_km: np.ndarray
    shape_mg_l: np.ndarray

    def do_mg_l(self, distance_km):
        """Return the true oxygen at a distance. [mg/L]"""
        return _profile(self.truth, self.shape_km, self.shape_mg_l, distance_km)


def simulated(seed, index, world="base"):
    """Return one Simulated river of a world; the same for the same seed and index, however many others are drawn.

    Worlds other than base differ from what an estimate may assume: "misfit" adds a smooth 0.25 mg/L to the profile,
    "production" lets photosynthesis change along the river, "dispersion" smooths the profile, "plan" has plan errors
    1.75 times as large, "noise" has noise and bias twice as large.
    """
    draw = np.random.default_rng([seed, index])
    kind = KINDS[index % len(KINDS)]
    while True:
        truth = _truth(draw, kind)
        if truth is None:
            continue
        found = _shaped(draw, truth, world)
        plan = _plan(draw, truth, 1.75 if world == "plan" else 1.0)
        if found is not None and plan is not None:
            return _surveyed(draw, index, kind, *found, plan, 2.0 if world == "noise" else 1.0)


def _truth(draw, kind):
    """Return a river of a kind, or None where its sag is not one that a survey would look for."""
    depth, velocity = np.exp(draw.uniform(np.log(0.4), np.log(4))), np.exp(draw.uniform(np.log(0.1), np.log(0.8)))
    kd = hydroscience_kd_per_day(depth) * np.exp(draw.normal(0, 0.35))
    if not 0.15 <= kd <= 1.2:
        return None
    scatter = np.exp(draw.normal(0, 0.35))
    reach = Reach(
        0,
        _LENGTH_KM,
        velocity_m_s=velocity,
        depth_m=depth,
        kd20_per_day=kd,
        ka20_per_day=covar_per_day(velocity, depth) * scatter,
        ks20_per_day=draw.uniform(0, 0.5),
        sod20_g_m2_per_day=draw.uniform(0, 2),
        photosynthesis_mg_l_per_day=draw.uniform(0, 0.5),
        respiration_mg_l_per_day=draw.uniform(0, 0.3),
    )
    truth = _with_waters(draw, reach)
    place_km = critical_point(truth).distance_km
    if not 1 <= place_km <= 100:
        return None
    if draw.random() < 0.65:
        truth = replace(truth, settling_ends_km=place_km * draw.uniform(0.2, 2))
    change_km = place_km * draw.uniform(0.3, 1.7)
    if kind == "two reaches":
        truth = _with_second_reach(draw, truth, change_km, scatter)
    elif kind == "tributary":
        truth = _with_tributary(draw, truth, change_km)
    lowest = critical_point(truth)
    kept = _CRITICAL_KM[0] <= lowest.distance_km <= _CRITICAL_KM[1] and lowest.deficit_mg_l >= 1
    return truth if kept and lowest.do_mg_l >= 0.5 else None


def _with_waters(draw, reach):
    """Return the river of one reach below an outfall, of drawn temperature, mixed demand and initial deficit."""
    celsius, mixed_cbod = draw.uniform(15, 28), np.exp(draw.uniform(np.log(8), np.log(40)))
    oxygen = float(saturation_mg_l(celsius)) - draw.uniform(0.3, 2)
    flow, share = 5.0, draw.uniform(0.05, 0.4)
    cbod = (mixed_cbod * (1 + share) - 2.0) / share
    outfall = Inflow(0.0, Water(flow * share, oxygen, celsius, cbod), "outfall", "outfall")
    return River(Water(flow, oxygen, celsius, 2.0), (reach,), (outfall,))


def _with_second_reach(draw, truth, change_km, scatter):
    reach = truth.reaches[0]
    depth = reach.depth_m * np.exp(draw.normal(0, 0.35))
    velocity = reach.velocity_m_s * np.exp(draw.normal(0, 0.3))
    ka = covar_per_day(velocity, depth) * scatter
    ks = reach.ks20_per_day * reach.depth_m / depth
    below = replace(reach, from_km=change_km, velocity_m_s=velocity, depth_m=depth, ka20_per_day=ka, ks20_per_day=ks)
    return replace(truth, reaches=(replace(reach, to_km=change_km), below))


def _with_tributary(draw, truth, change_km):
    river_flow = truth.head.flow_m3_s + truth.inflows[0].water.flow_m3_s
    celsius = truth.head.water_temp_c + draw.normal(0, 0.5)
    oxygen = float(saturation_mg_l(celsius)) * draw.uniform(0.8, 1.0)
    water = Water(river_flow * draw.uniform(0.05, 0.30), oxygen, celsius, draw.uniform(1, 6))
    return replace(truth, inflows=(*truth.inflows, Inflow(change_km, water, "tributary", "tributary")))


def _plan(draw, truth, spread):
    """Return the plan and the told plan of a true river, with errors spread times the usual; None without a sag."""
    reach = truth.reaches[0]
    kd, ka, velocity, cbod = np.exp(spread * draw.normal(0, (0.35, 0.40, 0.15, 0.20)))
    deficit, net = spread * draw.normal(0, (0.3, 0.2 + 0.5 / reach.depth_m))
    planned = replace(
        reach,
        to_km=_LENGTH_KM,
        kd20_per_day=reach.kd20_per_day * kd,
        ka20_per_day=reach.ka20_per_day * ka,
        velocity_m_s=reach.velocity_m_s * velocity,
        respiration_mg_l_per_day=reach.respiration_mg_l_per_day + net,
    )
    head, outfall = (
        replace(water, cbod_mg_l=water.cbod_mg_l * cbod, do_mg_l=max(water.do_mg_l - deficit, 0.0))
        for water in (truth.head, truth.inflows[0].water)
    )
    river = River(head, (planned,), (replace(truth.inflows[0], water=outfall),))
    lowest = critical_point(river)
    if lowest.kind in (MIXING_POINT, STILL_FALLING) or not 1 <= lowest.distance_km <= _LENGTH_KM / _PLAN_LENGTH:
        return None
    river = replace(river, reaches=(replace(planned, to_km=_PLAN_LENGTH * lowest.distance_km),))
    told = _told(river, truth)
    below = critical_point(told)
    return Plan(river, lowest.distance_km, lowest.do_mg_l), Plan(told, below.distance_km, below.do_mg_l)


def _told(plan, truth):
    """Return the plan with the true place of a change of reach or a tributary, as far as the plan reaches.

    The reach below the change is planned like the one above; the tributary has the middle of the usual sizes.
    """
    reach = plan.reaches[0]
    if len(truth.reaches) > 1 and truth.reaches[1].from_km < reach.to_km:
        change_km = truth.reaches[1].from_km
        return replace(plan, reaches=(replace(reach, to_km=change_km), replace(reach, from_km=change_km)))
    tributaries = [inflow for inflow in truth.inflows[1:] if inflow.distance_km < reach.to_km]
    if not tributaries:
        return plan
    celsius = plan.head.water_temp_c
    flow = 0.13 * (plan.head.flow_m3_s + plan.inflows[0].water.flow_m3_s)
    water = Water(flow, 0.9 * float(saturation_mg_l(celsius)), celsius, 3.0)
    return replace(plan, inflows=(*plan.inflows, replace(tributaries[0], water=water)))


def _shaped(draw, truth, world):
    """Return the truth, its shape beside the closed form, and where and how low it is; None where it is no sag."""
    lowest = critical_point(truth)
    grid_km = np.minimum(_GRID * lowest.distance_km, _LENGTH_KM)
    shape = np.zeros(len(grid_km))
    if world == "misfit":
        shape = _smooth(draw, grid_km / lowest.distance_km, 0.25, 0.3)
    elif world == "production":
        truth = _with_changing_production(draw, truth, lowest.distance_km)
    elif world == "dispersion":
        profile = predict(truth, grid_km).do_mg_l
        shape = _blurred(grid_km, profile, 0.15 * lowest.distance_km) - profile
    else:
        return truth, grid_km, shape, lowest.distance_km, lowest.do_mg_l
    profile = _profile(truth, grid_km, shape, grid_km)
    at = int(profile.argmin())
    if not _CRITICAL_KM[0] <= grid_km[at] <= _CRITICAL_KM[1] or profile[at] < 0.3:
        return None
    return truth, grid_km, shape, float(grid_km[at]), float(profile[at])


def _profile(truth, shape_km, shape_mg_l, distance_km):
    return predict(truth, distance_km).do_mg_l + np.interp(distance_km, shape_km, shape_mg_l)


def matern(apart, sd, length):
    """Return the Matérn 5/2 covariance of places so far apart."""
    ratio = np.sqrt(5) * np.abs(apart) / length
    return sd**2 * (1 + ratio + ratio**2 / 3) * np.exp(-ratio)


def _smooth(draw, place, sd, length):
    """Return a smooth random shape along places, drawn on a coarser grid; constant beyond three critical distances."""
    coarse = np.linspace(0, 3, 61)
    covariance = matern(coarse[:, None] - coarse, sd, length) + 1e-9 * np.eye(len(coarse))
    return np.interp(place, coarse, np.linalg.cholesky(covariance) @ draw.standard_normal(len(coarse)))


def _blurred(grid_km, values, width_km):
    """Return values smoothed along the river by a Gaussian of a width."""
    weights = np.exp(-0.5 * ((grid_km[:, None] - grid_km) / width_km) ** 2) * np.gradient(grid_km)
    return weights @ values / weights.sum(axis=1)


def _with_changing_production(draw, truth, critical_km):
    """Return the river with photosynthesis that comes and goes along it, as where shade and open water alternate."""
    size = draw.uniform(0.5, 2) / max(truth.reaches[0].depth_m, 0.7)
    wave, start = draw.uniform(0.5, 2), draw.uniform(0, 1)
    reaches = []
    for reach in truth.reaches:
        cuts = np.arange(1, 41) * 0.1 * critical_km
        ends = [reach.from_km, *cuts[(cuts > reach.from_km) & (cuts < reach.to_km)], reach.to_km]
        for low, high in zip(ends[:-1], ends[1:], strict=True):
            turn = np.sin(2 * np.pi * (low / critical_km / wave + start))
            shift = reach.photosynthesis_mg_l_per_day + size * turn
            reaches.append(replace(reach, from_km=low, to_km=high, photosynthesis_mg_l_per_day=shift))
    return replace(truth, reaches=tuple(reaches))


def _surveyed(draw, index, kind, truth, shape_km, shape, critical_km, critical_do, plans, worse):
    """Return the Simulated river with access points and what would be read at each."""
    plan, told = plans
    places = np.sort(draw.uniform(0.5, max(3 * plan.critical_km, 1.0), draw.integers(15, 41)))
    noise, bias = worse * draw.uniform(0.10, 0.15), worse * draw.normal(0, BIAS_MG_L)
    errors = bias + noise * draw.standard_normal(len(places))
    readings = np.maximum(_profile(truth, shape_km, shape, places) + errors, 0.0)
    return Simulated(
        index, kind, truth, plan, told, places, readings, noise, bias, critical_km, critical_do, shape_km, shape
    )
