"""Decisions about readings: layers over a reading that stays, and what a reviewer and the crew say about it."""

from sqlalchemy import select
from sqlalchemy.orm import selectinload

from webapp.errors import Conflict, NotAllowed
from webapp.models import Person, Reading, ReadingEvent
from webapp.readings.layers import ASKED, KEPT, final
from webapp.review import queries
from webapp.review.importing import import_readings
from webapp.surveys.service import remember

__all__ = [
    "answer",
    "ask",
    "correct",
    "held",
    "hold",
    "import_readings",
    "keep",
    "may_answer",
    "may_decide",
    "may_review",
    "restore",
    "set_aside",
]

OWN = "You took this reading yourself, so somebody else must review it. You can still correct it or set it aside."


def may_decide(person, reading):
    """Return whether somebody may decide about a reading: lead and office about any, the crew about their own."""
    return person.may("correct") or reading.author_id == person.id


def may_review(person, reading):
    """Return whether somebody may review a reading: lead and office, but nobody what they took themselves."""
    return person.may("correct") and reading.author_id != person.id


def may_answer(person, reading):
    """Return whether somebody may answer the open question about a reading: all who log, but not who asked."""
    now = final(reading)
    return now.review == ASKED and person.may("log") and now.reviewer_id != person.id


def correct(db, survey_id, reading_id, correction, based_on, person):
    """Store a correction and return the reading. Raises NotFound, NotAllowed, Conflict."""
    reading = _to_decide(db, survey_id, reading_id, person)
    now = final(reading)
    # A drift correction is a line over what stands before it: a reading is corrected below that line.
    old = now.before_drift_mg_l if correction.field == "do_mg_l" else getattr(now, correction.field)
    event = ReadingEvent(
        kind="corrected",
        field=correction.field,
        old_value=old,
        new_value=correction.value,
        reason=correction.reason,
        made_by_id=person.id,
    )
    return _decide(db, reading, event, based_on, "reading corrected")


def set_aside(db, survey_id, reading_id, reason, based_on, person):
    """Keep the reading in the record, but out of use, and return it. Raises NotFound, NotAllowed, Conflict."""
    reading = _to_decide(db, survey_id, reading_id, person)
    return _decide(db, reading, _said("set_aside", reason, person), based_on, "reading set aside")


def restore(db, survey_id, reading_id, reason, based_on, person):
    """Use a reading again that was set aside, and return it. Raises NotFound, NotAllowed, Conflict."""
    reading = _to_decide(db, survey_id, reading_id, person)
    return _decide(db, reading, _said("restored", reason, person), based_on, "reading used again")


def keep(db, survey_id, reading_id, reason, based_on, person):
    """Note that a reviewer looked and lets the reading stand, and return it. Raises NotFound, NotAllowed, Conflict."""
    reading = _to_review(db, survey_id, reading_id, person)
    return _decide(db, reading, _said("kept", reason, person), based_on, "reading kept")


def ask(db, survey_id, reading_id, question, based_on, person):
    """Put a question about the reading to the crew, and return it. Raises NotFound, NotAllowed, Conflict."""
    reading = _to_review(db, survey_id, reading_id, person)
    return _decide(db, reading, _said("asked", question, person), based_on, "crew asked")


def answer(db, survey_id, reading_id, words, based_on, person):
    """Answer the open question about a reading, and return it. Raises NotFound, NotAllowed, Conflict."""
    reading = hold(db, survey_id, reading_id)
    now = final(reading)
    if not person.may("log") or (now.review == ASKED and now.reviewer_id == person.id):
        raise NotAllowed("You asked this question yourself. The crew answers it.")
    return _decide(db, reading, _said("answered", words, person), based_on, "question answered")


def hold(db, survey_id, reading_id):
    """Return a reading that nobody else decides about until the commit. Raises NotFound."""
    # A database that lets several write at once lets only one of them at this reading; SQLite has one writer anyway.
    db.execute(select(Reading.id).where(Reading.id == reading_id).with_for_update())
    return queries.get_reading(db, survey_id, reading_id)


def held(db, survey_id, reading_ids):
    """Return the survey's readings of these ids with their events; nobody else decides about them until the commit."""
    found = []
    for some in queries.in_parts(reading_ids):
        query = select(Reading).where(Reading.survey_id == survey_id, Reading.id.in_(some)).with_for_update()
        found += db.scalars(query.options(selectinload(Reading.events)))
    return found


def _to_decide(db, survey_id, reading_id, person):
    reading = hold(db, survey_id, reading_id)
    if not may_decide(person, reading):
        raise NotAllowed("You can correct or set aside your own readings. For others', ask the lead or the office.")
    return reading


def _to_review(db, survey_id, reading_id, person):
    reading = hold(db, survey_id, reading_id)
    if not may_review(person, reading):
        raise NotAllowed(OWN if reading.author_id == person.id else "Readings are reviewed by the lead or the office.")
    return reading


def _said(kind, reason, person):
    return ReadingEvent(kind=kind, reason=reason, made_by_id=person.id)


def _decide(db, reading, event, based_on, what):
    """Store the event if the reading is as the person saw it; the same decision sent twice is one."""
    events = reading.events
    if events and based_on == len(events) - 1 and _says(events[-1]) == _says(event):
        return reading
    if based_on != len(events):
        raise Conflict("Somebody decided about this reading since you opened it. See what, then decide again.")
    if trouble := _pointless(event.kind, final(reading)):
        raise Conflict(trouble)
    particulars = {"field": event.field, "old": event.old_value, "new": event.new_value} if event.field else {}
    remember(
        db, reading.survey_id, event.made_by_id, what, "reading", reading.id, particulars | {"reason": event.reason}
    )
    event.made_by = db.get(Person, event.made_by_id)
    events.append(event)
    db.commit()
    return reading


def _pointless(kind, now):
    """Return why a decision would change nothing; empty where it does."""
    return {
        "set_aside": now.set_aside and "It is set aside already.",
        "restored": not now.set_aside and "It is in use already.",
        "kept": now.review == KEPT and "A reviewer let it stand already.",
        "asked": now.review == ASKED and "A question about it is open already.",
        "answered": now.review != ASKED and "No question about it is open.",
    }.get(kind) or ""


def _says(event):
    return event.kind, event.field or "", event.new_value, event.reason, event.made_by_id
