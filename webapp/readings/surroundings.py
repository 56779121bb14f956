"""What is known around a reading: the plan there, the neighbours, the parcel's arrival, the readings before it."""

from dataclasses import dataclass
from datetime import timedelta

from webapp.readings.expected import expected_at_stations, prediction_or_reasons
from webapp.readings.layers import FinalReading, final

NEIGHBOURLY = timedelta(hours=24)
OCCASION = timedelta(hours=2)


@dataclass(frozen=True)
class Neighbour:
    """The nearest station read on one side, by its reading nearest in time, and what the plan expects there."""

    code: str
    reading: FinalReading
    expected: object


@dataclass(frozen=True)
class Surroundings:
    """Distances in km below the outfall, times in h; None where it can't be told.

    expected is the prediction at the station; missing says what the plan lacks where there is no prediction at all.
    """

    code: str
    distance_km: float | None
    prediction: object
    missing: tuple
    expected: object
    upstream: Neighbour | None
    downstream: Neighbour | None
    repeats: FinalReading | None
    recent_do_mg_l: tuple
    travel_time_h: float | None
    arrives_at: object
    hours_late: float | None
    run_span_h: float | None

    @property
    def above_outfall(self):
        """Return whether the station lies above the outfall: the parcel never comes there."""
        return self.distance_km is not None and self.distance_km < 0


def distances_of(plan_version):
    """Return the distance of each station of a plan, by code. [km]"""
    return {row["code"]: row["distance_km"] for row in plan_version.tables["stations"]} if plan_version else {}


def where(plan_version, code):
    """Return the rows of a station and of its access point in a plan; empty ones where it has none."""
    tables = plan_version.tables if plan_version else {"stations": [], "access": []}
    station = next((row for row in tables["stations"] if row["code"] == code), {})
    return station, next((row for row in tables["access"] if row["name"] == station.get("access")), {})


def look_around(survey, plan_version, code, taken_at, readings, reading_id=None, replicate=False):
    """Return the Surroundings of a reading at a station and time; readings are all of the survey."""
    distances = distances_of(plan_version)
    distance = distances.get(code)
    prediction, missing = prediction_or_reasons(survey, plan_version)
    at_stations = expected_at_stations(survey, plan_version)
    used = [one for one in map(final, readings) if one.id != reading_id and not one.set_aside]
    before = [one for one in used if one.taken_at <= taken_at]
    expected = at_stations.get(code)
    travel_h = expected.travel_time_h if expected and distance >= 0 else None
    follows = survey.sampling == "same_parcel" and survey.release_at is not None and travel_h is not None
    arrives_at = survey.release_at + timedelta(hours=travel_h) if follows else None
    near = [one for one in used if abs(one.taken_at - taken_at) <= NEIGHBOURLY]
    return Surroundings(
        code=code,
        distance_km=distance,
        prediction=prediction,
        missing=missing,
        expected=expected,
        upstream=_neighbour(-1, distance, distances, near, taken_at, at_stations),
        downstream=_neighbour(1, distance, distances, near, taken_at, at_stations),
        repeats=_repeated(code, taken_at, before) if replicate else None,
        recent_do_mg_l=_recent(code, before),
        travel_time_h=travel_h,
        arrives_at=arrives_at,
        hours_late=(taken_at - arrives_at).total_seconds() / 3600 if follows else None,
        run_span_h=_run_span_h(taken_at, before) if survey.sampling == "snapshot" else None,
    )


def _neighbour(side, distance, distances, near, taken_at, at_stations):
    """Return the nearest station read upstream (-1) or downstream (1), on the same side of the outfall."""
    if distance is None:
        return None
    beside = [
        one
        for one in near
        if (there := distances.get(one.station_code)) is not None
        and (there - distance) * side > 0
        and (there < 0) == (distance < 0)
    ]
    if not beside:
        return None
    reading = min(beside, key=lambda one: (abs(distances[one.station_code] - distance), abs(one.taken_at - taken_at)))
    return Neighbour(reading.station_code, reading, at_stations.get(reading.station_code))


def _repeated(code, taken_at, before):
    """Return the reading that a replicate repeats: the last one at the station on this occasion."""
    here = [one for one in before if one.station_code == code and taken_at - one.taken_at <= OCCASION]
    return here[-1] if here else None


def _recent(code, before):
    """Return oxygen at the stations read before this one, one value each, the latest last."""
    latest = {}
    for one in before:
        if one.station_code != code and one.do_mg_l is not None:
            latest.pop(one.station_code, None)
            latest[one.station_code] = one.do_mg_l
    return tuple(latest.values())


def _run_span_h(taken_at, before):
    """Return the hours since the first reading of this run; a break as long as an occasion begins another."""
    start = taken_at
    for one in reversed(before):
        if start - one.taken_at > OCCASION:
            break
        start = one.taken_at
    return (taken_at - start).total_seconds() / 3600
