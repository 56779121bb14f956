"""Where the next station pays most, and whether the critical point is held so that the crew may leave.

What a reading at an access point would settle is calc.outlook's; here the points to offer are chosen, and what each
would settle is said in a sentence.
"""

from dataclasses import dataclass

import numpy as np

from calc.fit import FitSettings, refine
from calc.leaving import Answer, verdict
from calc.outlook import is_new, open_end, outlook

__all__ = ["Answer", "Candidate", "next_station", "verdict"]

_APART = 0.1


@dataclass(frozen=True)
class Candidate:
    """A place for the next station and what a reading there would settle.

    access_index: its place in access_km, -1 where the river is reachable anywhere. gain: the share of the doubt that a
    reading there removes. settles: "recovery", "place", "value" or "little". narrows_place, narrows_do: by which share
    the interval would narrow. p_shows_recovery: the chance of a reading clearly above the lowest so far. cost_min: as
    given, or NaN; apart_km: the way along the river from the last reading. reason: a sentence.
    """

    access_index: int
    distance_km: float
    gain: float
    settles: str
    narrows_place: float
    narrows_do: float
    p_shows_recovery: float
    cost_min: float
    apart_km: float
    reason: str


def next_station(
    plan,
    stations_km,
    do_mg_l,
    access_km,
    *,
    estimate=None,
    costs_min=None,
    usable=None,
    spread=None,
    settings=None,
    anywhere=False,
    how_many=3,
):
    """Return up to how_many Candidates for the next station, the best to take first.

    Parameters
    ----------
    plan, stations_km, do_mg_l, spread, settings
        As for calc.fit.refine; readings in the order they were taken: the crew is at the last one.
    access_km : array_like, shape (a,)
        Where the water can be reached. [km]
    estimate : Estimate, optional
        That of the same readings, if already made.
    costs_min : array_like, shape (a,), optional
        Minutes to get to each access point. Without it the way along the river from the last reading counts.
    usable : array_like of bool, shape (a,), optional
        False rules a point out: daylight, crew hours, a bottle's deadline.
    anywhere : bool
        The river is reachable all along, as from a boat: access_km is not used.

    Notes
    -----
    While the lowest reading, within its error, is the last (first) station, only points beyond it count. Of the points
    with at least a share of the best gain the cheapest comes first.
    """
    settings = settings or (estimate.settings if estimate else FitSettings())
    estimate = estimate or refine(plan, stations_km, do_mg_l, spread=spread, settings=settings)
    places, index, costs, usable = _points(estimate, access_km, costs_min, usable, anywhere)
    allowed = usable & is_new(estimate, places)
    allowed = _beyond_open_end(estimate, places, allowed)
    if not allowed.any():
        return ()
    places, index, costs = places[allowed], index[allowed], costs[allowed]
    outlooks = outlook(estimate, places)
    apart = np.abs(places - _here_km(estimate, stations_km, do_mg_l))
    price = np.where(np.isnan(costs), apart, costs)
    chosen = _ranked(outlooks["gain"], price, places, _APART * estimate.scale_km, how_many, settings.enough_of_best)
    return tuple(
        Candidate(
            int(index[at]),
            float(places[at]),
            **{name: float(values[at]) for name, values in outlooks.items()},
            cost_min=float(costs[at]),
            apart_km=float(apart[at]),
            **_said(estimate, {name: float(values[at]) for name, values in outlooks.items()}),
        )
        for at in chosen
    )


def _points(estimate, access_km, costs_min, usable, anywhere):
    """Return distance, index, cost and usability of each point to consider."""
    if anywhere:
        grid = estimate.grid_km
        places = np.linspace(estimate.outfall_km, min(estimate.outfall_km + 3 * estimate.scale_km, grid[-1]), 61)[1:]
        return places, np.full(len(places), -1), np.full(len(places), np.nan), np.ones(len(places), dtype=bool)
    places = np.atleast_1d(np.asarray(access_km, dtype=float))
    count = len(places)
    costs = np.full(count, np.nan) if costs_min is None else np.asarray(costs_min, dtype=float)
    fit = np.ones(count, dtype=bool) if usable is None else np.asarray(usable, dtype=bool)
    return places, np.arange(count), costs, fit


def _beyond_open_end(estimate, places, allowed):
    """Return the points allowed while the lowest reading is an end station: those beyond it, if there are any."""
    side = open_end(estimate)
    if side is None:
        return allowed
    read = estimate.stations_km
    beyond = allowed & (places > read[-1] if side == "below" else places < read[0])
    return beyond if beyond.any() else allowed


def _here_km(estimate, stations_km, do_mg_l):
    """Return where the crew is: at the last reading that was given, else at the outfall."""
    distance = np.atleast_1d(np.asarray(stations_km, dtype=float))
    known = distance[np.isfinite(distance) & np.isfinite(np.atleast_1d(np.asarray(do_mg_l, dtype=float)))]
    return known[-1] if len(known) else estimate.outfall_km


def _ranked(gain, price, places, apart_km, how_many, enough):
    """Return places in the order to offer: of those with enough of the best gain the cheapest, then so on elsewhere."""
    left, chosen = np.ones(len(gain), dtype=bool), []
    while left.any() and len(chosen) < how_many:
        best = gain[left].max()
        worth = left & (gain >= enough * best if best > 0 else gain >= best)
        at = int(np.where(worth, price, np.inf).argmin())
        chosen.append(at)
        left &= np.abs(places - places[at]) > apart_km
    return chosen


def _said(estimate, sees):
    """Return what a reading would settle, and a sentence that says so."""
    side = open_end(estimate)
    if side is not None:
        chance = sees["p_shows_recovery"]
        if side == "below":
            return {
                "settles": "recovery",
                "reason": f"Shows whether oxygen recovers below your last station; here that is {_chance(chance)}.",
            }
        return {"settles": "recovery", "reason": "Shows whether oxygen is higher above your first station."}
    if max(sees["narrows_place"], sees["narrows_do"]) < 0.05:
        return {"settles": "little", "reason": "Would change little: what is known is about as good as it gets here."}
    if sees["narrows_place"] >= sees["narrows_do"]:
        return {
            "settles": "place",
            "reason": f"Narrows the place of the low point by {_share(sees['narrows_place'])}.",
        }
    return {"settles": "value", "reason": f"Narrows the lowest oxygen by {_share(sees['narrows_do'])}."}


def _chance(share):
    return (
        "almost certain"
        if share > 0.95
        else "likely"
        if share > 0.65
        else "as likely as not"
        if share > 0.35
        else "unlikely"
    )


def _share(share):
    """Return a share in words."""
    words = ((0.07, "a little"), (0.12, "a tenth"), (0.22, "a fifth"), (0.29, "a quarter"), (0.42, "a third"))
    return next((word for limit, word in words if share < limit), "half" if share < 0.6 else "more than half")
