"""Decisions about readings: corrections, setting aside and using again. Each is a layer over a reading that stays."""

from sqlalchemy import select

from webapp.errors import Conflict, NotAllowed
from webapp.models import Reading, ReadingEvent
from webapp.readings.layers import final
from webapp.review import queries
from webapp.review.importing import import_readings
from webapp.surveys.service import remember

__all__ = ["correct", "import_readings", "may_decide", "restore", "set_aside"]


def may_decide(person, reading):
    """Return whether somebody may decide about a reading: lead and office about any, the crew about their own."""
    return person.may("correct") or reading.author_id == person.id


def correct(db, survey_id, reading_id, correction, based_on, person):
    """Store a correction and return the reading. Raises NotFound, NotAllowed, Conflict."""
    reading = _held(db, survey_id, reading_id, person)
    old = getattr(final(reading), correction.field)
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
    reading = _held(db, survey_id, reading_id, person)
    event = ReadingEvent(kind="set_aside", reason=reason, made_by_id=person.id)
    return _decide(db, reading, event, based_on, "reading set aside")


def restore(db, survey_id, reading_id, reason, based_on, person):
    """Use a reading again that was set aside, and return it. Raises NotFound, NotAllowed, Conflict."""
    reading = _held(db, survey_id, reading_id, person)
    event = ReadingEvent(kind="restored", reason=reason, made_by_id=person.id)
    return _decide(db, reading, event, based_on, "reading used again")


def _held(db, survey_id, reading_id, person):
    # A database that lets several write at once lets only one of them at this reading; SQLite has one writer anyway.
    db.execute(select(Reading.id).where(Reading.id == reading_id).with_for_update())
    reading = queries.get_reading(db, survey_id, reading_id)
    if not may_decide(person, reading):
        raise NotAllowed("You can correct or set aside your own readings. For others', ask the lead or the office.")
    return reading


def _decide(db, reading, event, based_on, what):
    """Store the event if the reading is as the person saw it; the same decision sent twice is one."""
    events = reading.events
    if events and based_on == len(events) - 1 and _says(events[-1]) == _says(event):
        return reading
    if based_on != len(events):
        raise Conflict("Somebody decided about this reading since you opened it. See what, then decide again.")
    if event.kind != "corrected" and (event.kind == "set_aside") == final(reading).set_aside:
        raise Conflict("It is set aside already." if event.kind == "set_aside" else "It is in use already.")
    events.append(event)
    particulars = {"field": event.field, "old": event.old_value, "new": event.new_value} if event.field else {}
    remember(
        db, reading.survey_id, event.made_by_id, what, "reading", reading.id, particulars | {"reason": event.reason}
    )
    db.commit()
    return reading


def _says(event):
    return event.kind, event.field or "", event.new_value, event.reason, event.made_by_id
