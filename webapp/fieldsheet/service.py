"""The stations in the order of the day: when the parcel gets there, how to get there, what is done, what is next."""

from dataclasses import dataclass
from datetime import datetime, timedelta

from calc.travel import LEADING_EDGE_SHARE
from webapp.plan.day import day_changes
from webapp.readings.expected import expected_at_stations, prediction_or_reasons
from webapp.readings.layers import FinalReading, final
from webapp.readings.repeats import due_of, local_day
from webapp.readings.section_words import in_short


@dataclass(frozen=True)
class Stop:
    """One station of the day. arrives_at is when the released parcel's peak is there, leads_at its leading edge.

    crew is the name of the person it is for, empty where it is for whoever comes by.
    """

    code: str
    distance_km: float
    place: str
    way: str
    hazards: str
    contact: str
    drive_min: float | None
    drive_from: str
    state: str
    reason: str
    crew: str
    travel_time_h: float | None
    arrives_at: datetime | None
    leads_at: datetime | None
    readings: tuple[FinalReading, ...]
    set_aside: int

    @property
    def above_outfall(self):
        """Return whether the released parcel never comes here."""
        return self.distance_km < 0

    @property
    def last(self):
        """Return the last used reading, or None."""
        return self.readings[-1] if self.readings else None


@dataclass(frozen=True)
class Sheet:
    """The day: stops in their order, the dropped ones apart, the next to do.

    missing says why no time can be told; by_the_day whether times follow what the day showed.
    """

    stops: tuple[Stop, ...]
    dropped: tuple[Stop, ...]
    next: Stop | None
    missing: tuple[str, ...]
    cold_c: float | None
    by_the_day: bool = False


def sheet_of(survey, plan_version, readings, person_name=""):
    """Return the Sheet of a survey for a person; readings are all of the survey."""
    if plan_version is None:
        return Sheet((), (), None, ("There is no plan yet.",), None)
    _, missing = prediction_or_reasons(survey, plan_version)
    expected = expected_at_stations(survey, plan_version)
    rows = sorted(plan_version.tables["stations"], key=lambda row: (row["distance_km"], row["code"]))
    access = {row["name"]: row for row in plan_version.tables["access"]}
    finals = [final(one) for one in readings]
    stops, before = [], None
    for row in rows:
        dropped = row.get("state") == "dropped"
        stop = _stop(survey, row, access, expected.get(row["code"]), finals, None if dropped else before)
        stops.append(stop)
        before = before if dropped else row
    going = tuple(stop for stop in stops if stop.state != "dropped")
    dropped = tuple(stop for stop in stops if stop.state == "dropped")
    temperatures = [one.water_temp_c for one in finals if one.water_temp_c is not None]
    by_the_day = day_changes(plan_version.tables)
    return Sheet(
        going, dropped, _next(going, finals, person_name), missing, min(temperatures, default=None), by_the_day
    )


def next_stop(survey, plan_version, readings, person_name=""):
    """Return the Stop to do next: the first without a reading below the one read last, else the first without any.

    A station that is for somebody else comes after all others.
    """
    return sheet_of(survey, plan_version, readings, person_name).next


@dataclass(frozen=True)
class Points:
    """What the sheet says of sections and repeats.

    verdicts holds a few words on mixed and layered by station code; due says why the person owes a replicate, and
    repeat is their last reading of the day, which it may repeat; None where none is due.
    """

    verdicts: dict[str, str]
    due: str
    repeat: FinalReading | None


def points_on_sheet(survey, judgement, settings, person_id, now):
    """Return the Points of a survey for a person; judgement is that of all its readings."""
    by_code = {}
    for one in judgement.occasions:
        by_code.setdefault(one.station_code, []).append(one)
    own = [one.reading for one in judgement.by_id.values() if one.author_id == person_id]
    today = [one for one in own if local_day(survey, one.taken_at) == local_day(survey, now) and not one.set_aside]
    due = due_of(today, settings)
    verdicts = {code: words for code, some in by_code.items() if (words := in_short(some))}
    return Points(verdicts, due, max(today, key=lambda one: one.taken_at) if due else None)


def _next(stops, finals, person_name):
    places = {stop.code: stop.distance_km for stop in stops}
    read = [(one.taken_at, at, one.station_code) for at, one in enumerate(finals) if not one.set_aside]
    *_, latest = max(read, default=("",))
    to_do = [stop for stop in stops if not stop.last]
    to_do = [stop for stop in to_do if stop.crew in ("", person_name)] or to_do
    below = [stop for stop in to_do if latest in places and stop.distance_km > places[latest]]
    return next(iter(below or to_do), None)


def _stop(survey, row, access, expected, finals, before):
    place = access.get(row.get("access") or "", {})
    here = [one for one in finals if one.station_code == row["code"]]
    travel_h = expected.travel_time_h if expected and row["distance_km"] >= 0 else None
    follows = survey.sampling == "same_parcel" and survey.release_at is not None and travel_h is not None
    drive_min = _drive_min(access, before, row)
    return Stop(
        code=row["code"],
        distance_km=row["distance_km"],
        place=row.get("access") or "",
        way=place.get("way") or "",
        hazards=place.get("hazards") or "",
        contact=place.get("contact") or "",
        drive_min=drive_min,
        drive_from=before["code"] if drive_min is not None else "",
        state=row.get("state") or "planned",
        reason=row.get("reason") or "",
        crew=row.get("crew") or "",
        travel_time_h=travel_h,
        arrives_at=survey.release_at + timedelta(hours=travel_h) if follows else None,
        leads_at=survey.release_at + timedelta(hours=LEADING_EDGE_SHARE * travel_h) if follows else None,
        readings=tuple(one for one in here if not one.set_aside),
        set_aside=sum(one.set_aside for one in here),
    )


def _drive_min(access, before, row):
    """Return the minutes to drive from the stop before, over every access point between; None where one is unknown."""
    start, end = (access.get((one or {}).get("access") or "") for one in (before, row))
    if start is None or end is None or start is end:
        return None
    ways = [
        one.get("drive_min")
        for one in access.values()
        if start["distance_km"] < one["distance_km"] <= end["distance_km"]
    ]
    return sum(ways) if ways and None not in ways else None
