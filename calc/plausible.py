"""Oxygen at many places in many plausible rivers around one plan, fast enough to estimate rates on site.

It gives the numbers of calc.sag.predict for a River whose fields hold arrays, and beyond that lets one change of reach
or one unrecorded confluence lie at another place in each plausible river. Arrays have the stretches first and the n
plausible rivers last; a River object for each of thousands would cost more than the arithmetic.
"""

from dataclasses import dataclass, field, replace
from math import inf

import numpy as np

from calc.balance import Balance, transfer_time_d
from calc.descent import outfall_place
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.plausible_walk import Events, descend
from calc.reaeration import at_temperature, weir_deficit_ratio
from calc.stretches import divide
from calc.travel import KM_PER_DAY, zero_km

# A withdrawal may not take all the water of a plausible river whose inflows are smaller than planned.
_LEAST_FLOW = 1e-6


@dataclass(frozen=True)
class Members:
    """How n plausible rivers differ from the plan; what is not given stays as planned.

    kd, ka, ks, velocity, sod: factors of each reach, shape (r, n) or broadcastable; net_mg_l_per_day (r, n) is added to
    the background demand. cbod, nbod (n): factors on the waters of the head and of outfalls; head_do_mg_l (n) is added
    to the head's oxygen, shift_mg_l (n) to the deficit at the outfall. inflow_flow, inflow_cbod (i, n): factors, and
    inflow_do_mg_l (i, n) an addition, for each inflow of the plan. settling_ends_km (n). From break_km (n) on, the
    factors change_* (n) apply too, and there a share (n) of the mixed water joins, with join_deficit_mg_l and
    join_cbod_mg_l (n).
    """

    count: int
    kd: np.ndarray = 1.0
    ka: np.ndarray = 1.0
    ks: np.ndarray = 1.0
    velocity: np.ndarray = 1.0
    sod: np.ndarray = 1.0
    net_mg_l_per_day: np.ndarray = 0.0
    cbod: np.ndarray = 1.0
    nbod: np.ndarray = 1.0
    head_do_mg_l: np.ndarray = 0.0
    shift_mg_l: np.ndarray = 0.0
    inflow_flow: np.ndarray | None = None
    inflow_cbod: np.ndarray | None = None
    inflow_do_mg_l: np.ndarray | None = None
    settling_ends_km: np.ndarray = inf
    break_km: np.ndarray = inf
    change_ka: np.ndarray = 1.0
    change_ks: np.ndarray = 1.0
    change_velocity: np.ndarray = 1.0
    change_sod: np.ndarray = 1.0
    share: np.ndarray = 0.0
    join_deficit_mg_l: np.ndarray = 0.0
    join_cbod_mg_l: np.ndarray = 0.0


@dataclass(frozen=True)
class Frame:
    """A plan cut into stretches once, for any number of Members: what does not differ between plausible rivers."""

    plan: object
    starts: tuple
    from_km: np.ndarray
    reach: np.ndarray
    rates20: np.ndarray
    background: np.ndarray
    shift_at: int
    has_inflows: bool
    has_weirs: bool


def frame_of(plan):
    """Return the Frame of a single river, no arrays in it."""
    starts = divide(replace(plan, settling_ends_km=inf))
    reaches = [start.reach for start in starts]
    heads = [reach.from_km for reach in plan.reaches]
    names = ("kd20_per_day", "ks20_per_day", "kn20_per_day", "ka20_per_day", "sod20_g_m2_per_day")
    rates20 = np.array([[getattr(reach, name) for reach in reaches] for name in names])
    rates20[4] /= [reach.depth_m for reach in reaches]
    background = [reach.respiration_mg_l_per_day - reach.photosynthesis_mg_l_per_day for reach in reaches]
    return Frame(
        plan=plan,
        starts=starts,
        from_km=np.array([start.from_km for start in starts]),
        reach=np.array([heads.index(reach.from_km) for reach in reaches]),
        rates20=rates20,
        background=np.array(background),
        shift_at=outfall_place(plan, starts),
        has_inflows=bool(plan.inflows),
        has_weirs=bool(plan.weirs),
    )


@dataclass(frozen=True)
class _Waters:
    """What meets the water at the head of each stretch of the plan, (s, n): state becomes keeps * state + brings."""

    keeps: np.ndarray
    brings: np.ndarray
    water_temp_c: np.ndarray
    saturation_mg_l: np.ndarray


def _waters(frame, members):
    """Return the _Waters: flows, temperature and conductance are carried down, which gives every share."""
    plan, n = frame.plan, members.count
    flow, celsius, conductance = plan.head.flow_m3_s, plan.head.water_temp_c, plan.head.conductance_us_cm
    celsius, conductance = np.full(1, celsius), np.full(1, np.nan_to_num(conductance))
    varies = members.inflow_flow is not None or np.any(members.share)
    keeps, brings = np.ones((len(frame.starts), n)), np.zeros((3, len(frame.starts), n))
    temperatures, conductances = [], []
    joined = 1.0
    places = {id(inflow): at for at, inflow in enumerate(plan.inflows)}
    for at, start in enumerate(frame.starts):
        if varies:
            joined = np.where(members.break_km < start.from_km, 1 / (1 - members.share), 1.0)
        for inflow in start.inflows:
            place, water = places[id(inflow)], inflow.water
            volume = water.flow_m3_s * (1.0 if members.inflow_flow is None else members.inflow_flow[place])
            if inflow.kind == "withdrawal":
                flow = np.maximum(flow - volume / joined, _LEAST_FLOW)
                continue
            total = flow + volume / joined
            share = np.where(total > 0, volume / joined / np.where(total > 0, total, 1.0), 0.0)
            flow = total
            keeps[at] *= 1 - share
            brings[:, at] = brings[:, at] * (1 - share) + share * _quality(members, inflow, place)
            celsius = celsius + share * (water.water_temp_c - celsius)
            conductance = conductance + share * (np.nan_to_num(water.conductance_us_cm) - conductance)
        if start.reach.water_temp_c is not None:
            celsius = np.full(1, float(start.reach.water_temp_c))
        temperatures.append(celsius)
        conductances.append(conductance)
    warmth = np.stack(np.broadcast_arrays(*temperatures))
    salinity = salinity_psu(np.stack(np.broadcast_arrays(*conductances)))
    saturation = saturation_mg_l(np.clip(warmth, 0, 40), plan.pressure_mmhg, salinity)
    return _Waters(keeps, brings, warmth, saturation)


def _quality(members, inflow, place):
    """Return oxygen and both demands of an inflow, (3, n)."""
    water, outfall = inflow.water, inflow.kind == "outfall"
    do, cbod, nbod = water.do_mg_l, water.cbod_mg_l, water.nbod_mg_l
    if outfall:
        cbod, nbod = cbod * members.cbod, nbod * members.nbod
    if members.inflow_do_mg_l is not None:
        do = np.maximum(do + members.inflow_do_mg_l[place], 0.0)
        cbod = cbod * members.inflow_cbod[place]
    return np.stack(np.broadcast_arrays(do, cbod, nbod, np.empty(members.count))[:3])


@dataclass(frozen=True)
class Plausible:
    """n plausible rivers ready to be evaluated: arrays (p, n), one row a stretch, upstream first."""

    from_km: np.ndarray
    km_per_day: np.ndarray
    saturation_mg_l: np.ndarray
    balance: Balance
    duration_d: np.ndarray
    to_zero_d: np.ndarray
    dry: list = field(default_factory=list)

    def at(self, distance_km, *, demand=False):
        """Return oxygen at places, (m, n), and with demand also the carbonaceous demand. [mg/L]"""
        place = np.zeros((len(distance_km), self.from_km.shape[1]), dtype=np.intp)
        for head_km in self.from_km[1:]:
            place += head_km <= distance_km[:, None]
        flat = place * self.from_km.shape[1] + np.arange(self.from_km.shape[1])

        def take(values):
            return values.ravel().take(flat)

        time_d = (distance_km[:, None] - take(self.from_km)) / take(self.km_per_day)
        saturation = take(self.saturation_mg_l)
        kd, ks, kn, ka = (
            self.balance.kd_per_day,
            self.balance.ks_per_day,
            self.balance.kn_per_day,
            self.balance.ka_per_day,
        )
        state = self.balance
        reaeration, head = take(ka), take(state.deficit_mg_l)
        deficit = head + (head - take(state.net_mg_l_per_day / ka)) * np.expm1(-reaeration * time_d)
        deficit += take(kd * state.cbod_mg_l) * transfer_time_d(take(kd + ks), reaeration, time_d)
        if np.any(state.nbod_mg_l) and np.any(kn):
            deficit += take(kn * state.nbod_mg_l) * transfer_time_d(take(kn), reaeration, time_d)
        cbod = take(state.cbod_mg_l) * np.exp(-take(kd + ks) * time_d) if demand else None
        for piece in self.dry:
            piece.apply(place, time_d, deficit, cbod)
        do = np.maximum(saturation - deficit, 0.0)
        return (do, cbod) if demand else do

    def travel_time_h(self, distance_km):
        """Return the travel time from the outfall at 0 km to one place in each river, distance_km of shape (n,). [h]"""
        place = (self.from_km <= distance_km).sum(axis=0) - 1
        rivers = np.arange(self.from_km.shape[1])
        begun = np.concatenate([np.zeros((1, len(rivers))), np.cumsum(self.duration_d, axis=0)])[place, rivers]
        within = (distance_km - self.from_km[place, rivers]) / self.km_per_day[place, rivers]
        return 24 * (begun + within - self.to_zero_d)


def unfold(frame, members):
    """Return the Plausible rivers of Members around the plan of a Frame."""
    waters = _waters(frame, members)
    order, start, from_km = _order(frame, members)
    flat = start * members.count + np.arange(members.count)

    def pick(values):
        if values.shape[-1] == 1:
            return values[:, 0][start]
        return values.ravel().take(flat)

    kd, ks, kn, ka, net, km_per_day = _rates(frame, members, waters, pick, from_km)
    saturation = pick(waters.saturation_mg_l)
    to_km = np.concatenate([from_km[1:], np.full((1, members.count), frame.plan.to_km)])
    duration = (to_km - from_km) / km_per_day
    events = _events(frame, members, waters, order, start, pick, saturation)
    balance, dry = descend(frame, members, (kd, ks, kn, ka, net), saturation, duration, events)
    to_zero = _hours_to_zero(frame, from_km, to_km, km_per_day)
    return Plausible(from_km, km_per_day, saturation, balance, duration, to_zero, dry)


def _hours_to_zero(frame, from_km, to_km, km_per_day):
    """Return the days from the first reach's head to where travel time counts from."""
    zero = zero_km(frame.plan)
    return ((np.clip(zero, from_km, to_km) - from_km) / km_per_day).sum(axis=0)


def _order(frame, members):
    """Return what each stretch begins with, the plan's stretch it is in, and where it begins: (p, n) each.

    The first are places in the plan's stretches, then one for where settling ends and one for the break.
    """
    n, plan = members.count, frame.plan
    inner = [
        np.broadcast_to(np.clip(km, plan.from_km, plan.to_km), n) for km in (members.settling_ends_km, members.break_km)
    ]
    heads = np.concatenate([np.repeat(frame.from_km[:, None], n, axis=1), np.stack(inner)])
    order = heads.argsort(axis=0, kind="stable")
    start = np.cumsum(order < len(frame.from_km), axis=0) - 1
    return order, np.maximum(start, 0), np.take_along_axis(heads, order, axis=0)


def _rates(frame, members, waters, pick, from_km):
    """Return kd, ks, kn, ka, net background demand and velocity in each stretch, (p, n), at the water's temperature."""
    thetas, reach, n = frame.plan.thetas, frame.reach, members.count

    def factor(values):
        values = np.asarray(values, dtype=float)
        return values[reach] if values.ndim == 2 else values

    warmth = waters.water_temp_c
    names = ("kd", "ks", "kn", "ka", "sod")
    kd, ks, kn, ka, sod = (
        at_temperature(rate[:, None], warmth, getattr(thetas, name))
        for rate, name in zip(frame.rates20, names, strict=True)
    )
    changed = from_km >= members.break_km
    full = np.empty((len(reach), n))
    net = pick(np.broadcast_arrays(sod * factor(members.sod), full)[0]) * np.where(
        changed, members.change_sod, 1.0
    ) + pick(np.broadcast_arrays(frame.background[:, None] + factor(members.net_mg_l_per_day), full)[0])
    speed = np.array([start.reach.velocity_m_s for start in frame.starts])[:, None] * KM_PER_DAY
    settles = np.where(changed, members.change_ks, 1.0) * (from_km < members.settling_ends_km)
    return (
        pick(kd * factor(members.kd)),
        pick(ks * factor(members.ks)) * settles,
        pick(kn),
        pick(ka * factor(members.ka)) * np.where(changed, members.change_ka, 1.0),
        net,
        pick(speed * factor(members.velocity)) * np.where(changed, members.change_velocity, 1.0),
    )


def _events(frame, members, waters, order, start, pick, saturation):
    plan_head = order < len(frame.from_km)
    broken = order == len(frame.from_km) + 1
    keeps = np.where(plan_head, pick(waters.keeps), np.where(broken, 1 - members.share, 1.0))
    join = (np.maximum(saturation - members.join_deficit_mg_l, 0.0), members.join_cbod_mg_l, 0.0)
    brings = np.stack(
        [
            np.where(plan_head, pick(brought), np.where(broken, members.share * water, 0.0))
            for brought, water in zip(waters.brings, join, strict=True)
        ]
    )
    shift = np.where(order == frame.shift_at, members.shift_mg_l, 0.0) if np.any(members.shift_mg_l) else None
    ratio = None
    if frame.has_weirs:
        ratios = np.ones((len(frame.starts), waters.water_temp_c.shape[1]))
        for at, each in enumerate(frame.starts):
            for weir in each.weirs:
                ratios[at] *= weir_deficit_ratio(weir.drop_m, waters.water_temp_c[at], weir.quality, weir.shape)
        ratio = np.where(plan_head, pick(ratios), 1.0)
    return Events(keeps, brings, shift, ratio)
