"""Readings that are reviewed or imported. Whoever asks has shown that they are on the survey."""

from sqlalchemy import select

from webapp.models import Reading
from webapp.readings.queries import get_reading

__all__ = ["get_reading", "in_parts", "stored_ids"]

_AT_ONCE = 500


def stored_ids(db, survey_id, reading_ids):
    """Return those of the ids that the survey holds."""
    found = set()
    for some in in_parts(reading_ids):
        found |= set(db.scalars(select(Reading.id).where(Reading.survey_id == survey_id, Reading.id.in_(some))))
    return found


def in_parts(reading_ids):
    """Return the ids in lists that are short enough for one query."""
    ids = list(reading_ids)
    return [ids[start : start + _AT_ONCE] for start in range(0, len(ids), _AT_ONCE)]
