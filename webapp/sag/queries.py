"""Decisions of a survey. Whoever asks has shown by surveys.queries.get_survey that they are on it."""

from sqlalchemy import select
from sqlalchemy.orm import joinedload

from webapp.models import Decision


def decisions_of(db, survey_id):
    """Return the survey's decisions with who made them, in the order they were made."""
    query = select(Decision).where(Decision.survey_id == survey_id).options(joinedload(Decision.made_by))
    return db.scalars(query.order_by(Decision.made_at, Decision.id)).all()


def find_decision(db, decision_id):
    """Return the decision with this id, of whatever survey, or None."""
    return db.get(Decision, decision_id)
