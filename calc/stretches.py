"""A river cut into uniform stretches, with the state of the water at the head of each.

A stretch ends wherever something changes: at a reach, an inflow, a withdrawal or a weir, where settling ends, and
where oxygen runs out or returns. Flow, temperature and conductance are carried down first, which gives every rate; then
oxygen and demand. In all of it a value is a float for one river, and an array of shape (n,) for n plausible rivers.

Where several things meet at one place the water first enters the next reach, then the inflows join in their given
order, then it falls over the weirs.
"""

from dataclasses import dataclass
from math import isnan, nan
from typing import NamedTuple

import numpy as np

from calc.balance import Balance
from calc.descent import Caution, Rates, blend, descend, in_any
from calc.errors import OutOfRangeError
from calc.mixing import mixed
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.reaeration import at_temperature
from calc.river import Inflow, Reach, Weir
from calc.travel import KM_PER_DAY


class Start(NamedTuple):
    """Where a stretch begins and what meets the water there, in the order it does.

    It ends at to_km: at next_km, the next place that is the same in all plausible rivers, or where settling ends (n).
    Below the latter, settled is True.
    """

    reach: Reach
    from_km: float
    to_km: float
    next_km: float
    new_reach: bool = False
    inflows: tuple[Inflow, ...] = ()
    weirs: tuple[Weir, ...] = ()
    settled: bool = False

    @property
    def mixes(self):
        """Whether other water joins here."""
        return any(inflow.kind != "withdrawal" for inflow in self.inflows)


@dataclass(frozen=True)
class Stretches:
    """The stretches of a river, upstream first. Arrays of shape (s,) for one river, (s, n) for n plausible ones.

    start[i] is the place in starts that stretch i belongs to; the other fields hold at the head of the stretch or all
    along it. A stretch may have no length.
    """

    starts: tuple[Start, ...]
    start: np.ndarray
    phase: np.ndarray
    from_km: np.ndarray
    to_km: np.ndarray
    head_time_d: np.ndarray
    km_per_day: np.ndarray
    water_temp_c: np.ndarray
    saturation_mg_l: np.ndarray
    flow_m3_s: np.ndarray
    conductance_us_cm: np.ndarray
    balance: Balance
    cautions: tuple[Caution, ...]


def members_of(river):
    """Return how many plausible rivers the arrays in a river hold, or None for a single river."""
    parts = (river, river.head, *river.reaches, *(inflow.water for inflow in river.inflows), *river.weirs)
    shapes = {value.shape for part in parts for value in vars(part).values() if isinstance(value, np.ndarray)}
    if len(shapes) > 1 or any(len(shape) != 1 for shape in shapes):
        raise OutOfRangeError(f"arrays in a river must all have one shape (n,), got {sorted(shapes)}")
    return shapes.pop()[0] if shapes else None


def divide(river):
    """Return the Starts of a river, upstream first; one without length at its end where something joins there."""
    features = [*river.inflows, *river.weirs]
    places = sorted({reach.from_km for reach in river.reaches} | {feature.distance_km for feature in features})
    ends = [*places[1:], river.to_km]
    heads = {reach.from_km for reach in river.reaches}
    reaches, starts = iter(river.reaches), []
    for from_km, to_km in zip(places, ends, strict=True):
        if from_km in heads:
            reach = next(reaches)
        inflows = tuple(inflow for inflow in river.inflows if inflow.distance_km == from_km)
        weirs = tuple(weir for weir in river.weirs if weir.distance_km == from_km)
        starts.extend(
            _split_at(river.settling_ends_km, Start(reach, from_km, to_km, to_km, from_km in heads, inflows, weirs))
        )
    return tuple(starts)


def _split_at(settling_ends_km, start):
    """Return the start, or two where settling ends within it, for some of the rivers at least."""
    low, high = start.from_km, start.to_km
    if not in_any((settling_ends_km > low) & (settling_ends_km < high)):
        return [start]
    middle = np.minimum(np.maximum(settling_ends_km, low), high)
    return [start._replace(to_km=middle), Start(start.reach, middle, high, high, settled=True)]


def cut(river):
    """Return the Stretches of a river.

    Raises
    ------
    OutOfRangeError
        If more water is withdrawn than the river carries, a temperature leaves 0 to 40 °C, or arrays differ in length.
    """
    stack = _stacker(members_of(river))
    starts = divide(river)
    flow, joining = _flows(river, starts, stack)
    water_temp_c, conductance = (stack(values) for values in _carried(river, starts, joining))
    salinity = salinity_psu(np.where(np.isnan(conductance), 0.0, conductance))
    saturation = saturation_mg_l(water_temp_c, river.pressure_mmhg, salinity)
    from_km, to_km, km_per_day = (
        stack(values)
        for values in zip(*((at.from_km, at.to_km, KM_PER_DAY * at.reach.velocity_m_s) for at in starts), strict=True)
    )
    rates = _rates(river, starts, water_temp_c, from_km, stack)
    heads, cautions = descend(river, starts, joining, water_temp_c, saturation, rates, (to_km - from_km) / km_per_day)
    kept, phase = (np.array([getattr(head, name) for head in heads]) for name in ("start", "phase"))
    state = (stack([getattr(head, name) for head in heads]) for name in ("deficit_mg_l", "cbod_mg_l", "nbod_mg_l"))
    from_km = stack([head.from_km for head in heads])
    return Stretches(
        starts=starts,
        start=kept,
        phase=phase,
        from_km=from_km,
        to_km=np.concatenate([from_km[1:], to_km[-1:]]),
        head_time_d=stack([head.time_d for head in heads]),
        km_per_day=km_per_day[kept],
        water_temp_c=water_temp_c[kept],
        saturation_mg_l=saturation[kept],
        flow_m3_s=flow[kept],
        conductance_us_cm=conductance[kept],
        balance=Balance(*state, *(rate[kept] for rate in rates)),
        cautions=cautions,
    )


def _stacker(members):
    """Return a function that makes one array of a list with one value a stretch: (s,), or (s, n) for n members."""
    if members is None:
        return lambda values: np.array(values, dtype=float)

    def stack(values):
        stacked = np.empty((len(values), members))
        for place, value in enumerate(values):
            stacked[place] = value
        return stacked

    return stack


def _flows(river, starts, stack):
    """Return the flow in each stretch, and for each the waters that join at its head, each with its share after it."""
    flow, flows, joining = river.head.flow_m3_s, [], []
    above, incoming = [], []
    for start in starts:
        waters = []
        for inflow in start.inflows:
            if inflow.kind == "withdrawal":
                _require_enough(flow, inflow)
                flow = flow - inflow.water.flow_m3_s
            else:
                waters.append((len(above), inflow.water))
                above.append(flow)
                incoming.append(inflow.water.flow_m3_s)
                flow = flow + inflow.water.flow_m3_s
        flows.append(flow)
        joining.append(waters)
    if not above:
        return stack(flows), joining
    # The share of a water is what a mark in it alone comes to when it has mixed.
    shares = mixed(np.stack([stack(above), stack(incoming)]), [0.0, 1.0])
    shares = shares.tolist() if shares.ndim == 1 else list(shares)
    return stack(flows), [[(shares[place], water) for place, water in waters] for waters in joining]


def _require_enough(flow_m3_s, withdrawal):
    taken = withdrawal.water.flow_m3_s
    if np.any(taken > flow_m3_s):
        low, most = np.min(flow_m3_s), np.max(taken)
        raise OutOfRangeError(f"flow_m3_s of a withdrawal must be between 0 and {low:g} m³/s, got {most:g} m³/s")


def _carried(river, starts, joining):
    """Return temperature and conductance in each stretch, which nothing changes but mixing and a reach's own value."""
    water_temp_c, conductance = river.head.water_temp_c, river.head.conductance_us_cm
    temperatures, conductances = [], []
    for start, waters in zip(starts, joining, strict=True):
        for share, water in waters:
            water_temp_c = blend(water_temp_c, water.water_temp_c, share)
            conductance = _blend_conductance(conductance, water.conductance_us_cm, share)
        if start.reach.water_temp_c is not None:
            water_temp_c = start.reach.water_temp_c
        temperatures.append(water_temp_c)
        conductances.append(conductance)
    return temperatures, conductances


def _blend_conductance(above, joining, share):
    """Return the mixed conductance: a water whose own is not known counts as fresh, and NaN stays if neither is."""
    if isinstance(share, float):
        if isnan(above) and isnan(joining):
            return nan
        return blend(0.0 if isnan(above) else above, 0.0 if isnan(joining) else joining, share)
    mixture = blend(np.nan_to_num(above), np.nan_to_num(joining), share)
    return np.where(np.isnan(above) & np.isnan(joining), np.nan, mixture)


def _rates(river, starts, water_temp_c, from_km, stack):
    """Return the Rates at the water's temperature in each stretch; nothing settles from where settling ends."""
    thetas = river.thetas

    def warm(name, theta):
        return at_temperature(stack([getattr(start.reach, name) for start in starts]), water_temp_c, theta)

    depth_m, respiration, photosynthesis = (
        stack([getattr(start.reach, name) for start in starts])
        for name in ("depth_m", "respiration_mg_l_per_day", "photosynthesis_mg_l_per_day")
    )
    settled = from_km >= river.settling_ends_km
    return Rates(
        kd_per_day=warm("kd20_per_day", thetas.kd),
        ks_per_day=np.where(settled, 0.0, warm("ks20_per_day", thetas.ks)),
        kn_per_day=warm("kn20_per_day", thetas.kn),
        ka_per_day=warm("ka20_per_day", thetas.ka),
        net_mg_l_per_day=warm("sod20_g_m2_per_day", thetas.sod) / depth_m + respiration - photosynthesis,
    )
