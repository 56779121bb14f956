"""Oxygen and demand carried down a river from stretch to stretch, split where oxygen runs out and returns.

Works on floats for one river and on arrays of shape (n,) for n plausible ones: a walk over some twenty stretches costs
numpy more in calls than in arithmetic, so one river is walked in plain floats.
"""

from dataclasses import dataclass
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from calc.balance import ORDINARY, Balance, exhausted_time_d, through_anoxia, transfer_time_d
from calc.reaeration import weir_deficit_ratio
from calc.travel import KM_PER_DAY, hours_from_head, zero_km


@dataclass(frozen=True)
class Caution:
    """Something the reader of a prediction must know: a name in plain words, and a sentence."""

    name: str
    message: str


class Head(NamedTuple):
    """The state at the head of a stretch: start is the place of its Start, phase one of calc.balance's."""

    start: int
    phase: int
    from_km: float
    time_d: float
    deficit_mg_l: float
    cbod_mg_l: float
    nbod_mg_l: float


@dataclass(frozen=True)
class Rates:
    """Rates at the water's temperature, one a stretch: shape (s,) or (s, n). [1/day], net background [mg/L/day]"""

    kd_per_day: np.ndarray
    ks_per_day: np.ndarray
    kn_per_day: np.ndarray
    ka_per_day: np.ndarray
    net_mg_l_per_day: np.ndarray

    def __iter__(self):
        return iter((self.kd_per_day, self.ks_per_day, self.kn_per_day, self.ka_per_day, self.net_mg_l_per_day))


def descend(river, starts, joining, water_temp_c, saturation_mg_l, rates, duration_d):
    """Return the Heads of all stretches, upstream first, and the Cautions.

    joining[i] are pairs of the share a water has once it has joined at start i, and the water. Temperature, saturation,
    Rates and duration have one value a start.
    """
    single = saturation_mg_l.ndim == 1
    unpack = np.ndarray.tolist if single else list
    saturation, duration, warmth = unpack(saturation_mg_l), unpack(duration_d), unpack(water_temp_c)
    ends = list(zip(*(unpack(part) for part in _ends(rates, duration_d)), strict=True))
    uses = (rates.kd_per_day, rates.kn_per_day, rates.net_mg_l_per_day, rates.ka_per_day * saturation_mg_l)
    uses = list(zip(*(unpack(part) for part in uses), strict=True))
    state = (river.head.do_mg_l, river.head.cbod_mg_l, river.head.nbod_mg_l)
    shift_at = outfall_place(river, starts)
    time_d = -hours_from_head(river, zero_km(river)) / 24
    heads, cautions = [], []
    for place, start in enumerate(starts):
        for share, water in joining[place]:
            incoming = (water.do_mg_l, water.cbod_mg_l, water.nbod_mg_l)
            state = tuple(blend(above, joins, share) for above, joins in zip(state, incoming, strict=True))
        do, cbod, nbod = state
        if place == shift_at:
            do = _not_below_zero(do - river.initial_deficit_shift_mg_l)
        deficit = saturation[place] - do
        for weir in start.weirs:
            deficit = _below_weir(deficit, weir, warmth[place], cautions)
        head = Head(place, ORDINARY, start.from_km, time_d, deficit, cbod, nbod)
        heads.append(head)
        kd, kn, net, supply = uses[place]
        # Since demand falls, D cannot rise above the demand at the head over ka: most stretches are surely oxic.
        if in_any(kd * cbod + kn * nbod + net > supply):
            further, state = _through_anoxia(head, rates, start, saturation[place], duration[place])
            heads.extend(further)
        else:
            keeps, from_cbod, from_nbod, from_net, cbod_left, nbod_left = ends[place]
            end = deficit * keeps + cbod * from_cbod + nbod * from_nbod + from_net
            state = (end, cbod * cbod_left, nbod * nbod_left)
        # Rounding alone can bring oxygen below zero: where it runs out the deficit is the saturation.
        state = (_not_below_zero(saturation[place] - state[0]), *state[1:])
        time_d = time_d + duration[place]
    cautions.extend(_runs_out(heads))
    return heads, tuple(cautions)


def _runs_out(heads):
    """Return a Caution where oxygen runs out, in the first place that it does or in some of the plausible rivers."""
    lengths = [
        (head, np.less(head.from_km, below.from_km)) for head, below in pairwise(heads) if head.phase != ORDINARY
    ]
    if not any(np.any(dry) for _, dry in lengths):
        return []
    dry = np.any([dry for _, dry in lengths], axis=0)
    if dry.ndim:
        where = f"in {np.count_nonzero(dry)} of {dry.size} plausible rivers"
    else:
        where = f"at {next(head.from_km for head, dry in lengths if dry):.2f} km"
    return [
        Caution("oxygen runs out", f"Oxygen runs out {where}. From there decay is limited by what reaeration brings.")
    ]


def outfall_place(river, starts):
    """Return the place of the Start at which the outfall joins, 0 where there is none."""
    outfall_km = river.outfall_km
    if outfall_km is None:
        return 0
    return next(place for place, start in enumerate(starts) if start.mixes and start.from_km == outfall_km)


def in_any(condition):
    """Return whether a condition holds in any of the plausible rivers; numpy's own any is slow on a plain bool."""
    return condition if isinstance(condition, bool) else bool(condition.any())


def blend(above, joining, share):
    """Return what two waters become, where share is that of the joining one; without flow it adds nothing."""
    mixture = above + share * (joining - above)
    if isinstance(share, float):
        return above if share == 0 else mixture
    return np.where(share == 0, above, mixture)


def _not_below_zero(value):
    if isinstance(value, float):
        return 0.0 if value < 0 else value
    return np.maximum(value, 0.0)


def _ends(rates, duration_d):
    """Return what the end of each stretch keeps of its head: the balance is linear in the state while oxygen lasts."""
    kd, ks, kn, ka, net = rates
    return (
        np.exp(-ka * duration_d),
        kd * transfer_time_d(kd + ks, ka, duration_d),
        kn * transfer_time_d(kn, ka, duration_d),
        net * exhausted_time_d(ka, duration_d),
        np.exp(-(kd + ks) * duration_d),
        np.exp(-kn * duration_d),
    )


def _below_weir(deficit, weir, water_temp_c, cautions):
    """Return the deficit below a weir; supersaturated water passes it unchanged, and a caution says so."""
    ratio = weir_deficit_ratio(weir.drop_m, water_temp_c, weir.quality, weir.shape)
    if np.any(deficit < 0):
        name = f"weir {weir.name}".rstrip()
        message = (
            f"Above the {name} at {weir.distance_km:g} km the water is supersaturated. The weir's deficit ratio was "
            "found in water short of oxygen and does not apply: oxygen is carried over the weir as it is."
        )
        cautions.append(Caution("supersaturated above a weir", message))
    below = np.where(deficit > 0, deficit / ratio, deficit)
    return below if below.ndim else float(below)


def _through_anoxia(head, rates, start, saturation, duration):
    """Return the further Heads within a stretch where oxygen runs out, if it does, and deficit, cbod, nbod at its end.

    A plausible river whose oxygen lasts gets the further heads at the end of the stretch, without length.
    """
    balance = Balance(head.deficit_mg_l, head.cbod_mg_l, head.nbod_mg_l, *(rate[head.start] for rate in rates))
    events, end = through_anoxia(balance, saturation, duration)
    heads = []
    for phase, offset_d, *state in events:
        along = offset_d * KM_PER_DAY * start.reach.velocity_m_s
        from_km = np.minimum(np.where(offset_d >= duration, start.to_km, start.from_km + along), start.to_km)
        values = (from_km, head.time_d + offset_d, *state)
        heads.append(Head(head.start, phase, *(_plain(value) for value in values)))
    return heads, tuple(_plain(value) for value in end)


def _plain(value):
    return value if np.ndim(value) else float(value)
