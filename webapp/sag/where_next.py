"""Where next: up to three places for the next station, each with why, how far, when the water is there, and whether
the day has room for it.
"""

from dataclasses import dataclass
from datetime import datetime, timedelta

import numpy as np

from calc.outlook import is_new
from calc.siting import next_station
from webapp.plan.rows import SAME_PLACE_KM
from webapp.readings.layers import final
from webapp.sag.budget import STATION_MIN, fits
from webapp.sag.codes import code_for
from webapp.sag.words import plainly

HOW_MANY = 3


@dataclass(frozen=True)
class Offer:
    """A place for the next station. place is its access point, empty where a boat reads anywhere.

    code is the one that it has in the plan (planned) or would get; why is a sentence; gain the share of the doubt that
    a reading would remove; drive_min and parcel_at are None where they are not known. allowed says whether the day has
    room for it, budget how, in words.
    """

    place: str
    distance_km: float
    code: str
    planned: bool
    why: str
    settles: str
    gain: float
    apart_km: float
    drive_min: float | None
    parcel_at: datetime | None
    allowed: bool
    budget: str
    hazards: str


@dataclass(frozen=True)
class Where:
    """Where next: what is offered, best first; what would pay but breaks the day's time; every other place left.

    declined are names of places that were declined and are not offered; reason says why nothing is offered.
    """

    offers: tuple[Offer, ...]
    breaks: tuple[Offer, ...]
    others: tuple[Offer, ...]
    declined: tuple[str, ...]
    anywhere: bool
    reason: str

    def find(self, key):
        """Return the offer whose place is asked for by its key, or None."""
        return next((one for one in (*self.offers, *self.breaks, *self.others) if key_of(one) == key), None)


def key_of(offer):
    """Return what a form calls a place: its access point's name, else its distance."""
    return offer.place or f"{offer.distance_km:.3f}"


@dataclass(frozen=True)
class _Points:
    """Where the water can be reached, with what it costs to be there; arrays by place."""

    rows: list
    km: np.ndarray
    drive_min: list
    parcel_at: list
    allowed: list
    budget: list


def where_next(show, survey, plan_version, today, readings, budget, now, declined=(), known_codes=()):
    """Return the Where of Today; budget is the day's Budget, declined names of places not to offer."""
    tables = plan_version.tables
    day = (tables.get("day") or [{}])[0]
    anywhere = bool(day.get("reachable_anywhere"))
    rows = _anywhere(today) if anywhere else list(tables.get("access") or [])
    points = _points(survey, tables, today, readings, rows, budget, now, anywhere)
    left = is_new(today.estimate, points.km) if len(rows) else np.zeros(0, dtype=bool)
    wanted = left & np.array([_name(row) not in declined for row in rows], dtype=bool)
    allowed = wanted & np.array(points.allowed, dtype=bool)

    def ranked(usable):
        found = _ranked(today, points, usable) if usable.any() else ()
        return tuple(_offer(show, tables, points, one, known_codes) for one in found)

    offers = ranked(allowed)
    breaks = ()
    if (wanted & ~allowed).any():
        best = max((one.gain for one in offers), default=0.0)
        breaks = tuple(one for one in ranked(wanted) if not one.allowed and one.gain >= best)[:1]
    named = {key_of(one) for one in (*offers, *breaks)}
    others = () if anywhere else _others(tables, points, left, named, known_codes)
    return Where(offers, breaks, others, tuple(declined), anywhere, _why_none(rows, left, wanted, allowed))


def _anywhere(today):
    """Return places along the river, as rows without a name, as far down as siting looks."""
    estimate = today.estimate
    end = min(estimate.outfall_km + 3 * estimate.scale_km, estimate.plan.to_km)
    places = np.unique(np.round(np.linspace(estimate.outfall_km, end, 61)[1:], 1))
    return [{"name": "", "distance_km": float(km)} for km in places if km <= estimate.plan.to_km]


def _name(row):
    return row["name"] or f"{row['distance_km']:.3f}"


def _points(survey, tables, today, readings, rows, budget, now, anywhere):
    drives = [None] * len(rows) if anywhere else drive_minutes(tables, readings, rows)
    expected = today.prediction.along([row["distance_km"] for row in rows])
    follows = survey.sampling == "same_parcel" and survey.release_at is not None
    parcels = [
        survey.release_at + timedelta(hours=one.travel_time_h) if follows and one is not None else None
        for one in expected
    ]
    verdicts = [fits(budget, now, drive, parcel, STATION_MIN) for drive, parcel in zip(drives, parcels, strict=True)]
    return _Points(
        rows=rows,
        km=np.array([row["distance_km"] for row in rows], dtype=float),
        drive_min=drives,
        parcel_at=parcels,
        allowed=[allowed for allowed, _ in verdicts],
        budget=[words for _, words in verdicts],
    )


def drive_minutes(tables, readings, rows):
    """Return the minutes to drive to each access point from where the crew read last; None where one is unknown."""
    here = last_place_km(tables, readings)
    ways = sorted(tables.get("access") or [], key=lambda row: row["distance_km"])
    if here is None or not ways:
        return [None] * len(rows)
    start = min(ways, key=lambda row: abs(row["distance_km"] - here))["distance_km"]
    found = []
    for row in rows:
        low, high = sorted((start, row["distance_km"]))
        legs = [way.get("drive_min") for way in ways if low < way["distance_km"] <= high]
        found.append(None if None in legs else float(sum(legs)))
    return found


def last_place_km(tables, readings):
    """Return where the last reading was taken, or None. [km]"""
    places = {row["code"]: row["distance_km"] for row in tables.get("stations") or []}
    taken = [(one.taken_at, places[one.station_code]) for one in map(final, readings) if one.station_code in places]
    return max(taken)[1] if taken else None


def _ranked(today, points, usable):
    """Return calc's Candidates among the usable places."""
    costs = [np.nan if minutes is None else minutes for minutes in points.drive_min]
    return next_station(
        today.estimate.plan,
        [one.distance_km for one in today.counted],
        [one.do_mg_l for one in today.counted],
        points.km,
        estimate=today.estimate,
        costs_min=None if np.isnan(costs).any() else costs,
        usable=usable,
        how_many=HOW_MANY,
    )


def _offer(show, tables, points, candidate, known_codes):
    at = candidate.access_index
    codes = [(row["distance_km"], row["code"]) for row in tables.get("stations") or []]
    reason = plainly(show, candidate.reason, codes)
    offer = _bare(tables, points, at, known_codes)
    return Offer(**{**vars(offer), "why": reason, "settles": candidate.settles, "gain": candidate.gain,
                    "apart_km": candidate.apart_km})  # fmt: skip


def _bare(tables, points, at, known_codes):
    """Return the Offer of a place without what a reading there would settle."""
    row = points.rows[at]
    unread = _station_there(tables, row["distance_km"])
    code = unread["code"] if unread else code_for(row["distance_km"], tables.get("stations") or [], known_codes)
    return Offer(
        place=row["name"],
        distance_km=row["distance_km"],
        code=code,
        planned=unread is not None and unread.get("state") != "dropped",
        why="",
        settles="",
        gain=0.0,
        apart_km=0.0,
        drive_min=points.drive_min[at],
        parcel_at=points.parcel_at[at],
        allowed=points.allowed[at],
        budget=points.budget[at],
        hazards=row.get("hazards") or "",
    )


def _station_there(tables, distance_km):
    """Return the row of the plan's station at a place, or None."""
    stations = tables.get("stations") or []
    return next((row for row in stations if abs(row["distance_km"] - distance_km) <= SAME_PLACE_KM), None)


def _others(tables, points, left, named, known_codes):
    """Return the places left that are neither offered nor break the day's time: any of them may be chosen instead."""
    return tuple(
        _bare(tables, points, at, known_codes) for at in np.flatnonzero(left) if _name(points.rows[at]) not in named
    )


def _why_none(rows, left, wanted, allowed):
    if not rows:
        return "The plan has no access points yet, so there is nothing to choose from."
    if not left.any():
        return "Every access point below the outfall has a reading."
    if not wanted.any():
        return "Every place that is left was declined."
    return "" if allowed.any() else "No place that is left fits into the day."
