"""Readings as the table's filters ask, a page at a time. Whoever asks has shown that they are on the survey."""

from datetime import timedelta

from sqlalchemy import String, cast, exists, func, select
from sqlalchemy.orm import joinedload, selectinload

from webapp.models import Person, Reading, ReadingEvent, Station
from webapp.readings.queries import get_reading

__all__ = ["authors_of", "count_matching", "get_reading", "page_of", "stored_ids"]

_MINUTE = timedelta(minutes=1)


def count_matching(db, survey_id, filters):
    """Return how many readings the filters let through."""
    return db.scalar(_matching(select(func.count()).select_from(Reading), survey_id, filters))


def page_of(db, survey_id, filters, size):
    """Return one page of the readings that the filters let through, the newest first."""
    query = _matching(select(Reading), survey_id, filters)
    query = query.order_by(Reading.taken_at.desc(), Reading.received_at.desc(), Reading.id.desc())
    query = query.limit(size).offset((filters.page - 1) * size)
    loading = (joinedload(Reading.station), joinedload(Reading.author), selectinload(Reading.events))
    return db.scalars(query.options(*loading)).all()


def authors_of(db, survey_id):
    """Return (id, name) of everybody who recorded a reading here, by name."""
    query = select(Person.id, Person.name).where(
        exists().where(Reading.author_id == Person.id, Reading.survey_id == survey_id)
    )
    return [tuple(row) for row in db.execute(query.order_by(func.lower(Person.name), Person.id))]


def stored_ids(db, survey_id, reading_ids):
    """Return those of the ids that the survey holds."""
    found = set()
    ids = list(reading_ids)
    for start in range(0, len(ids), 500):
        query = select(Reading.id).where(Reading.survey_id == survey_id, Reading.id.in_(ids[start : start + 500]))
        found |= set(db.scalars(query))
    return found


def _matching(query, survey_id, filters):
    query = query.where(Reading.survey_id == survey_id)
    if filters.station:
        query = query.join(Station, Reading.station_id == Station.id).where(Station.code == filters.station)
    if filters.author:
        query = query.where(Reading.author_id == filters.author)
    if filters.since:
        query = query.where(Reading.taken_at >= filters.since)
    if filters.until:
        query = query.where(Reading.taken_at < filters.until + _MINUTE)
    return query.where(*_STATES[filters.state]())


def _last_decision():
    decided = select(ReadingEvent.kind).where(
        ReadingEvent.reading_id == Reading.id, ReadingEvent.kind.in_(("set_aside", "restored"))
    )
    decided = decided.order_by(ReadingEvent.made_at.desc(), ReadingEvent.id.desc()).limit(1)
    return func.coalesce(decided.correlate(Reading).scalar_subquery(), "restored")


_STATES = {
    "all": lambda: (),
    "used": lambda: (_last_decision() == "restored",),
    "set_aside": lambda: (_last_decision() == "set_aside",),
    "corrected": lambda: (
        exists().where(ReadingEvent.reading_id == Reading.id, ReadingEvent.kind == "corrected").correlate(Reading),
    ),
    "findings": lambda: (cast(Reading.kept_findings, String) != "[]",),
}
