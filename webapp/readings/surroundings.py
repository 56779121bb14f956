"""What is known around a reading: the plan there, the neighbours, the parcel's arrival, the readings before it."""

from bisect import bisect_right
from dataclasses import dataclass
from datetime import timedelta
from zoneinfo import ZoneInfo

from webapp.readings.expected import expected_at_stations, prediction_or_reasons
from webapp.readings.layers import FinalReading, final

NEIGHBOURLY = timedelta(hours=24)
OCCASION = timedelta(hours=2)
# A station that is read again after this long, on the same day, shows whether the river moved meanwhile.
ANCHOR = timedelta(hours=1)
# Two depths of the sensor, or two distances from the left edge, that are one point of the section.
SAME_POINT_M = 0.1
# A meter that is stuck shows it within a few stations; further back nothing is asked.
_RECENT_STATIONS = 12
_FURTHEST_BACK = 200


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
    repeats is the reading that a replicate repeats, anchor the first one at this point on the same day, if it was
    taken long enough ago to show what the river did meanwhile.
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
    anchor: FinalReading | None = None

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


def look_around(survey, plan_version, code, taken_at, readings, reading_id=None, replicate=False, point=None):
    """Return the Surroundings of a reading at a station and time; readings are all of the survey."""
    return Neighbourhood(survey, plan_version, readings).around(code, taken_at, reading_id, replicate, point)


def same_point(one, other):
    """Return whether two readings at a station are of one point of the section, as far as anybody said."""
    across = True
    if None not in (one.distance_left_m, other.distance_left_m):
        across = abs(one.distance_left_m - other.distance_left_m) <= SAME_POINT_M
    elif one.position and other.position:
        across = one.position == other.position
    if None in (one.sensor_depth_m, other.sensor_depth_m):
        return across
    return across and abs(one.sensor_depth_m - other.sensor_depth_m) <= SAME_POINT_M


class Neighbourhood:
    """The used readings of a survey, arranged so that what lies around any one of them is found at once."""

    def __init__(self, survey, plan_version, readings):
        self._survey = survey
        self._zone = ZoneInfo(survey.time_zone)
        self._distances = distances_of(plan_version)
        self._prediction, self._missing = prediction_or_reasons(survey, plan_version)
        self._expected = expected_at_stations(survey, plan_version)
        self._used = sorted((one for one in map(final, readings) if not one.set_aside), key=_when)
        self._times = [one.taken_at for one in self._used]
        self._run_starts = _run_starts(self._times)
        self._by_id = {one.id: one for one in self._used}
        self._at, self._times_at, self._on_day = {}, {}, {}
        for one in self._used:
            self._at.setdefault(one.station_code, []).append(one)
            self._times_at.setdefault(one.station_code, []).append(one.taken_at)
            self._on_day.setdefault((one.station_code, self._day(one.taken_at)), []).append(one)
        self._arrivals = {code: self._arrival(code) for code in self._expected}
        self._places = sorted((place, code) for code, place in self._distances.items() if code in self._at)
        self._towards = {}

    def around(self, code, taken_at, reading_id=None, replicate=False, point=None):
        """Return the Surroundings of a reading at a station and time; reading_id is its own, which does not count.

        point is a reading whose point of the section it shares, where its own is not among the readings.
        """
        survey, distance = self._survey, self._distances.get(code)
        point = point or self._by_id.get(reading_id)
        travel_h, arrives_at = self._arrivals.get(code, (None, None))
        return Surroundings(
            code=code,
            distance_km=distance,
            prediction=self._prediction,
            missing=self._missing,
            expected=self._expected.get(code),
            upstream=self._neighbour(-1, distance, taken_at),
            downstream=self._neighbour(1, distance, taken_at),
            repeats=self._repeated(code, taken_at, reading_id, point) if replicate else None,
            recent_do_mg_l=self._recent(code, taken_at),
            travel_time_h=travel_h,
            arrives_at=arrives_at,
            hours_late=hours_after(arrives_at, taken_at),
            run_span_h=self._run_span_h(taken_at) if survey.sampling == "snapshot" else None,
            anchor=self._anchor(code, taken_at, reading_id, point),
        )

    def _arrival(self, code):
        """Return (travel time in h, when the parcel is there) of a station, None where it can't be told."""
        expected, distance = self._expected[code], self._distances[code]
        travel_h = expected.travel_time_h if expected and distance >= 0 else None
        return travel_h, arrival_of(self._survey, travel_h)

    def _neighbour(self, side, distance, taken_at):
        """Return the nearest station read upstream (-1) or downstream (1), on the same side of the outfall."""
        if distance is None:
            return None
        if (codes := self._towards.get((side, distance))) is None:
            codes = self._towards[side, distance] = self._codes_towards(side, distance)
        for code in codes:
            times = self._times_at[code]
            after = bisect_right(times, taken_at)
            nearest = after - 1 if after else 0
            if 0 < after < len(times) and times[after] - taken_at < taken_at - times[nearest]:
                nearest = after
            if abs(times[nearest] - taken_at) <= NEIGHBOURLY:
                return Neighbour(code, self._at[code][nearest], self._expected.get(code))
        return None

    def _codes_towards(self, side, distance):
        """Return the stations read on one side of a place and the same side of the outfall, the nearest first."""
        beyond = [
            code for there, code in self._places if (there - distance) * side > 0 and (there < 0) == (distance < 0)
        ]
        return beyond if side > 0 else beyond[::-1]

    def _repeated(self, code, taken_at, reading_id, point):
        """Return the reading that a replicate repeats: the last one at its point on this occasion."""
        here = self._at.get(code, [])
        for one in reversed(here[: bisect_right(self._times_at.get(code, []), taken_at)]):
            if taken_at - one.taken_at > OCCASION:
                return None
            if one.id != reading_id and (point is None or same_point(one, point)):
                return one
        return None

    def _anchor(self, code, taken_at, reading_id, point):
        """Return the first reading at this point on the same day, where it was taken long enough ago."""
        for one in self._on_day.get((code, self._day(taken_at)), ()):
            if taken_at - one.taken_at < ANCHOR:
                return None
            if one.id != reading_id and (point is None or same_point(one, point)):
                return one
        return None

    def _day(self, instant):
        return instant.astimezone(self._zone).date()

    def _recent(self, code, taken_at):
        """Return oxygen at the stations read before this one, one value each, the latest last."""
        latest = {}
        wanted = min(_RECENT_STATIONS, len(self._at) - (code in self._at))
        end = bisect_right(self._times, taken_at)
        for place in range(end - 1, max(0, end - _FURTHEST_BACK) - 1, -1):
            one = self._used[place]
            there = one.station_code
            if there not in latest and there != code and one.do_mg_l is not None:
                latest[there] = one.do_mg_l
                if len(latest) == wanted:
                    break
        return tuple(reversed(latest.values()))

    def _run_span_h(self, taken_at):
        """Return the hours since the first reading of this run."""
        place = bisect_right(self._times, taken_at) - 1
        going_on = place >= 0 and taken_at - self._times[place] <= OCCASION
        return (taken_at - self._run_starts[place]).total_seconds() / 3600 if going_on else 0.0


def arrival_of(survey, travel_time_h):
    """Return when the released parcel is a travel time below the outfall; None where nobody follows one."""
    if travel_time_h is None or survey.sampling != "same_parcel" or survey.release_at is None:
        return None
    return survey.release_at + timedelta(hours=travel_time_h)


def hours_after(arrives_at, taken_at):
    """Return how long after the parcel a reading was taken, negative before it. [h] None without an arrival."""
    return None if arrives_at is None else (taken_at - arrives_at).total_seconds() / 3600


def _when(reading):
    return reading.taken_at


def _run_starts(times):
    """Return when the run began that each time belongs to; a break as long as an occasion begins another."""
    starts = []
    for place, time in enumerate(times):
        starts.append(starts[-1] if place and time - times[place - 1] <= OCCASION else time)
    return starts
