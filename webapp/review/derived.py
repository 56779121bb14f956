"""What follows from many readings at once: saturation, deficit and how each compares with the predicted sag.

The on-site check computes the same for one reading; here calc is called once over arrays, for tables and the dataset.
"""

import math
from dataclasses import dataclass

from webapp.readings.check import at_measured_temperature
from webapp.readings.saturations import saturations_of
from webapp.readings.surroundings import arrival_of, hours_after


@dataclass(frozen=True)
class Derived:
    """What follows from one reading; None where it can't be told. difference_mg_l is measured less predicted."""

    distance_km: float | None
    saturation_mg_l: float | None
    percent_saturation: float | None
    deficit_mg_l: float | None
    travel_time_h: float | None
    hours_late: float | None
    predicted_do_mg_l: float | None
    predicted_low_mg_l: float | None
    predicted_high_mg_l: float | None
    difference_mg_l: float | None


def derive(survey, stations, prediction, finals):
    """Return a Derived for each FinalReading.

    stations are the rows of a plan, prediction that plan's, or None where it has none. The predicted oxygen is that at
    the temperature measured: measured saturation less predicted deficit.
    """
    places = {row["code"]: row.get("distance_km") for row in stations}
    expected = {code: _at(prediction, place) for code, place in places.items()}
    saturation = saturations_of(finals)
    return [
        _one(survey, final, places.get(final.station_code), expected.get(final.station_code), float(value))
        for final, value in zip(finals, saturation, strict=True)
    ]


def _at(prediction, distance_km):
    return None if prediction is None or distance_km is None else prediction.at(distance_km)


def _one(survey, final, distance_km, expected, saturation):
    saturation = saturation if math.isfinite(saturation) else None
    oxygen = final.do_mg_l
    both = saturation is not None and oxygen is not None
    predicted, low, high = at_measured_temperature(expected, saturation)
    travel = expected.travel_time_h if expected is not None and distance_km >= 0 else None
    return Derived(
        distance_km=distance_km,
        saturation_mg_l=saturation,
        percent_saturation=100 * oxygen / saturation if both else None,
        deficit_mg_l=saturation - oxygen if both else None,
        travel_time_h=travel,
        hours_late=hours_after(arrival_of(survey, travel), final.taken_at),
        predicted_do_mg_l=predicted,
        predicted_low_mg_l=low,
        predicted_high_mg_l=high,
        difference_mg_l=None if predicted is None or oxygen is None else oxygen - predicted,
    )
