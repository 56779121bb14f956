"""The oxygen balance of one uniform stretch in closed form: the ordinary sag, and what happens without oxygen.

With deficit D, carbonaceous demand L and nitrogenous demand N, at travel time t [days] from the head of the stretch:

    D' = kd L + kn N + net - ka D,   L' = -(kd + ks) L,   N' = -kn N

Since demand never rises within a stretch, D has at most one stationary point there, and it is a maximum. Arguments
are not checked here; calc.sag and calc.river do that. Everything broadcasts.

References
----------
.. [1] H. W. Streeter and E. B. Phelps, "A study of the pollution and natural purification of the Ohio River",
   Public Health Bulletin 146, U.S. Public Health Service, 1925.
.. [2] R. P. Gundelach and J. E. Castillo, "Natural stream purification under anaerobic conditions", J. Water
   Pollut. Control Fed., vol. 48, no. 7, pp. 1753-1758, 1976.
"""

from dataclasses import dataclass

import numpy as np

# Stands for zero in a denominator: far below any rate, and expm1(-x)/x is exact all the way down to it.
SMALLEST_RATE = 1e-30

# What goes on in a stretch, or a part of it.
ORDINARY, CARBON_FIRST, NITROGEN_SHARES = 0, 1, 2


def exhausted_time_d(rate_per_day, time_d):
    """Return (1 - e^(-k t)) / k, which is t where k is zero. [days]"""
    rate = np.maximum(rate_per_day, SMALLEST_RATE)
    return -np.expm1(-rate * time_d) / rate


def transfer_time_d(first_per_day, second_per_day, time_d):
    """Return (e^(-k1 t) - e^(-k2 t)) / (k2 - k1), smooth through k1 = k2 where it is t e^(-k t). [days]

    The smaller rate is taken out of both exponentials, so nothing overflows whichever rate is the larger.
    """
    slower = np.minimum(first_per_day, second_per_day)
    return np.exp(-slower * time_d) * exhausted_time_d(np.abs(second_per_day - first_per_day), time_d)


# Where a function is flatter than this, Newton's step overflows: bisection takes over.
_FLAT = 1e-200


def falling_root(function, low, high):
    """Return where a falling function crosses zero, elementwise, to 1e-14 of the bracket's upper end.

    function maps x to (value, derivative); it is positive at low and not positive at high. Newton's method, with
    bisection wherever a step would leave the bracket.
    """
    root, enough = (low + high) / 2, 1e-14 * high
    for _ in range(200):
        value, derivative = function(root)
        low, high = np.where(value > 0, root, low), np.where(value > 0, high, root)
        flat = np.abs(derivative) < _FLAT
        step = root - value / np.where(flat, -SMALLEST_RATE, derivative)
        closer = np.where((step >= low) & (step <= high), step, (low + high) / 2)
        moved, root = np.abs(closer - root), closer
        if not (moved > enough).any():
            break
    return root


@dataclass(frozen=True)
class Balance:
    """The state at the head of a stretch and the rates in it: floats or arrays that broadcast."""

    deficit_mg_l: float
    cbod_mg_l: float
    nbod_mg_l: float
    kd_per_day: float
    ks_per_day: float
    kn_per_day: float
    ka_per_day: float
    net_mg_l_per_day: float

    @property
    def kr_per_day(self):
        """Removal of carbonaceous demand, by decay and settling. [1/day]"""
        return self.kd_per_day + self.ks_per_day

    def cbod_at(self, time_d):
        """Return the carbonaceous demand left. [mg/L]"""
        return self.cbod_mg_l * np.exp(-self.kr_per_day * time_d)

    def nbod_at(self, time_d):
        """Return the nitrogenous demand left. [mg/L]"""
        return self.nbod_mg_l * np.exp(-self.kn_per_day * time_d)

    def deficit_at(self, time_d):
        """Return the deficit while oxygen lasts. [mg/L]"""
        ka = self.ka_per_day
        return (
            self.deficit_mg_l * np.exp(-ka * time_d)
            + self.kd_per_day * self.cbod_mg_l * transfer_time_d(self.kr_per_day, ka, time_d)
            + self.kn_per_day * self.nbod_mg_l * transfer_time_d(self.kn_per_day, ka, time_d)
            + self.net_mg_l_per_day * exhausted_time_d(ka, time_d)
        )

    def rise_at_head(self):
        """Return D' at the head: demand less reaeration. [mg/L/day]"""
        demand = self.kd_per_day * self.cbod_mg_l + self.kn_per_day * self.nbod_mg_l + self.net_mg_l_per_day
        return demand - self.ka_per_day * self.deficit_mg_l

    def _rise(self):
        """Return a function of time with the sign of D', and its derivative; it neither overflows nor fades to zero.

        e^(ka t) D' = D'(0) - sum over both demands of k_use k_removal M (e^((ka - k) t) - 1)/(ka - k) only falls. It
        is taken times e^((m - ka) t), m being the slowest rate that matters.
        """
        ka = self.ka_per_day
        curbs = []
        for use, removal, demand in (
            (self.kd_per_day, self.kr_per_day, self.cbod_mg_l),
            (self.kn_per_day, self.kn_per_day, self.nbod_mg_l),
        ):
            curb = use * removal * demand
            curbs.append((curb, np.where(curb > 0, removal, ka)))
        slowest = np.minimum(ka, np.minimum(curbs[0][1], curbs[1][1]))
        head = self.rise_at_head()

        def rise(time_d):
            value = head * np.exp((slowest - ka) * time_d)
            derivative = 0.0
            for curb, removal in curbs:
                value = value - curb * transfer_time_d(removal - slowest, ka - slowest, time_d)
                derivative = derivative - curb * np.exp((slowest - removal) * time_d)
            return value, derivative + (slowest - ka) * value

        return rise

    def peak_time_d(self, duration_d):
        """Return when the deficit is highest between 0 and duration_d (finite). [days]"""
        rise, head = self._rise()(duration_d)[0], self.rise_at_head()
        turns = np.asarray((head > 0) & (rise < 0))
        peak = np.array(np.broadcast_to(np.where(head <= 0, 0.0, duration_d), turns.shape))
        if turns.any():
            end = np.broadcast_to(duration_d, turns.shape)[turns]
            peak[turns] = falling_root(self._where(turns)._rise(), np.zeros_like(end), end)
        return peak

    def _where(self, chosen):
        """Return the balances chosen by a mask of this one's shape."""
        return Balance(*(np.broadcast_to(value, chosen.shape)[chosen] for value in vars(self).values()))

    def critical_time_d(self):
        """Return when the deficit is highest at all: 0 where it only falls, infinite where it only rises. [days]"""
        rise = self._rise()
        head = self.rise_at_head()
        ka = np.maximum(self.ka_per_day, SMALLEST_RATE)
        # How far e^(ka t) D' can fall: without bound where a demand fades more slowly than ka.
        fall, unbounded = 0.0, False
        for use, removal, demand in (
            (self.kd_per_day, self.kr_per_day, self.cbod_mg_l),
            (self.kn_per_day, self.kn_per_day, self.nbod_mg_l),
        ):
            curb = use * removal * demand
            unbounded = unbounded | ((curb > 0) & (removal <= ka))
            fall = fall + curb / np.where(removal > ka, removal - ka, np.inf)
        turns = (head > 0) & (unbounded | (fall > head))
        high = np.where(turns, 1 / ka, 0.0)
        while (still := turns & (rise(high)[0] > 0)).any():
            high = np.where(still, 2 * high, high)
        inside = falling_root(rise, np.zeros_like(high), high)
        return np.where(head <= 0, 0.0, np.where(turns, inside, np.where(np.isnan(head), np.nan, np.inf)))

    def onset_d(self, saturation_mg_l, duration_d):
        """Return when oxygen reaches zero, infinite where it lasts to duration_d. [days]"""
        peak = self.peak_time_d(duration_d)
        runs_out = np.asarray((self.rise_at_head() > 0) & (self.deficit_at(peak) > saturation_mg_l))
        onset = np.full(runs_out.shape, np.inf)
        if runs_out.any():
            saturation = np.broadcast_to(saturation_mg_l, runs_out.shape)[runs_out]
            onset[runs_out] = self._where(runs_out)._time_to_zero(saturation, peak[runs_out])
        return onset

    def _time_to_zero(self, saturation_mg_l, peak_d):
        """Return when oxygen reaches zero on the way to a peak of the deficit above saturation. [days]"""

        def oxygen(time_d):
            deficit = self.deficit_at(time_d)
            demand = self.kd_per_day * self.cbod_at(time_d) + self.kn_per_day * self.nbod_at(time_d)
            return saturation_mg_l - deficit, self.ka_per_day * deficit - demand - self.net_mg_l_per_day

        onset = falling_root(oxygen, np.zeros_like(peak_d), peak_d)
        return np.where(self.deficit_mg_l >= saturation_mg_l, 0.0, onset)


@dataclass(frozen=True)
class Anoxic:
    """What is left to be oxidised where oxygen stays at zero.

    Oxygen is used as fast as reaeration brings it: supply = ka Cs - net, the background taking its part first. The
    bacteria that break down carbon take scarce oxygen before nitrifiers do (common practice), so at first
    L' = -supply - ks L while kd L > supply and N waits ("carbon first"); then L decays at its full rate and N takes
    what is left, N' = -(supply - kd L), until kn N is less than that and oxygen returns ("nitrogen waits" is over).
    Without supply nothing is oxidised; settling goes on.
    """

    cbod_mg_l: float
    nbod_mg_l: float
    kd_per_day: float
    ks_per_day: float
    kn_per_day: float
    supply_mg_l_per_day: float

    def carbon_first_d(self):
        """Return how long carbon takes all the supply. [days]"""
        supply = np.maximum(self.supply_mg_l_per_day, SMALLEST_RATE)
        excess = np.maximum(self.cbod_mg_l - supply / self.kd_per_day, 0.0)
        exposure = excess / (supply * (1 + self.ks_per_day / self.kd_per_day))
        ks = np.maximum(self.ks_per_day, SMALLEST_RATE)
        return np.where(self.supply_mg_l_per_day > 0, np.log1p(ks * exposure) / ks, np.inf)

    def after_carbon_first(self, time_d):
        """Return cbod and nbod while carbon takes all the supply. [mg/L]"""
        supply = np.maximum(self.supply_mg_l_per_day, 0.0)
        left = self.cbod_mg_l * np.exp(-self.ks_per_day * time_d) - supply * exhausted_time_d(self.ks_per_day, time_d)
        return np.maximum(left, 0.0), self.nbod_mg_l + 0.0 * time_d

    def after_nitrogen_shares(self, time_d):
        """Return cbod and nbod while nitrogen takes what carbon leaves. [mg/L]"""
        supply = np.maximum(self.supply_mg_l_per_day, 0.0)
        removal = self.kd_per_day + self.ks_per_day
        used = self.kd_per_day * self.cbod_mg_l * exhausted_time_d(removal, time_d)
        return self.cbod_mg_l * np.exp(-removal * time_d), self.nbod_mg_l - supply * time_d + used

    def nitrogen_shares_d(self, duration_d):
        """Return how long nitrogen takes less than it could, at most duration_d. [days]"""

        def lacking(time_d):
            cbod, nbod = self.after_nitrogen_shares(time_d)
            left = self.supply_mg_l_per_day - self.kd_per_day * cbod
            removal = self.kd_per_day + self.ks_per_day
            return self.kn_per_day * nbod - left, -self.kn_per_day * left - self.kd_per_day * removal * cbod

        zero = np.zeros_like(duration_d)
        lasts, ends = lacking(zero)[0] > 0, lacking(duration_d)[0] <= 0
        turns = lasts & ends
        low = np.where(turns, zero, duration_d)
        inside = falling_root(lacking, low, duration_d) if np.any(turns) else duration_d
        return np.where(lasts, np.where(turns, inside, duration_d), 0.0)


def through_anoxia(balance, saturation_mg_l, duration_d):
    """Return the parts of a stretch after its oxygen runs out, and the deficit, cbod and nbod at its end.

    Each part is (phase, days from the head of the stretch, deficit, cbod and nbod at its own head); there is none when
    oxygen lasts everywhere. Where it lasts in some rivers only, the parts of those begin at the stretch's end.
    """
    rates = (balance.kd_per_day, balance.ks_per_day, balance.kn_per_day)
    ka, net = balance.ka_per_day, balance.net_mg_l_per_day
    onset = balance.onset_d(saturation_mg_l, duration_d)
    dry = np.isfinite(onset)
    if not dry.any():
        return [], tuple(state(duration_d) for state in (balance.deficit_at, balance.cbod_at, balance.nbod_at))
    onset = np.where(dry, onset, duration_d)
    deficit = np.where(dry, saturation_mg_l, balance.deficit_at(onset))
    supply = ka * saturation_mg_l - net
    first = Anoxic(balance.cbod_at(onset), balance.nbod_at(onset), *rates, supply)
    first_d = np.minimum(first.carbon_first_d(), duration_d - onset)
    second = Anoxic(*first.after_carbon_first(first_d), *rates, supply)
    second_d = second.nitrogen_shares_d(duration_d - onset - first_d)
    returns = np.minimum(onset + first_d + second_d, duration_d)
    after = Balance(deficit, *second.after_nitrogen_shares(second_d), *rates, ka, net)
    parts = [
        (CARBON_FIRST, onset, deficit, first.cbod_mg_l, first.nbod_mg_l),
        (NITROGEN_SHARES, onset + first_d, deficit, second.cbod_mg_l, second.nbod_mg_l),
        (ORDINARY, returns, deficit, after.cbod_mg_l, after.nbod_mg_l),
    ]
    left = duration_d - returns
    end = (after.deficit_at(left), after.cbod_at(left), after.nbod_at(left))
    return parts, end
