"""The predicted sag of oxygen: the closed form of one stretch, and the profile and critical point of a river.

References
----------
.. [1] H. W. Streeter and E. B. Phelps, "A study of the pollution and natural purification of the Ohio River",
   Public Health Bulletin 146, U.S. Public Health Service, 1925.
.. [2] R. P. Gundelach and J. E. Castillo, "Natural stream purification under anaerobic conditions", J. Water
   Pollut. Control Fed., vol. 48, no. 7, pp. 1753-1758, 1976.
"""

from dataclasses import dataclass

import numpy as np

from calc.balance import CARBON_FIRST, NITROGEN_SHARES, ORDINARY, Anoxic, Balance
from calc.checks import require_range
from calc.critical import CriticalPoint, critical_point
from calc.descent import Caution
from calc.stretches import cut

__all__ = ["CriticalPoint", "Profile", "critical_point", "critical_time_d", "deficit_mg_l", "predict"]


@dataclass(frozen=True)
class Profile:
    """The predicted state along a river: shape (...) of the distances, or (n, ...) for n plausible rivers.

    Exactly at an outfall, inflow, weir or change of reach it is the water just below. anoxic is True where oxygen is at
    zero. warnings are Cautions, each with a name and a message.
    """

    distance_km: np.ndarray
    travel_time_h: np.ndarray
    water_temp_c: np.ndarray
    saturation_mg_l: np.ndarray
    deficit_mg_l: np.ndarray
    do_mg_l: np.ndarray
    cbod_mg_l: np.ndarray
    nbod_mg_l: np.ndarray
    anoxic: np.ndarray
    flow_m3_s: np.ndarray
    conductance_us_cm: np.ndarray
    warnings: tuple[Caution, ...] = ()


def predict(river, distance_km):
    """Return the predicted state of the water at distances along a river, as a Profile.

    Parameters
    ----------
    river : River
        One river, or n plausible ones where its fields hold arrays of shape (n,).
    distance_km : float or array_like, shape (...)
        Within the river. [km]

    Returns
    -------
    Profile
        Values of shape (...), or (n, ...) where the river holds arrays. NaN where a distance or a needed field is NaN.

    Raises
    ------
    OutOfRangeError
        If a distance lies outside the river, more water is withdrawn than it carries, or arrays differ in length.

    Notes
    -----
    Stretches chain in closed form [1]_; oxygen is continuous from reach to reach, saturation is not. Where demand would
    take oxygen below zero, it stays at zero and reaeration limits decay [2]_: see calc.balance.Anoxic.
    """
    distance = require_range("distance_km", distance_km, river.from_km, river.to_km, "km")
    stretches = cut(river)
    take, place_km = _along(stretches, distance.ravel())
    time_d = (place_km - take(stretches.from_km)) / take(stretches.km_per_day)
    saturation = take(stretches.saturation_mg_l)
    deficit, cbod, nbod, anoxic = _state(stretches, take, time_d, saturation)
    values = {
        "travel_time_h": 24 * (take(stretches.head_time_d) + time_d),
        "water_temp_c": take(stretches.water_temp_c),
        "saturation_mg_l": saturation,
        "deficit_mg_l": deficit,
        # The maximum removes rounding only: where oxygen runs out the deficit is the saturation.
        "do_mg_l": np.maximum(saturation - deficit, 0.0),
        "cbod_mg_l": cbod,
        "nbod_mg_l": nbod,
        "anoxic": anoxic | (deficit >= saturation),
        "flow_m3_s": take(stretches.flow_m3_s),
        "conductance_us_cm": take(stretches.conductance_us_cm),
    }
    shape = values["do_mg_l"].shape[1:] + distance.shape
    return Profile(
        distance_km=distance[()],
        **{name: value.T.reshape(shape)[()] for name, value in values.items()},
        warnings=stretches.cautions,
    )


def _along(stretches, distance_km):
    """Return a function that takes a value of each place's stretch from an array of them, and the places shaped alike.

    With n plausible rivers these have shape (places, n): so a stretch's values are taken a row at a time.
    """
    heads = stretches.from_km
    if heads.ndim == 1 or (heads == heads[:, :1]).all():
        first = heads if heads.ndim == 1 else heads[:, 0]
        stretch = np.maximum(np.searchsorted(first, distance_km, side="right") - 1, 0)
        return (lambda values: values.take(stretch, axis=0)), distance_km if heads.ndim == 1 else distance_km[:, None]
    members = heads.shape[1]
    place_km = distance_km[:, None]
    stretch = np.maximum((heads[:, None] <= place_km).sum(axis=0) - 1, 0)
    flat = stretch * members + np.arange(members)
    return (lambda values: values.ravel().take(flat)), place_km


def _state(stretches, take, time_d, saturation):
    """Return deficit, cbod, nbod, and where oxygen is at zero, at each place."""
    balance = Balance(*(take(values) for values in vars(stretches.balance).values()))
    deficit, cbod, nbod = balance.deficit_at(time_d), balance.cbod_at(time_d), balance.nbod_at(time_d)
    if not stretches.phase.any():
        return deficit, cbod, nbod, np.zeros(deficit.shape, dtype=bool)
    phase = take(
        stretches.phase
        if stretches.from_km.ndim == 1
        else np.broadcast_to(stretches.phase[:, None], stretches.from_km.shape)
    )
    supply = balance.ka_per_day * saturation - balance.net_mg_l_per_day
    rates = (balance.kd_per_day, balance.ks_per_day, balance.kn_per_day)
    waiting = Anoxic(balance.cbod_mg_l, balance.nbod_mg_l, *rates, supply)
    anoxic = phase != ORDINARY
    deficit = np.where(anoxic, saturation, deficit)
    first, second = waiting.after_carbon_first(time_d), waiting.after_nitrogen_shares(time_d)
    cbod, nbod = (
        np.select([phase == CARBON_FIRST, phase == NITROGEN_SHARES], [carbon_first, shares], ordinary)
        for carbon_first, shares, ordinary in zip(first, second, (cbod, nbod), strict=True)
    )
    return deficit, cbod, nbod, anoxic


def deficit_mg_l(
    time_d,
    *,
    initial_deficit_mg_l,
    cbod_mg_l,
    kd_per_day,
    ka_per_day,
    ks_per_day=0.0,
    nbod_mg_l=0.0,
    kn_per_day=0.0,
    net_demand_mg_l_per_day=0.0,
):
    """Return the deficit after a travel time in one uniform stretch, however far demand drives it.

    Parameters
    ----------
    time_d : float or array_like, shape (...)
        Travel time from the head of the stretch. [days] At least 0.
    initial_deficit_mg_l : float or array_like, broadcastable
        Deficit at the head; negative when supersaturated. [mg/L]
    cbod_mg_l, nbod_mg_l : float or array_like, broadcastable
        Ultimate carbonaceous and nitrogenous demand at the head. [mg/L] At least 0.
    kd_per_day, ka_per_day, ks_per_day, kn_per_day : float or array_like, broadcastable
        Decay, reaeration, settling and nitrification at the water's temperature. [1/day] At least 0, base e.
    net_demand_mg_l_per_day : float or array_like, broadcastable
        Background demand SOD/H + R - P. [mg/L/day]

    Returns
    -------
    float or ndarray, shape (...)
        Deficit. [mg/L] It may exceed saturation: only predict knows where oxygen runs out. NaN where anything is NaN.

    Raises
    ------
    OutOfRangeError
        If a time, demand or rate is negative.

    Notes
    -----
    D0 e^(-ka t) + kd L0 φ(kd + ks) + kn N0 φ(kn) + net/ka (1 - e^(-ka t)), φ(k) = (e^(-k t) - e^(-ka t))/(ka - k) [1]_,
    evaluated so that it holds through ka = k.
    """
    balance = _checked(
        initial_deficit_mg_l,
        cbod_mg_l,
        nbod_mg_l,
        kd_per_day,
        ks_per_day,
        kn_per_day,
        ka_per_day,
        net_demand_mg_l_per_day,
    )
    return balance.deficit_at(require_range("time_d", time_d, 0, np.inf, "days"))[()]


def critical_time_d(
    *,
    initial_deficit_mg_l,
    cbod_mg_l,
    kd_per_day,
    ka_per_day,
    ks_per_day=0.0,
    nbod_mg_l=0.0,
    kn_per_day=0.0,
    net_demand_mg_l_per_day=0.0,
):
    """Return when the deficit of one uniform stretch is highest. [days]

    0 where it only falls, for then there is no sag and the mixing point is the worst; infinite where it only rises
    towards its steady value. Arguments and what they raise are those of deficit_mg_l. With kd and net alone it is
    ln{(ka/kd) [1 - D0 (ka - kd)/(kd L0)]}/(ka - kd).
    """
    balance = _checked(
        initial_deficit_mg_l,
        cbod_mg_l,
        nbod_mg_l,
        kd_per_day,
        ks_per_day,
        kn_per_day,
        ka_per_day,
        net_demand_mg_l_per_day,
    )
    return balance.critical_time_d()[()]


def _checked(deficit, cbod, nbod, kd, ks, kn, ka, net):
    """Return the Balance of checked arguments."""
    return Balance(
        require_range("initial_deficit_mg_l", deficit, -np.inf, np.inf, "mg/L"),
        require_range("cbod_mg_l", cbod, 0, np.inf, "mg/L"),
        require_range("nbod_mg_l", nbod, 0, np.inf, "mg/L"),
        require_range("kd_per_day", kd, 0, np.inf, "per day"),
        require_range("ks_per_day", ks, 0, np.inf, "per day"),
        require_range("kn_per_day", kn, 0, np.inf, "per day"),
        require_range("ka_per_day", ka, 0, np.inf, "per day"),
        require_range("net_demand_mg_l_per_day", net, -np.inf, np.inf, "mg/L per day"),
    )
