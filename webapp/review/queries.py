"""Readings that are decided about. Whoever asks has shown that they are on the survey."""

from sqlalchemy import select
from sqlalchemy.orm import selectinload

from webapp.models import Reading
from webapp.readings.queries import get_reading

__all__ = ["get_reading", "held", "stored_ids"]

_AT_ONCE = 500


def held(db, survey_id, reading_ids):
    """Return the survey's readings of these ids with their events; in a session that writes, nobody else decides."""
    found = []
    for some in _parts(reading_ids):
        query = select(Reading).where(Reading.survey_id == survey_id, Reading.id.in_(some)).with_for_update()
        found += db.scalars(query.options(selectinload(Reading.events)))
    return found


def stored_ids(db, survey_id, reading_ids):
    """Return those of the ids that the survey holds."""
    found = set()
    for some in _parts(reading_ids):
        found |= set(db.scalars(select(Reading.id).where(Reading.survey_id == survey_id, Reading.id.in_(some))))
    return found


def _parts(reading_ids):
    ids = list(reading_ids)
    return [ids[start : start + _AT_ONCE] for start in range(0, len(ids), _AT_ONCE)]
