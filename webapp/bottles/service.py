"""Storing bottles, hand-overs and laboratory results, each once. None is ever changed: a newer result follows."""

from dataclasses import asdict

from sqlalchemy import select
from sqlalchemy.exc import IntegrityError

from webapp.bottles import asking, queries
from webapp.bottles.judged import judged_bottles
from webapp.errors import Conflict
from webapp.models import Bottle, HandOver, LabResult, Survey
from webapp.readings.queries import get_station, readings_of
from webapp.readings.settling import thresholds
from webapp.surveys.queries import current_settings
from webapp.surveys.service import remember

# What a repeat must share with the stored row; what is converted on the way is compared as it was typed.
_OF_BOTTLE = ("code", "analysis", "kind", "replicate_of", "collected_at", "position", "preservative", "full",
              "filtered", "on_ice_at", "note", "entered")  # fmt: skip
_OF_HAND_OVER = ("gave", "took", "at", "place", "seal", "note")
_OF_RESULT = ("bottle_id", "laboratory", "lab_number", "method", "arrived_at", "started_at", "finished_at", "censor",
              "analyst", "note", "entered")  # fmt: skip


class CodeTaken(Conflict):
    """Another bottle of the survey has this code on its label."""


def asks_of(db, survey, new, now, saved_at):
    """Return the findings to ask about before a bottle is stored."""
    settings = thresholds(current_settings(db, survey.id))
    readings, bottles = readings_of(db, survey.id), queries.bottles_of(db, survey.id)
    return asking.asks(settings, new, readings, bottles, now, saved_at)


def code_taken(db, survey, new):
    """Return what to do where another bottle of the survey has the code; empty where none has."""
    taken = queries.find_code(db, survey.id, new.code)
    if taken is None or taken.id == new.id:
        return ""
    return (
        f"Bottle {taken.code} is here already, filled at {taken.station.code}. Each label is for one bottle: check it, "
        "or take another."
    )


def add_bottle(db, survey, new, by_id, received_at):
    """Store the bottle once, however often it is sent, and return the stored one.

    Raises NotFound for a station the survey never had, CodeTaken, Conflict where the id is that of another bottle.
    """
    bottle = put_bottle(db, survey, new, by_id, received_at)
    try:
        db.commit()
    except IntegrityError:  # two processes took the same bottle at once
        db.rollback()
        bottle = _the_same(queries.find_bottle(db, new.id), survey, new, _OF_BOTTLE, "bottle")
    return bottle


def put_bottle(db, survey, new, by_id, received_at):
    """Do what add_bottle does, without the commit: for a caller that stores many or none."""
    if (stored := queries.find_bottle(db, new.id)) is not None:
        if stored.station.code != new.station_code:
            raise Conflict("This form's bottle is stored already, at another station. Open the form again.")
        return _the_same(stored, survey, new, _OF_BOTTLE, "bottle")
    station = get_station(db, survey.id, new.station_code)
    # A database that lets several write at once lets only one of them at the codes of a survey.
    db.execute(select(Survey.id).where(Survey.id == survey.id).with_for_update())
    if why := code_taken(db, survey, new):
        raise CodeTaken(why)
    values = asdict(new)
    del values["station_code"], values["kept"]
    told = {"code": new.code, "station": station.code, "analysis": new.analysis, "kept": list(new.kept)}
    remember(db, survey.id, by_id, "bottle filled", "bottle", new.id, told)
    bottle = Bottle(survey_id=survey.id, station_id=station.id, author_id=by_id, received_at=received_at, **values)
    bottle.station = station
    db.add(bottle)
    return bottle


def add_hand_over(db, survey, new, by_id):
    """Store a hand-over once, and return the stored one. Raises Conflict where the id is that of another."""
    if (stored := queries.find_hand_over(db, new.id)) is not None:
        return _the_same(stored, survey, new, _OF_HAND_OVER, "hand-over")
    told = {"bottles": len(new.bottles), "gave": new.gave, "took": new.took}
    remember(db, survey.id, by_id, "bottles handed over", "hand_over", new.id, told)
    hand_over = HandOver(survey_id=survey.id, author_id=by_id, **asdict(new) | {"bottles": list(new.bottles)})
    db.add(hand_over)
    db.commit()
    return hand_over


def add_result(db, survey, new, by_id):
    """Store a laboratory result once, and return the stored one; earlier ones of the bottle stay. Raises Conflict."""
    result = put_result(db, survey, new, by_id)
    db.commit()
    return result


def put_result(db, survey, new, by_id):
    """Do what add_result does, without the commit: for a caller that stores many or none."""
    if (stored := queries.find_result(db, new.id)) is not None:
        return _the_same(stored, survey, new, _OF_RESULT, "result")
    bottle = queries.get_bottle(db, survey.id, new.bottle_id)
    remember(db, survey.id, by_id, "laboratory result saved", "lab_result", new.id, {"bottle": bottle.code})
    result = LabResult(survey_id=survey.id, author_id=by_id, **asdict(new))
    db.add(result)
    return result


def judged_of(db, survey, now):
    """Return a JudgedBottle for every bottle of a survey, by today's settings; clocks run until now."""
    bottles, results = queries.bottles_of(db, survey.id), queries.results_of(db, survey.id)
    return judged_bottles(bottles, results, thresholds(current_settings(db, survey.id)), now)


def _the_same(stored, survey, new, content, what):
    """Return the stored row if the new one repeats it. Raises Conflict."""
    if stored.survey_id != survey.id:
        raise Conflict(f"Another survey holds a {what} with this form's id. Open the form again.")
    if any(getattr(stored, name) != getattr(new, name) for name in content):
        raise Conflict(
            f"This form's {what} is stored already, with other values. It was not changed. To record another, open "
            "the form again."
        )
    return stored
