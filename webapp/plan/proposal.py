"""Proposes stations round the predicted critical point, at places where a crew can reach the water."""

from dataclasses import dataclass, replace

from calc.errors import OutOfRangeError
from calc.travel import distance_at_travel_time_km
from webapp.plan.notes import Note
from webapp.plan.rows import SAME_PLACE_KM

MULTIPLES = (0.25, 0.5, 0.75, 1.0, 1.25, 1.5, 2.0)
ABOVE_OUTFALL_KM = -0.3
_NOTHING_ABOVE = "The first reach begins at the outfall: add one above it for a station there."
_NO_MIXING = "Enter width and slope of the reach at the outfall for a station where the river is mixed across."
_NO_SAG = "Oxygen is lowest right where the waters mix, so there is no travel time to a low point to take parts of."
_MIXES_BEYOND = "The river is mixed across only below the last reach."
_BEYOND = "{} the travel time to the low point lies below the last reach: add a reach there to plan it."


@dataclass(frozen=True)
class Proposal:
    """A station to be: where it is wanted and why, and where it can be: its access point, "" without one."""

    wanted_km: float
    whys: tuple[str, ...]
    distance_km: float
    access: str = ""
    station: str = ""
    travel_time_h: float = 0.0
    do_mg_l: float = 0.0

    @property
    def moved_km(self):
        """Return how far it was moved to reach an access point, downstream counted as positive."""
        return self.distance_km - self.wanted_km


@dataclass(frozen=True)
class Proposed:
    """The proposals down the river, and Notes on what could not be proposed."""

    proposals: tuple[Proposal, ...]
    notes: tuple[Note, ...] = ()


def propose(tables, prediction):
    """Return what a plan's prediction proposes as stations, as Proposed.

    Each place goes to the nearest access point on its own side of the outfall, that of complete mixing to one below it
    where there is one; places that meet at one access point become one. station is the code of a station that is there.
    """
    notes = []
    river = prediction.river
    access = [one for one in tables["access"] if river.from_km <= one["distance_km"] <= river.to_km]
    wanted = [*_above(prediction, notes), *_at_mixing(prediction, notes), *_at_multiples(prediction, notes)]
    merged = {}
    for place in wanted:
        snapped = _snapped(place, access)
        key = round(snapped.distance_km / SAME_PLACE_KM) if not snapped.access else snapped.access
        merged[key] = _together(merged[key], snapped) if key in merged else snapped
    proposals = (_predicted(one, tables, prediction) for one in merged.values())
    return Proposed(tuple(sorted(proposals, key=lambda one: one.distance_km)), tuple(notes))


def _above(prediction, notes):
    top = prediction.river.from_km
    if top >= 0:
        notes.append(Note("nothing above", _NOTHING_ABOVE))
        return []
    place = max(ABOVE_OUTFALL_KM, top / 2)
    return [Proposal(place, ("above the outfall",), place)]


def _at_mixing(prediction, notes):
    if prediction.mix_km is None:
        notes.append(Note("no mixing distance", _NO_MIXING))
        return []
    place = float(prediction.mix_km.best_km)
    if place > prediction.river.to_km:
        notes.append(Note("mixes beyond", _MIXES_BEYOND))
        return []
    return [Proposal(place, ("at complete mixing",), place)]


def _at_multiples(prediction, notes):
    critical_h = prediction.critical.travel_time_h
    if critical_h <= 0:
        notes.append(Note("no sag", _NO_SAG))
        return []
    places, beyond = [], []
    for multiple in MULTIPLES:
        try:
            place = float(distance_at_travel_time_km(prediction.river, multiple * critical_h))
        except OutOfRangeError:
            beyond.append(f"{multiple:g} ×")
        else:
            places.append(Proposal(place, (f"{multiple:g} × the travel time to the low point",), place))
    if beyond:
        notes.append(Note("below the last reach", _BEYOND, (("", ", ".join(beyond)),)))
    return places


def _snapped(place, access):
    """Return the proposal at its nearest access point, where there is one on its side of the outfall."""
    side = [one for one in access if (one["distance_km"] < 0) == (place.wanted_km < 0)]
    if "at complete mixing" in place.whys:
        side = [one for one in side if one["distance_km"] >= place.wanted_km] or side
    if not side:
        return place
    nearest = min(side, key=lambda one: abs(one["distance_km"] - place.wanted_km))
    return replace(place, distance_km=nearest["distance_km"], access=nearest["name"])


def _together(one, other):
    nearer = min(one, other, key=lambda proposal: abs(proposal.moved_km))
    return replace(nearer, whys=one.whys + other.whys)


def _predicted(proposal, tables, prediction):
    there = prediction.at(proposal.distance_km)
    near = [row for row in tables["stations"] if abs(row["distance_km"] - proposal.distance_km) <= SAME_PLACE_KM]
    return replace(
        proposal,
        travel_time_h=there.travel_time_h,
        do_mg_l=there.do_mg_l,
        station=near[0]["code"] if near else "",
    )
