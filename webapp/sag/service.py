"""What the sag page tells: the lowest reading against the prediction, and every station with both."""

from dataclasses import dataclass

from webapp.plan.prediction import prediction_of
from webapp.plan.queries import current_plan
from webapp.readings.asking import thresholds
from webapp.readings.check import on_site_check
from webapp.readings.layers import final, placed
from webapp.readings.queries import readings_of
from webapp.surveys.queries import current_settings


@dataclass(frozen=True)
class StationLine:
    """One station: the plan there, its latest reading that counts, and its on-site check; None where there is none."""

    code: str
    distance_km: float
    access: str
    dropped: bool
    expected: object
    check: object
    count: int


@dataclass(frozen=True)
class Lowest:
    """The lowest reading that counts, with its check.

    end is "first" or "last" where no station was read above or below it, below the outfall; "only" where it is alone.
    """

    check: object
    distance_km: float
    end: str
    below_criterion: bool | None


@dataclass(frozen=True)
class Sag:
    """All of the sag page. placed are the readings a chart draws; lowest is None before the first below the outfall."""

    plan: object
    prediction: object
    placed: list
    lines: tuple[StationLine, ...]
    lowest: Lowest | None


def sag_of(db, survey):
    """Return the Sag of a survey as it stands."""
    plan = current_plan(db, survey.id)
    settings = thresholds(current_settings(db, survey.id))
    readings = readings_of(db, survey.id)
    finals = [final(reading) for reading in readings]
    prediction = prediction_of(survey, plan)

    def check(reading):
        return on_site_check(survey, plan, settings, reading, finals)

    stations = plan.tables.get("stations") or [] if plan else []
    used = _used_by_code(readings, finals)
    lines = tuple(
        _line(row, prediction, check, used.get(row["code"], []))
        for row in sorted(stations, key=lambda row: row["distance_km"])
    )
    shown = tuple(line for line in lines if line.count or not line.dropped)
    return Sag(plan, prediction, placed(finals, stations), shown, _lowest(survey, check, used, lines))


def _used_by_code(readings, finals):
    """Return (oxygen, reading) of those that count, by station, in the order they were taken."""
    used = {}
    for reading, now in zip(readings, finals, strict=True):
        if not now.set_aside and now.do_mg_l is not None:
            used.setdefault(now.station_code, []).append((now.do_mg_l, reading))
    return used


def _line(row, prediction, check, used):
    return StationLine(
        code=row["code"],
        distance_km=row["distance_km"],
        access=row.get("access") or "",
        dropped=row.get("state") == "dropped",
        expected=prediction.at(row["distance_km"]) if prediction.ready else None,
        check=check(used[-1][1]) if used else None,
        count=len(used),
    )


def _lowest(survey, check, used, lines):
    """Return the Lowest below the outfall, or None where nothing was read there yet."""
    read = [line for line in lines if line.count and line.distance_km >= 0]
    if not read:
        return None
    line = min(read, key=lambda one: min(do for do, _ in used[one.code]))
    do, reading = min(used[line.code], key=lambda pair: pair[0])
    ends = {read[0].code: "first", read[-1].code: "last"} if len(read) > 1 else {line.code: "only"}
    criterion = survey.do_criterion_mg_l
    below = None if criterion is None else do < criterion
    return Lowest(check(reading), line.distance_km, ends.get(line.code, ""), below)
