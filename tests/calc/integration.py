"""The same balance as calc.sag, integrated step by step, and random rivers to compare the two on."""

from itertools import pairwise

import numpy as np
from scipy.integrate import solve_ivp

from calc.oxygen import salinity_psu, saturation_mg_l
from calc.reaeration import weir_deficit_ratio
from calc.river import Inflow, Reach, River, Thetas, Water, Weir

TOLERANCE = {"method": "DOP853", "rtol": 1e-11, "atol": 1e-11}


def integrate(river, distance_km, **tolerance):
    """Return do, cbod and nbod at each distance, by DOP853 with events where the balance changes its form."""
    head = river.head
    state = np.array([head.do_mg_l, head.water_temp_c, head.cbod_mg_l, head.nbod_mg_l, head.conductance_us_cm])
    flow = head.flow_m3_s
    places = {reach.from_km for reach in river.reaches} | {river.to_km}
    places |= {feature.distance_km for feature in (*river.inflows, *river.weirs)}
    if river.from_km < river.settling_ends_km < river.to_km:
        places.add(river.settling_ends_km)
    places = sorted(places)
    found = np.full((3, len(distance_km)), np.nan)
    for from_km, to_km in zip(places, [*places[1:], None], strict=True):
        reach = [reach for reach in river.reaches if reach.from_km <= from_km][-1]
        if reach.water_temp_c is not None:
            state[1] = reach.water_temp_c
        state, flow = _meet(river, from_km, reach, state, flow)
        if to_km is None:
            here = distance_km == from_km
            found[:, here] = state[[0, 2, 3], None]
            break
        wanted = (distance_km >= from_km) & (distance_km < to_km)
        speed = 86.4 * reach.velocity_m_s
        times = np.append((distance_km[wanted] - from_km) / speed, (to_km - from_km) / speed)
        values = _integrate_stretch(river, reach, state, times, from_km >= river.settling_ends_km, tolerance)
        found[:, wanted] = values[:, :-1]
        state[[0, 2, 3]] = values[:, -1]
    return found


def _meet(river, place_km, reach, state, flow):
    """Return state and flow below everything that meets the water at a place."""
    for inflow in river.inflows:
        water = inflow.water
        if inflow.distance_km != place_km:
            continue
        if inflow.kind == "withdrawal":
            flow -= water.flow_m3_s
            continue
        joins = (water.do_mg_l, water.water_temp_c, water.cbod_mg_l, water.nbod_mg_l, water.conductance_us_cm)
        state = (state * flow + np.array(joins) * water.flow_m3_s) / (flow + water.flow_m3_s)
        flow += water.flow_m3_s
    if reach.water_temp_c is not None:
        state[1] = reach.water_temp_c
    for weir in river.weirs:
        if weir.distance_km == place_km:
            saturation = _saturation(river, state)
            if state[0] < saturation:
                ratio = weir_deficit_ratio(weir.drop_m, state[1], weir.quality, weir.shape)
                state[0] = saturation - (saturation - state[0]) / ratio
    return state, flow


def _saturation(river, state):
    return float(saturation_mg_l(state[1], river.pressure_mmhg, salinity_psu(state[4])))


def _integrate_stretch(river, reach, state, times, settled, tolerance):
    """Return do, cbod and nbod at the times, changing between the balances with and without oxygen."""
    saturation = _saturation(river, state)
    ka, modes = _modes(river, reach, state[1] - 20, saturation, settled)
    y, clock, mode = np.array([saturation - state[0], state[2], state[3]]), 0.0, "oxic"
    found = np.full((3, len(times)), np.nan)
    while True:
        mode = _mode_at(mode, modes, y, saturation)
        derivative, event = modes[mode]
        # A stretch that begins without oxygen, or gets it back, is on its threshold and leaves it upwards.
        events = None if mode == "oxic" and y[0] >= saturation else event
        # Steps no longer than 1/ka keep the values between steps as good as those at them, and short ones no longer
        # than 0.05 days see oxygen run out even where it soon returns.
        how = {"dense_output": True, "max_step": min(1 / ka, 0.05), **tolerance}
        run = solve_ivp(derivative, (clock, times[-1]), y, events=events, **how)
        until = times[-1] if run.status == 0 else run.t_events[0][-1]
        reached = (times >= clock) & (times <= until)
        if reached.any():
            found[:, reached] = run.sol(times[reached])
        if run.status == 0:
            break
        clock, y = until, run.y_events[0][-1].copy()
        y[0] = saturation
    found[0] = saturation - found[0]
    return found


def _mode_at(mode, modes, y, saturation):
    """Return the form of the balance that goes on from a state; less than 1e-9 mg/L a day is on the threshold."""
    if mode == "oxic" and y[0] >= saturation and modes["oxic"][0](0, y)[0] > 1e-9:
        mode = "carbon first"
    if mode == "carbon first" and modes[mode][1](0, y) >= -1e-9:
        mode = "nitrogen shares"
    if mode == "nitrogen shares" and modes[mode][1](0, y) >= -1e-9:
        mode = "oxic"
    return mode


def _modes(river, reach, warm, saturation, settled):
    """Return ka, and the derivative and the ending event of each form of the balance."""
    thetas = river.thetas
    kd, ka = reach.kd20_per_day * thetas.kd**warm, reach.ka20_per_day * thetas.ka**warm
    kn, ks = reach.kn20_per_day * thetas.kn**warm, reach.ks20_per_day * thetas.ks**warm
    kr = kd if settled else kd + ks
    net = reach.respiration_mg_l_per_day - reach.photosynthesis_mg_l_per_day
    net += reach.sod20_g_m2_per_day * thetas.sod**warm / reach.depth_m
    supply = max(ka * saturation - net, 0.0)

    def content(*demands):
        def event(_, y):
            left = supply - sum(rate * y[place] for rate, place in demands)
            return left if supply > 0 else -1.0

        return event

    modes = {
        "oxic": (
            lambda _, y: [kd * y[1] + kn * y[2] + net - ka * y[0], -kr * y[1], -kn * y[2]],
            lambda _, y: y[0] - saturation,
        ),
        "carbon first": (lambda _, y: [0.0, -supply - (kr - kd) * y[1], 0.0], content((kd, 1))),
        "nitrogen shares": (lambda _, y: [0.0, -kr * y[1], kd * y[1] - supply], content((kd, 1), (kn, 2))),
    }
    for _, event in modes.values():
        event.terminal, event.direction = True, 1
    return ka, modes


def random_river(seed):
    """Return a river of 1 to 6 reaches; what is awkward about it depends on the seed."""
    rng = np.random.default_rng(seed)
    count = int(rng.integers(1, 7))
    widths = rng.uniform(1.0, 5.0, count)
    edges = np.append(-2.0, np.cumsum(widths) * 64.0 / widths.sum() - 2.0)
    strong = rng.random() < 0.45
    reaches = tuple(_random_reach(rng, from_km, to_km) for from_km, to_km in pairwise(edges.tolist()))
    outfall = _random_water(rng, flow=rng.uniform(0.1, 2.0), demand=150.0 if strong else 40.0)
    inflows = [Inflow(0.0, outfall, kind="outfall")]
    weirs = []
    for _ in range(rng.integers(0, 3)):
        inflows.append(Inflow(float(rng.uniform(0, 61.9)), _random_water(rng, flow=rng.uniform(0.05, 1.5), demand=5.0)))
    if rng.random() < 0.3:
        taken = Water(0.2, 0, 0)
        inflows.append(Inflow(float(rng.uniform(0, 61.9)), taken, kind="withdrawal"))
    if rng.random() < 0.2:
        inflows.append(Inflow(edges[-2].item(), _random_water(rng, flow=0.5, demand=5.0)))
    for _ in range(rng.integers(0, 3)):
        weirs.append(
            Weir(float(rng.uniform(0, 61.9)), float(rng.uniform(0.2, 2.0)), quality=float(rng.choice([0.65, 1.8])))
        )
    head = _random_water(rng, flow=rng.uniform(1.0, 6.0), demand=4.0)
    if rng.random() < 0.15:
        head = Water(head.flow_m3_s, 14.0, 22.0, 1.0, 0.2, 300.0)
    return River(
        head,
        reaches,
        tuple(inflows),
        tuple(weirs),
        pressure_mmhg=float(rng.uniform(700, 765)),
        settling_ends_km=float(rng.uniform(-5, 80)),
        thetas=Thetas(1.0, 1.0, 1.0, 1.0, 1.0) if rng.random() < 0.4 else Thetas(),
    )


def _random_water(rng, flow, demand):
    return Water(
        float(flow),
        float(rng.uniform(0, 9)),
        float(rng.uniform(8, 28)),
        float(rng.uniform(0.2, 1) * demand),
        float(rng.choice([0.0, rng.uniform(0, 1) * demand])),
        float(rng.uniform(100, 1500)),
    )


def _random_reach(rng, from_km, to_km):
    kd = float(rng.uniform(0.1, 1.2))
    ks = float(rng.choice([0.0, rng.uniform(0, 0.6)]))
    ka = float(rng.choice([kd, kd + ks, 0.5 * kd, rng.uniform(0.2, 1.5), rng.uniform(1, 12), 40.0]))
    return Reach(
        from_km,
        to_km,
        float(rng.uniform(0.05, 0.8)),
        float(rng.uniform(0.3, 4)),
        kd,
        ka,
        ks20_per_day=ks,
        kn20_per_day=float(rng.choice([0.0, kd, ka, rng.uniform(0, 1)])),
        sod20_g_m2_per_day=float(rng.choice([0.0, rng.uniform(0, 4)])),
        respiration_mg_l_per_day=float(rng.uniform(0, 1)),
        photosynthesis_mg_l_per_day=float(rng.choice([0.0, rng.uniform(0, 5)])),
        water_temp_c=None if rng.random() < 0.6 else float(rng.uniform(5, 30)),
    )
