"""What a reading did to today's sag: how far it lies from the sag of the other readings, and whether it moved the low
point.
"""

from dataclasses import dataclass

from webapp.sag.estimate import SagPoint

# What counts as moved: a share of the way to the low point, and oxygen that a meter can tell apart.
_PLACE_SHARE, _OXYGEN_MG_L = 0.05, 0.1
_NARROWER = 0.1


@dataclass(frozen=True)
class AgainstToday:
    """expected is the sag of the other readings at the place and temperature of this one, with its 90 % band, and
    difference_mg_l read less expected; both None while fewer than two other stations were read. says is a sentence.
    """

    expected: SagPoint | None
    difference_mg_l: float | None
    says: str


def against_today(show, before, after, reading, distance_km):
    """Return the AgainstToday of a FinalReading that counts; before and after are Today without and with it."""
    expected = before.at(distance_km, reading.water_temp_c) if before.ready and before.enough else None
    difference = None if expected is None else reading.do_mg_l - expected.do_mg_l
    return AgainstToday(expected, difference, moved_low_point(show, before, after))


def moved_low_point(show, before, after):
    """Return in a sentence whether a reading moved the low point of today's sag."""
    if not (after.ready and after.enough):
        return "Today's sag begins with the second station read below the outfall."
    place, oxygen = after.estimate.critical_km, after.estimate.critical_do_mg_l
    now = f"{show.text('oxygen', oxygen.median, 1)} at {show.place(place.median)}"
    if not before.enough:
        return f"With this reading today's sag begins: its low point is {now}."
    shift = place.median - before.estimate.critical_km.median
    change = oxygen.median - before.estimate.critical_do_mg_l.median
    said = [*_shifted(show, shift, after), *_changed(show, change)]
    if said:
        return f"This reading moved the low point {' and '.join(said)}: now {now}."
    was = before.estimate.critical_km
    if place.high - place.low < (1 - _NARROWER) * (was.high - was.low):
        return f"This reading leaves the low point where it was, and places it more closely: {now}."
    return f"This reading leaves the low point where it was: {now}."


def _shifted(show, shift_km, after):
    way = max(after.estimate.critical_km.median - after.estimate.outfall_km, 0.0)
    if abs(shift_km) < max(_PLACE_SHARE * way, 0.05):
        return []
    return [f"{show.text('length', abs(shift_km), 1)} {'down' if shift_km > 0 else 'up'}stream"]


def _changed(show, change_mg_l):
    if abs(change_mg_l) < _OXYGEN_MG_L:
        return []
    return [f"{show.text('oxygen', abs(change_mg_l), 1)} {'higher' if change_mg_l > 0 else 'lower'}"]
