"""What the sag page tells: the answer, today's sag beside the plan's, where next, and every station."""

import hashlib
from dataclasses import dataclass, replace

from webapp.fieldsheet.snapshot import window_of
from webapp.meters.closing import closing_of
from webapp.plan.prediction import prediction_of
from webapp.plan.queries import current_plan, stations_of
from webapp.readings.asking import thresholds
from webapp.readings.check import on_site_check
from webapp.readings.kept import readings_kept
from webapp.readings.layers import final, placed
from webapp.readings.queries import readings_of
from webapp.sag.budget import time_budget
from webapp.sag.decisions import STATION, declined_places
from webapp.sag.estimate import estimate_of
from webapp.sag.evidence import counted
from webapp.sag.leave import may_we_leave
from webapp.sag.queries import decisions_of
from webapp.sag.screen import screen_of
from webapp.sag.where_next import where_next
from webapp.surveys.queries import current_settings
from webapp.visits.line import SheetVisits, visits_on_sheet
from webapp.visits.queries import visits_of


@dataclass(frozen=True)
class StationLine:
    """One station: the plan and today's sag there, its latest reading that counts with its check; None where there is
    none. crew is whom it is for, count how many readings count.
    """

    code: str
    distance_km: float
    access: str
    state: str
    crew: str
    expected: object
    today: object
    check: object
    count: int


@dataclass(frozen=True)
class Sag:
    """All of the sag page. placed are the readings a chart draws; leave, where and budget are None without an estimate.

    below_criterion tells of the lowest reading; decisions are those made on site; mark changes with whatever a decision
    rests on, and screen is what a decision keeps of the page. window is the run of a snapshot survey, visits what the
    crews noticed at the water.
    """

    plan: object
    prediction: object
    today: object
    placed: list
    lines: tuple[StationLine, ...]
    lowest: object
    leave: object
    where: object
    budget: object
    decisions: list
    mark: str
    screen: dict
    window: object
    visits: SheetVisits

    @property
    def chosen(self):
        """Return the latest decision for each station that was chosen and is not read yet, by its code."""
        unread = {line.code for line in self.lines if not line.count}
        return {one.chosen: one for one in self.decisions if one.kind == STATION and one.chosen in unread}

    @property
    def to_assign(self):
        """Return the lines of stations added on site that nobody is sent to yet."""
        return [line for line in self.lines if line.state == "added" and not line.count and not line.crew]


def sag_of(db, survey, show, now):
    """Return the Sag of a survey as it stands at an instant."""
    plan = current_plan(db, survey.id)
    settings = thresholds(current_settings(db, survey.id))
    readings = readings_of(db, survey.id)
    finals = [final(reading) for reading in readings]
    prediction, today = prediction_of(survey, plan), estimate_of(survey, plan, settings, finals)
    decisions = decisions_of(db, survey.id)
    leave = where = budget = None
    if today.ready:
        leave = may_we_leave(show, plan, today, finals, _meters(db, survey, show, settings, readings, prediction, now))
        budget = time_budget(survey, plan, now)
        known = stations_of(db, survey.id)
        where = where_next(
            show, survey, plan, today, finals, budget, now, declined_places(decisions), known_codes=known
        )

    def check(reading):
        return on_site_check(survey, plan, settings, reading, finals)

    used = _used_by_code(readings, finals)
    lines = _lines(plan, prediction, today, check, used)
    return Sag(
        plan=plan,
        prediction=prediction,
        today=today,
        placed=placed(finals, plan.tables["stations"] if plan else []),
        lines=tuple(line for line in lines if line.count or line.state != "dropped"),
        lowest=_lowest(survey, lines, used),
        leave=leave,
        where=where,
        budget=budget,
        decisions=decisions,
        mark=mark_of(plan, counted(finals, plan) if plan else ()),
        screen=screen_of(plan, today, leave, where, budget, now),
        window=window_of(survey, plan, settings, finals),
        visits=visits_on_sheet(show, visits_of(db, survey.id), settings, now),
    )


def _meters(db, survey, show, settings, readings, prediction, now):
    """Return what the meters still need, given the lowest oxygen that the plan expects."""
    lowest = prediction.critical.do_mg_l if prediction.ready else None
    return closing_of(db, survey, show, settings, readings, lowest, now)


def current_mark(db, survey):
    """Return the mark of a survey's sag page as it stands, without making the page."""
    plan = current_plan(db, survey.id)
    return mark_of(plan, counted(readings_kept(db, survey.id)[1], plan) if plan else ())


def marked_now(db, survey, sag):
    """Return the Sag with the mark of now: asked for by whoever writes, it tells what changed since it was made."""
    return replace(sag, mark=current_mark(db, survey))


def mark_of(plan, counts):
    """Return a short text that changes when the plan or what counts among the readings does."""
    rests_on = (plan.number if plan else 0, counts)
    return hashlib.sha256(repr(rests_on).encode()).hexdigest()[:16]


def _used_by_code(readings, finals):
    """Return (oxygen, reading) of those that count, by station, in the order they were taken."""
    used = {}
    for reading, now in zip(readings, finals, strict=True):
        if not now.set_aside and now.do_mg_l is not None:
            used.setdefault(now.station_code, []).append((now.do_mg_l, reading))
    return used


def _lines(plan, prediction, today, check, used):
    rows = sorted(plan.tables.get("stations") or [] if plan else [], key=lambda row: row["distance_km"])
    places = [row["distance_km"] for row in rows]
    expected = prediction.along(places) if prediction.ready else [None] * len(rows)
    return [
        StationLine(
            code=row["code"],
            distance_km=row["distance_km"],
            access=row.get("access") or "",
            state=row.get("state") or "planned",
            crew=row.get("crew") or "",
            expected=planned,
            today=today.at(row["distance_km"]) if today.ready and today.enough else None,
            check=check(used[row["code"]][-1][1]) if row["code"] in used else None,
            count=len(used.get(row["code"], [])),
        )
        for row, planned in zip(rows, expected, strict=True)
    ]


@dataclass(frozen=True)
class Lowest:
    """The lowest reading that counts below the outfall; below_criterion is None without a criterion."""

    code: str
    distance_km: float
    do_mg_l: float
    reading: object
    below_criterion: bool | None


def _lowest(survey, lines, used):
    read = [line for line in lines if line.count and line.distance_km >= 0]
    if not read:
        return None
    line = min(read, key=lambda one: min(do for do, _ in used[one.code]))
    do, reading = min(used[line.code], key=lambda pair: pair[0])
    criterion = survey.do_criterion_mg_l
    return Lowest(line.code, line.distance_km, do, final(reading), None if criterion is None else do < criterion)
