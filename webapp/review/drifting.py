"""Applying and undoing drift corrections: one layer over each reading, and one line of history for them all."""

from sqlalchemy import select

from webapp.errors import Conflict, NotAllowed
from webapp.models import Reading, ReadingEvent
from webapp.readings.judging import judgement_of
from webapp.readings.settling import thresholds
from webapp.review.drift import drift_pairs, particulars_of
from webapp.review.service import held
from webapp.surveys.queries import current_settings
from webapp.surveys.service import remember

CHANGED = "The readings or the checks changed since you opened this page. Look at the numbers again, then decide."
OWN = "You took these readings yourself, so somebody else must correct them for drift."


def offers_of(db, survey):
    """Return (DriftPairs, Applied that no pair asks for) of a survey, by today's checks and settings."""
    judgement = judgement_of(db, survey)
    return drift_pairs(judgement.by_id.values(), judgement.checks, thresholds(current_settings(db, survey.id)))


def count_open(db, survey):
    """Return how many corrections wait for somebody: offered, not complete, not reportable, or no longer right."""
    pairs, gone = offers_of(db, survey)
    return sum(pair.state != "applied" for pair in pairs) + len(gone)


def apply_drift(db, survey, choice, person):
    """Correct the readings between two checks as the page showed it; return how many are. The same form is one.

    Raises
    ------
    Conflict
        If the correction is not the one that was shown, or is applied already.
    NotAllowed
        If somebody may not review, or took all these readings themselves.
    """
    _may(person)
    pairs, _ = offers_of(db, survey)
    pair = next((one for one in pairs if one.check_ids == (choice.start_id, choice.end_id)), None)
    if pair is None:
        raise Conflict("These two checks do not ask for a correction any more.")
    if done := sum(_of_batch(line.applied, choice.batch) for line in pair.lines):
        return done
    if pair.seen != choice.seen:
        raise Conflict(CHANGED)
    if not pair.open_lines or pair.correction is None:
        raise Conflict("There is nothing left to correct between these two checks.")
    lines = {line.reading.id: line for line in pair.open_lines}
    readings = [one for one in held(db, survey.id, lines) if one.author_id != person.id]
    if not readings:
        raise NotAllowed(OWN)
    told = particulars_of(pair, lines[readings[0].id], choice.batch) | {"meter": pair.meter}
    del told["scale"], told["shift"]
    _remember(db, survey, person, "drift corrected", readings, told, choice)
    for reading in readings:
        particulars = particulars_of(pair, lines[reading.id], choice.batch)
        db.add(_event(reading.id, "drift", choice.reason, particulars, person))
    db.commit()
    return len(readings)


def undo_drift(db, survey, choice, person):
    """Take back the correction that rests on two checks; return how many readings it is taken back from.

    Raises
    ------
    Conflict
        If nothing of it is applied any more.
    NotAllowed
        If somebody may not review, or took all these readings themselves.
    """
    _may(person)
    checks = {"start_check": choice.start_id, "end_check": choice.end_id}
    applied = [
        one.reading.id
        for one in judgement_of(db, survey).by_id.values()
        if one.reading.drift and checks.items() <= one.reading.drift.particulars.items()
    ]
    if not applied:
        if done := _undone(db, survey.id, choice.batch):
            return done
        raise Conflict("This correction is not applied any more.")
    readings = [one for one in held(db, survey.id, applied) if one.author_id != person.id]
    if not readings:
        raise NotAllowed(OWN)
    particulars = {**checks, "batch": choice.batch}
    _remember(db, survey, person, "drift correction undone", readings, particulars, choice)
    db.add_all([_event(one.id, "drift_undone", choice.reason, particulars, person) for one in readings])
    db.commit()
    return len(readings)


def _may(person):
    if not person.may("correct"):
        raise NotAllowed("Readings are corrected for drift by the lead or the office.")


def _of_batch(event, batch):
    return event is not None and event.particulars.get("batch") == batch


def _undone(db, survey_id, batch):
    query = (
        select(ReadingEvent).join(Reading).where(Reading.survey_id == survey_id, ReadingEvent.kind == "drift_undone")
    )
    return sum(_of_batch(event, batch) for event in db.scalars(query))


def _event(reading_id, kind, reason, particulars, person):
    return ReadingEvent(reading_id=reading_id, kind=kind, reason=reason, particulars=particulars, made_by_id=person.id)


def _remember(db, survey, person, what, readings, particulars, choice):
    told = particulars | {"readings": len(readings), "reason": choice.reason}
    remember(db, survey.id, person.id, what, "meter_check", choice.end_id, told)
