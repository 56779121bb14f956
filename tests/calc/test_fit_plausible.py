"""Many plausible rivers at once give the numbers of calc.sag, and their sensitivities the known best sampling times."""

from dataclasses import replace

import numpy as np
import pytest

from calc.plausible import Members, frame_of, unfold
from calc.river import Inflow, Reach, River, Thetas, Water
from calc.sag import predict
from tests.calc.integration import random_river

COUNT = 6


def members_around(plan, rng):
    """Return Members that differ from a plan in everything that may differ, and the same as a River of arrays."""
    reaches, inflows = len(plan.reaches), len(plan.inflows)

    def factor(*shape):
        return np.exp(rng.normal(0, 0.3, shape))

    tributary = np.array([[inflow.kind == "tributary"] for inflow in plan.inflows])
    return Members(
        COUNT,
        kd=factor(reaches, COUNT),
        ka=factor(reaches, COUNT),
        ks=factor(reaches, COUNT),
        velocity=factor(reaches, COUNT),
        sod=factor(reaches, COUNT),
        net_mg_l_per_day=rng.normal(0, 0.3, (reaches, COUNT)),
        cbod=factor(COUNT),
        nbod=factor(COUNT),
        head_do_mg_l=rng.normal(0, 0.2, COUNT),
        shift_mg_l=rng.normal(0, 0.3, COUNT),
        inflow_flow=np.where(tributary, factor(inflows, COUNT), 1.0),
        inflow_cbod=factor(inflows, COUNT),
        inflow_do_mg_l=rng.normal(0, 0.5, (inflows, COUNT)),
        settling_ends_km=rng.uniform(-5, 80, COUNT),
    )


def river_of(plan, members):
    """Return the River with arrays that Members describe, without their break."""
    reaches = tuple(
        replace(
            reach,
            kd20_per_day=reach.kd20_per_day * members.kd[at],
            ka20_per_day=reach.ka20_per_day * members.ka[at],
            ks20_per_day=reach.ks20_per_day * members.ks[at],
            velocity_m_s=reach.velocity_m_s * members.velocity[at],
            sod20_g_m2_per_day=reach.sod20_g_m2_per_day * members.sod[at],
            respiration_mg_l_per_day=reach.respiration_mg_l_per_day + members.net_mg_l_per_day[at],
        )
        for at, reach in enumerate(plan.reaches)
    )
    head = replace(
        plan.head,
        do_mg_l=np.maximum(plan.head.do_mg_l + members.head_do_mg_l, 0),
        cbod_mg_l=plan.head.cbod_mg_l * members.cbod,
        nbod_mg_l=plan.head.nbod_mg_l * members.nbod,
    )
    return replace(
        plan,
        head=head,
        reaches=reaches,
        inflows=tuple(joining(inflow, at, members) for at, inflow in enumerate(plan.inflows)),
        initial_deficit_shift_mg_l=members.shift_mg_l,
        settling_ends_km=members.settling_ends_km,
    )


def joining(inflow, at, members):
    water, outfall = inflow.water, inflow.kind == "outfall"
    flow = water.flow_m3_s * members.inflow_flow[at]
    if inflow.kind == "withdrawal":
        return replace(inflow, water=replace(water, flow_m3_s=flow))
    changed = replace(
        water,
        flow_m3_s=flow,
        do_mg_l=np.maximum(water.do_mg_l + members.inflow_do_mg_l[at], 0),
        cbod_mg_l=water.cbod_mg_l * members.inflow_cbod[at] * (members.cbod if outfall else 1),
        nbod_mg_l=water.nbod_mg_l * (members.nbod if outfall else 1),
    )
    return replace(inflow, water=changed)


def with_change(river, members, place_km):
    """Return the river with the change of reach of Members at a place."""

    def changed(reach):
        return replace(
            reach,
            ka20_per_day=reach.ka20_per_day * members.change_ka,
            ks20_per_day=reach.ks20_per_day * members.change_ks,
            velocity_m_s=reach.velocity_m_s * members.change_velocity,
            sod20_g_m2_per_day=reach.sod20_g_m2_per_day * members.change_sod,
        )

    reaches = []
    for reach in river.reaches:
        if reach.to_km <= place_km:
            reaches.append(reach)
        elif reach.from_km >= place_km:
            reaches.append(changed(reach))
        else:
            reaches += [replace(reach, to_km=place_km), changed(replace(reach, from_km=place_km))]
    return replace(river, reaches=tuple(reaches))


def with_confluence(river, members, place_km):
    """Return the river with the confluence of Members at a place."""
    above = predict(river, place_km)
    water = Water(
        above.flow_m3_s * members.share / (1 - members.share),
        np.maximum(above.saturation_mg_l - members.join_deficit_mg_l, 0),
        above.water_temp_c,
        members.join_cbod_mg_l,
        np.zeros(COUNT),
        above.conductance_us_cm,
    )
    return replace(river, inflows=(*river.inflows, Inflow(place_km, water)))


def agree(plan, members, river):
    places = np.sort(np.append(np.linspace(-2, 62, 33), [inflow.distance_km for inflow in river.inflows]))
    rivers = unfold(frame_of(plan), members)
    do, cbod = rivers.at(places, demand=True)
    expected = predict(river, places)
    assert do == pytest.approx(expected.do_mg_l.T, abs=1e-9)
    assert cbod == pytest.approx(expected.cbod_mg_l.T, abs=1e-9)
    assert rivers.at(places) == pytest.approx(do, abs=0)
    hours = predict(river, 31.0).travel_time_h
    assert rivers.travel_time_h(np.full(COUNT, 31.0)) == pytest.approx(hours, rel=1e-12)


@pytest.mark.parametrize("seed", range(0, 60, 2))
def test_rivers_with_a_change_of_reach_agree_with_the_predicted_sag(seed):
    rng = np.random.default_rng(seed)
    plan, place_km = random_river(seed), float(rng.uniform(-1.9, 61))
    changes = {name: np.exp(rng.normal(0, 0.3, COUNT)) for name in ("ka", "ks", "velocity", "sod")}
    members = replace(
        members_around(plan, rng),
        break_km=np.full(COUNT, place_km),
        **{f"change_{name}": change for name, change in changes.items()},
    )
    agree(plan, members, with_change(river_of(plan, members), members, place_km))


@pytest.mark.parametrize("seed", range(1, 60, 2))
def test_rivers_with_an_unrecorded_confluence_agree_with_the_predicted_sag(seed):
    rng = np.random.default_rng(seed)
    plan, place_km = random_river(seed), float(rng.uniform(-1.9, 61))
    members = replace(
        members_around(plan, rng),
        break_km=np.full(COUNT, place_km),
        share=rng.uniform(0.02, 0.34, COUNT),
        join_deficit_mg_l=rng.uniform(0, 2, COUNT),
        join_cbod_mg_l=rng.uniform(0, 6, COUNT),
    )
    agree(plan, members, with_confluence(river_of(plan, members), members, place_km))


def test_what_is_not_given_stays_as_planned():
    plan = random_river(3)
    places = np.linspace(-2, 62, 50)
    expected = predict(replace(plan, settling_ends_km=np.inf), places).do_mg_l
    for column in unfold(frame_of(plan), Members(2)).at(places).T:
        assert column == pytest.approx(expected, abs=1e-10)


def two_rates(kd, ka, cbod=1.0):
    """Return the classic two-rate sag without initial deficit, one day's travel being 1 km."""
    reach = Reach(0, 40, velocity_m_s=1 / 86.4, depth_m=1.0, kd20_per_day=kd, ka20_per_day=ka)
    return River(Water(1.0, 9.0926, 20.0, cbod), (reach,), thetas=Thetas(1, 1, 1, 1, 1))


def slopes(plan, places, **factors):
    """Return the change of oxygen and of demand at places per unit of each factor, by central differences."""
    step, found = 1e-5, []
    for name, planned in factors.items():
        values = planned * (1 + np.array([[step, -step]]))
        do, cbod = unfold(frame_of(plan), Members(2, **{name: values / planned})).at(places, demand=True)
        found.append([(value[:, 0] - value[:, 1]) / (2 * step) for value in (do, cbod)])
    return np.array(found)


def test_the_best_two_times_for_two_consecutive_rates_are_those_of_box_and_lucas():
    # G. E. P. Box and H. L. Lucas, "Design of experiments in non-linear situations", Biometrika, vol. 46, pp. 77-90,
    # 1959: for eta = k1/(k1 - k2) (exp(-k2 t) - exp(-k1 t)) with k1 = 0.7 and k2 = 0.2 they are 1.23 and 6.86.
    times = np.arange(0.05, 15, 0.01)
    oxygen = slopes(two_rates(0.7, 0.2), times, kd=0.7, ka=0.2)[:, 0]
    determinant = np.abs(oxygen[0][:, None] * oxygen[1] - oxygen[1][:, None] * oxygen[0])
    first, second = np.unravel_index(determinant.argmax(), determinant.shape)
    assert sorted([times[first], times[second]]) == pytest.approx([1.23, 6.86], abs=0.011)


@pytest.mark.parametrize("rate", [0.2, 0.5, 1.25])
def test_the_best_time_for_one_rate_of_decay_is_its_mean_life(rate):
    # The same paper: exp(-k t) is best read at t = 1/k.
    times = np.arange(0.05, 15, 0.01)
    demand = slopes(two_rates(rate, 5.0), times, kd=rate)[0, 1]
    assert times[np.abs(demand).argmax()] == pytest.approx(1 / rate, abs=0.011)
