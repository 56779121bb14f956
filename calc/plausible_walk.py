"""Oxygen and demand carried from stretch to stretch down n plausible rivers at once, also where oxygen runs out.

Arrays have the stretches first and the plausible rivers last. The work of calc.descent, for calc.plausible.
"""

from dataclasses import dataclass

import numpy as np

from calc.balance import Anoxic, Balance, exhausted_time_d, through_anoxia, transfer_time_d

_SMALLEST = 1e-12


@dataclass(frozen=True)
class Events:
    """What happens at the head of each stretch, (p, n): keeps * state + brings, then a shift, then weirs."""

    keeps: np.ndarray
    brings: np.ndarray
    shift: np.ndarray | None
    ratio: np.ndarray | None


@dataclass(frozen=True)
class Dry:
    """Where oxygen runs out in a stretch, for some of the rivers: the parts calc.balance finds there."""

    stretch: int
    rivers: np.ndarray
    balance: Balance
    saturation_mg_l: np.ndarray
    parts: list

    def apply(self, place, time_d, deficit, cbod):
        """Write the deficit, and the demand where asked for, into the places that lie in this stretch."""
        points, columns = np.nonzero(place[:, self.rivers] == self.stretch)
        if not len(points):
            return
        at = (points, self.rivers[columns])
        time = time_d[at]
        rates = [rate[columns] for rate in self.balance_rates()]
        kd, ks, kn, ka, net = rates
        saturation = self.saturation_mg_l[columns]
        (_, onset, _, first_c, first_n), (_, second_at, _, second_c, second_n), (_, returns, dry, left_c, left_n) = [
            [value[columns] if np.ndim(value) else value for value in part] for part in self.parts
        ]
        after = Balance(dry, left_c, left_n, kd, ks, kn, ka, net)
        back = np.maximum(time - returns, 0.0)
        supply = ka * saturation - net
        lasts, returned = time < onset, time >= returns
        deficit[at] = np.where(lasts, deficit[at], np.where(returned, after.deficit_at(back), saturation))
        if cbod is None:
            return
        first = Anoxic(first_c, first_n, kd, ks, kn, supply).after_carbon_first(np.maximum(time - onset, 0.0))[0]
        second = Anoxic(second_c, second_n, kd, ks, kn, supply)
        second = second.after_nitrogen_shares(np.maximum(time - second_at, 0.0))[0]
        waiting = np.where(time < second_at, first, second)
        cbod[at] = np.where(lasts, cbod[at], np.where(returned, after.cbod_at(back), waiting))

    def balance_rates(self):
        balance = self.balance
        return balance.kd_per_day, balance.ks_per_day, balance.kn_per_day, balance.ka_per_day, balance.net_mg_l_per_day


def descend(frame, members, rates, saturation, duration, events):
    """Return the Balance at the head of every stretch, and where oxygen runs out."""
    kd, ks, kn, ka, net = rates
    head = frame.plan.head
    keeps, from_cbod = np.exp(-ka * duration), kd * transfer_time_d(kd + ks, ka, duration)
    from_nbod, from_net = kn * transfer_time_d(kn, ka, duration), net * exhausted_time_d(ka, duration)
    cbod_left, nbod_left = np.exp(-(kd + ks) * duration), np.exp(-kn * duration)
    do = np.maximum(head.do_mg_l + members.head_do_mg_l, 0.0) + np.zeros(members.count)
    cbod, nbod = head.cbod_mg_l * members.cbod, head.nbod_mg_l * members.nbod
    deficits, cbods, nbods, dry = [], [], [], []
    doubtful = _doubtful(rates, saturation, duration)
    for at in range(len(duration)):
        do = events.keeps[at] * do + events.brings[0, at]
        cbod = events.keeps[at] * cbod + events.brings[1, at]
        nbod = events.keeps[at] * nbod + events.brings[2, at]
        if events.shift is not None:
            do = np.maximum(do - events.shift[at], 0.0)
        deficit = saturation[at] - do
        if events.ratio is not None:
            deficit = np.where(deficit > 0, deficit / events.ratio[at], deficit)
        deficits.append(deficit), cbods.append(cbod), nbods.append(nbod)
        end = (
            deficit * keeps[at] + cbod * from_cbod[at] + nbod * from_nbod[at] + from_net[at],
            cbod * cbod_left[at],
            nbod * nbod_left[at],
        )
        rivers = np.flatnonzero(doubtful(at, deficit, cbod, nbod))
        if len(rivers):
            state = Balance(*(value[rivers] for value in (deficit, cbod, nbod)), *(rate[at][rivers] for rate in rates))
            parts, ends = through_anoxia(state, saturation[at][rivers], duration[at][rivers])
            for value, changed in zip(end, ends, strict=True):
                value[rivers] = changed
            if parts:
                dry.append(Dry(at, rivers, state, saturation[at][rivers], parts))
        do, cbod, nbod = np.maximum(saturation[at] - end[0], 0.0), end[1], end[2]
    state = (np.stack(np.broadcast_arrays(*values, deficits[0])[:-1]) for values in (deficits, cbods, nbods))
    return Balance(*state, *rates), dry


def _doubtful(rates, saturation, duration):
    """Return a function that tells in which rivers oxygen may run out in a stretch: bounds as in calc.descent."""
    kd, ks, kn, ka, net = rates
    peaks = []
    for use, removal in ((kd, kd + ks), (kn, kn)):
        apart = np.maximum(np.abs(ka - removal), _SMALLEST)
        slower = np.maximum(np.minimum(ka, removal), _SMALLEST)
        peaks.append(use * transfer_time_d(removal, ka, np.minimum(np.log1p(apart / slower) / apart, duration)))
    background = np.maximum(net, 0.0) * exhausted_time_d(ka, duration)
    supply = ka * saturation

    def doubtful(at, deficit, cbod, nbod):
        highest = np.abs(deficit) + cbod * peaks[0][at] + nbod * peaks[1][at] + background[at]
        demand = kd[at] * cbod + kn[at] * nbod + net[at]
        return (highest >= saturation[at]) & (demand > supply[at]) & (duration[at] > 0)

    return doubtful
