"""The visits of a survey with their entries. Whoever asks has shown that they are on the survey."""

from sqlalchemy import select
from sqlalchemy.orm import joinedload, selectinload

from webapp.errors import NotFound
from webapp.models import Visit, VisitEntry

_WITH = (
    joinedload(Visit.station),
    joinedload(Visit.opened_by),
    selectinload(Visit.entries).joinedload(VisitEntry.author),
)


def visits_of(db, survey_id):
    """Return the visits of a survey, in no particular order: when they began stands in their entries."""
    return list(db.scalars(select(Visit).where(Visit.survey_id == survey_id).options(*_WITH)))


def get_visit(db, survey_id, visit_id):
    """Return a visit of the survey. Raises NotFound."""
    visit = db.scalar(select(Visit).where(Visit.survey_id == survey_id, Visit.id == visit_id).options(*_WITH))
    if visit is None:
        raise NotFound("This survey has no such visit.")
    return visit


def find_visit(db, visit_id):
    """Return the visit of that id, of whatever survey, or None."""
    return db.get(Visit, visit_id)


def find_entry(db, entry_id):
    """Return the entry of that id, of whatever survey, or None."""
    return db.get(VisitEntry, entry_id)
