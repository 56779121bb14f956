"""Sentences of calc as a survey says them: places by station code, or in the distances and units that it shows."""

import re

SAME_PLACE_KM = 0.06
_NUMBER = r"[-\u2212]?\d+(?:\.\d+)?"
_STRETCH = re.compile(rf"({_NUMBER})( to | and )({_NUMBER}) km")
_AT = re.compile(rf"({_NUMBER}) km")


def plainly(show, text, codes):
    """Return a sentence with each distance in it as a station's code, else as the survey shows places.

    codes are (distance [km], code) of the stations; calc rounds distances to a tenth.
    """

    def named(number):
        km = float(number.replace("\u2212", "-"))
        near = min(codes, key=lambda one: abs(one[0] - km), default=None)
        return near[1] if near and abs(near[0] - km) <= SAME_PLACE_KM else show.place(km)

    text = _STRETCH.sub(lambda found: f"{named(found[1])}{found[2]}{named(found[3])}", text)
    return _AT.sub(lambda found: named(found[1]), text)


def stretch(show, low_km, high_km):
    """Return a stretch of river in words: "12.4 to 16.9 km below the outfall", "river mile 34.2 to 29.4"."""
    first, last = show.number("place", low_km, 1), show.number("place", high_km, 1)
    if show.distance_rule != "downstream":
        return f"{show.place_label().lower()} {first} to {last}"
    return f"{first} to {last} {show.unit_label('place')} below the outfall"


def interval_words(show, quantity, interval, digits=None):
    """Return a 90 % interval in words: "3.8 mg/L (3.6 to 4.0)"."""
    low, high = (show.number(quantity, value, digits) for value in (interval.low, interval.high))
    return f"{show.text(quantity, interval.median, digits)} ({low} to {high})"
