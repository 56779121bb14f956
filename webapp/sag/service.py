"""What the sag page tells: the lowest reading against the prediction, and every station with both."""

from dataclasses import dataclass

from webapp.plan.prediction import prediction_of
from webapp.readings.day import Day
from webapp.readings.layers import final


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
    day = Day(db, survey)
    prediction = prediction_of(survey, day.plan)
    rows = sorted(day.plan.tables.get("stations") or [], key=lambda row: row["distance_km"]) if day.plan else []
    used = _used_by_code(day.readings)
    lines = tuple(_line(row, prediction, day, used.get(row["code"], [])) for row in rows)
    shown = tuple(line for line in lines if line.count or not line.dropped)
    return Sag(day.plan, prediction, day.placed(), shown, _lowest(survey, day, used, lines))


def _used_by_code(readings):
    """Return the readings that count and have oxygen, by station, in the order they were taken."""
    used = {}
    for reading in readings:
        now = final(reading)
        if not now.set_aside and now.do_mg_l is not None:
            used.setdefault(now.station_code, []).append((now.do_mg_l, reading))
    return used


def _line(row, prediction, day, used):
    return StationLine(
        code=row["code"],
        distance_km=row["distance_km"],
        access=row.get("access") or "",
        dropped=row.get("state") == "dropped",
        expected=prediction.at(row["distance_km"]) if prediction.ready else None,
        check=day.check(used[-1][1]) if used else None,
        count=len(used),
    )


def _lowest(survey, day, used, lines):
    """Return the Lowest below the outfall, or None where nothing was read there yet."""
    read = [line for line in lines if line.count and line.distance_km >= 0]
    if not read:
        return None
    line = min(read, key=lambda one: min(do for do, _ in used[one.code]))
    do, reading = min(used[line.code], key=lambda pair: pair[0])
    ends = {read[0].code: "first", read[-1].code: "last"} if len(read) > 1 else {line.code: "only"}
    criterion = survey.do_criterion_mg_l
    below = None if criterion is None else do < criterion
    return Lowest(day.check(reading), line.distance_km, ends.get(line.code, ""), below)
