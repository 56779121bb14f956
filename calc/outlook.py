"""What a reading at a place would change: expected doubt in the lowest oxygen, its place and the regret after it.

Readings are simulated from the weighted plausible rivers of an estimate, which are then weighed again by each.
"""

import numpy as np
from scipy.special import ndtri

_READINGS = 32
_SAME_PLACE = 0.004
# One and a half times the error of a difference of two readings: less is no sign that oxygen is higher.
_WITHIN = 1.5 * np.sqrt(2)
_RISE_MG_L, _RISE_ERRORS = 0.3, 1.5


def is_new(estimate, places):
    """Return which places lie on the plan's river below the outfall and are no station yet."""
    read = estimate.stations_km
    inside = (places > estimate.outfall_km) & (places <= estimate.plan.to_km)
    if not len(read):
        return inside
    return inside & (np.abs(places[:, None] - read).min(axis=1) > _SAME_PLACE * estimate.scale_km)


def new_places(estimate, places):
    """Return the places that are new."""
    return places[is_new(estimate, places)]


def open_end(estimate):
    """Return "above" or "below" where the lowest reading, within its error, is the first or last station, or None."""
    read, evidence = estimate.stations_km, estimate.evidence
    if not len(read):
        return None
    below_outfall = evidence.distance_km >= estimate.outfall_km
    means = np.array([evidence.do_mg_l[below_outfall & (evidence.distance_km == km)].mean() for km in read])
    low = means <= means.min() + _WITHIN * evidence.noise_mg_l
    if low[0] and low[-1]:
        return "above" if estimate.p_in_gap[0] > estimate.p_in_gap[-1] else "below"
    return "below" if low[-1] else "above" if low[0] else None


def outlook(estimate, places):
    """Return for each place the gain, how far the intervals would narrow, and the chance to see recovery."""
    settings, weight = estimate.settings, estimate.weight
    oxygen = along(estimate, places)
    shown = oxygen + estimate.bias_mg_l
    noise = estimate.evidence.noise_mg_l
    after = _reweighted(shown, weight, noise)
    lowest = estimate.lowest_mg_l
    middle, most = estimate.critical_km.median, 3 * max(estimate.critical_km.median, 0.3 * estimate.scale_km)
    place = np.minimum(estimate.place_km, most)
    base = np.stack([lowest, lowest**2, place, place**2])
    now = _spread(base @ weight)
    then = _spread(np.moveaxis(after @ base.T, -1, 0)).mean(axis=-1)
    scale = np.array([settings.scale_do_mg_l, settings.scale_place * max(middle, 0.1 * estimate.scale_km)])
    regret_now, regret = _regrets(estimate, after)
    losses_now = [*(now / scale**2), (regret_now / settings.scale_regret_mg_l)]
    losses = [*(then / scale[:, None] ** 2), regret / settings.scale_regret_mg_l]
    weights = (1.0, settings.weigh_place, settings.weigh_regret)
    total_now = sum(w * loss for w, loss in zip(weights, losses_now, strict=True))
    total = sum(w * loss for w, loss in zip(weights, losses, strict=True))
    left = np.sqrt(then / np.maximum(now, 1e-12)[:, None])
    return {
        "gain": 1 - total / max(total_now, 1e-12),
        "narrows_place": np.clip(1 - left[1], 0, 1),
        "narrows_do": np.clip(1 - left[0], 0, 1),
        "p_shows_recovery": _recovery(estimate, oxygen),
    }


def along(estimate, places):
    """Return oxygen of every draw at places, (a, n), between the grid's points."""
    grid, do = estimate.grid_km, estimate.draws.do_mg_l
    at = np.clip(np.searchsorted(grid, places, side="right") - 1, 0, len(grid) - 2)
    part = ((places - grid[at]) / (grid[at + 1] - grid[at]))[:, None]
    return do[at] * (1 - part) + do[at + 1] * part


def _reweighted(shown, weight, noise):
    """Return the weights of the draws after each of some simulated readings at each place: (a, readings, n).

    The readings come from draws spread evenly over the weights, each with an error; the same for every place.
    """
    levels = (np.arange(_READINGS) + 0.5) / _READINGS
    chosen = np.minimum(np.searchsorted(np.cumsum(weight), levels), len(weight) - 1)
    errors = noise * np.random.default_rng(22).permutation(_normal_scores())
    seen = shown[:, chosen] + errors
    apart = (seen[:, :, None] - shown[:, None, :]) / noise
    after = np.exp(-0.5 * apart**2) * weight
    return after / np.maximum(after.sum(axis=2, keepdims=True), 1e-300)


def _normal_scores():
    return ndtri((np.arange(_READINGS) + 0.5) / _READINGS)


def _spread(moments):
    """Return the variances of lowest oxygen and of its place from their first two moments."""
    return np.maximum(np.stack([moments[1] - moments[0] ** 2, moments[3] - moments[2] ** 2]), 0.0)


def _regrets(estimate, after):
    """Return the expected regret of the best place to name, now and after a reading at each place. [mg/L]"""
    first = int(np.searchsorted(estimate.grid_km, estimate.outfall_km))
    do = estimate.draws.do_mg_l[first:].T
    now = (estimate.weight @ do).min() - estimate.weight @ estimate.lowest_mg_l
    then = (after.reshape(-1, after.shape[2]) @ do).min(axis=1).reshape(after.shape[:2])
    return max(now, 0.0), (then - after @ estimate.lowest_mg_l).mean(axis=1).clip(0)


def _recovery(estimate, oxygen):
    """Return the chance that a place reads clearly above the lowest reading so far."""
    values = estimate.evidence.do_mg_l[estimate.evidence.distance_km >= estimate.outfall_km]
    if not len(values):
        return np.zeros(len(oxygen))
    rise = max(_RISE_MG_L, _RISE_ERRORS * estimate.evidence.noise_mg_l)
    return (oxygen > values.min() + rise) @ estimate.weight
