"""Where oxygen is lowest along a river, and how the river comes to be lowest there."""

from dataclasses import dataclass, replace

import numpy as np

from calc.balance import ORDINARY, Balance
from calc.descent import Caution, outfall_place
from calc.stretches import cut, members_of

WITHIN = "within a reach"
MIXING_POINT = "at the mixing point"
FIRST_REACH = "at the head of the first reach"
BELOW_INFLOW = "at an inflow, just below"
ABOVE_INFLOW = "at an inflow or weir, just above"
CHANGE = "where the reach changes"
STILL_FALLING = "at the end of the last reach (oxygen still falling)"
UNKNOWN = "not known, a number is missing"
KINDS = (WITHIN, MIXING_POINT, FIRST_REACH, BELOW_INFLOW, ABOVE_INFLOW, CHANGE, STILL_FALLING, UNKNOWN)
_ABOVE_OUTFALL = -1
# Where oxygen jumps, or the search begins: the head of a stretch counts even where the stretch has no length.
_JUMPS = tuple(KINDS.index(kind) for kind in (MIXING_POINT, FIRST_REACH, BELOW_INFLOW))
_LAST_CHANCES = tuple(KINDS.index(kind) for kind in (ABOVE_INFLOW, STILL_FALLING))
_SAME_PLACE_KM = 1e-9


@dataclass(frozen=True)
class CriticalPoint:
    """Where oxygen is lowest: plain values for one river, arrays of shape (n,) for n plausible ones.

    Where it just precedes an inflow or weir the values are those of the water above it. Where oxygen runs out, the
    place is where it does; anoxic_from_km and anoxic_to_km bound that first length without oxygen, NaN otherwise. kind
    is one of KINDS: STILL_FALLING says that the true lowest point lies below the river as entered.
    """

    distance_km: float
    travel_time_h: float
    do_mg_l: float
    deficit_mg_l: float
    water_temp_c: float
    saturation_mg_l: float
    anoxic: bool
    anoxic_from_km: float
    anoxic_to_km: float
    kind: str
    warnings: tuple[Caution, ...] = ()


def critical_point(river):
    """Return where oxygen is lowest at and below the outfall, or in a river without one anywhere, as a CriticalPoint.

    Parameters
    ----------
    river : River
        One river, or n plausible ones where its fields hold arrays of shape (n,).

    Raises
    ------
    OutOfRangeError
        If more water is withdrawn than the river carries, or arrays differ in length.

    Notes
    -----
    Exact: within each stretch the deficit has at most one maximum, the root of its derivative; the lowest of these and
    of the stretches' ends is taken. Lowest oxygen, not highest deficit: saturation changes with temperature. Of places
    equally low the first counts.
    """
    stretches = _in_columns(cut(river))
    begins, ends = _codes(river, stretches)
    length_km = stretches.to_km - stretches.from_km
    duration_d = length_km / stretches.km_per_day
    ordinary = stretches.phase == ORDINARY
    peak_d = np.where(ordinary, stretches.balance.peak_time_d(duration_d), 0.0)
    # The maximum removes rounding only: where oxygen runs out the deficit is the saturation.
    do = np.maximum(stretches.saturation_mg_l - stretches.balance.deficit_at(peak_d), 0.0)
    searched = (begins != _ABOVE_OUTFALL) & ((length_km > 0) | np.isin(begins, _JUMPS))
    at_end = (peak_d > 0) & (peak_d >= duration_d)
    # Where oxygen is continuous a stretch's end is left to the head of the next: the water just below counts.
    searched &= ~at_end | np.isin(ends, _LAST_CHANCES)
    dry = (begins != _ABOVE_OUTFALL) & ~ordinary & (length_km > 0)
    lowest = np.where(dry.any(axis=0), dry.argmax(axis=0), np.where(searched, do, np.inf).argmin(axis=0))
    code = np.where(peak_d == 0, begins, np.where(at_end, ends, KINDS.index(WITHIN)))
    code = np.where(np.isnan(do), KINDS.index(UNKNOWN), code)
    place_km = np.where(at_end, stretches.to_km, stretches.from_km + peak_d * stretches.km_per_day)
    missing = np.where(np.isnan(do), np.nan, 0.0)
    dry_from_km, dry_to_km = _first_dry_length(dry, stretches)
    values = {
        "distance_km": place_km + missing,
        "travel_time_h": 24 * (stretches.head_time_d + peak_d) + missing,
        "do_mg_l": do,
        "deficit_mg_l": stretches.saturation_mg_l - do,
        "water_temp_c": stretches.water_temp_c,
        "saturation_mg_l": stretches.saturation_mg_l,
        "anoxic": do <= 0,
        "anoxic_from_km": dry_from_km,
        "anoxic_to_km": dry_to_km,
        "kind": np.array(KINDS)[code],
    }
    picked = {
        name: np.take_along_axis(np.broadcast_to(value, do.shape), lowest[None], axis=0)[0]
        for name, value in values.items()
    }
    if members_of(river) is None:
        picked = {name: value[0].item() for name, value in picked.items()}
    return CriticalPoint(**picked, warnings=stretches.cautions)


def _in_columns(stretches):
    """Return the stretches with every array of shape (s, n), n being 1 for a single river."""
    values = {name: _column(value) for name, value in vars(stretches).items() if isinstance(value, np.ndarray)}
    balance = Balance(*(_column(value) for value in vars(stretches.balance).values()))
    return replace(stretches, **values, balance=balance)


def _column(values):
    return values.reshape(len(values), -1)


def _codes(river, stretches):
    """Return for the head and for the end of each stretch the place in KINDS of a lowest point there."""
    starts = stretches.starts
    has_outfall = river.outfall_km is not None
    first = outfall_place(river, starts)
    at = {start.from_km: start for start in starts if np.ndim(start.from_km) == 0}
    begins = [_begin_code(start, place - first, has_outfall) for place, start in enumerate(starts)]
    ends = [KINDS.index(_end_kind(at.get(start.next_km), river)) for start in starts]
    place = stretches.start[:, 0]
    begin, end = (_column(np.array(codes))[place] for codes in (begins, ends))
    within = KINDS.index(WITHIN)
    # A lower half has the code of the upper one where that has no length; a stretch split by anoxia has its Start's
    # code at its first head only.
    settled = np.array([start.settled for start in starts])[place]
    whole = np.searchsorted(place, place - settled)
    at_head = stretches.from_km == stretches.from_km[whole]
    begin = np.where(at_head | (begin == _ABOVE_OUTFALL), begin[whole], within)
    next_km = _column(np.array([start.next_km for start in starts]))[place]
    return begin, np.where(stretches.to_km == next_km, end, within)


def _begin_code(start, places_below_first, has_outfall):
    if places_below_first < 0:
        return _ABOVE_OUTFALL
    if places_below_first == 0:
        return KINDS.index(MIXING_POINT if has_outfall else FIRST_REACH)
    if start.mixes:
        return KINDS.index(BELOW_INFLOW)
    return KINDS.index(CHANGE if start.new_reach else WITHIN)


def _end_kind(following, river):
    """Return what a lowest point at the end of a stretch is called, by the Start that follows there, if one does."""
    if following is not None and (following.mixes or following.weirs):
        return ABOVE_INFLOW
    if following is None or following.from_km == river.to_km:
        return STILL_FALLING
    return CHANGE if following.new_reach else WITHIN


def _first_dry_length(dry, stretches):
    """Return from where to where each river is first without oxygen, NaN where it never is. [km]"""
    head_km = np.take_along_axis(stretches.from_km, dry.argmax(axis=0)[None], axis=0)[0]
    from_km = np.where(dry.any(axis=0), head_km, np.nan)
    to_km = from_km
    for place in range(len(dry)) if dry.any() else ():
        goes_on = dry[place] & (np.abs(stretches.from_km[place] - to_km) <= _SAME_PLACE_KM)
        to_km = np.where(goes_on, stretches.to_km[place], to_km)
    return from_km, to_km
