"""Surveys as a person may see them: membership is part of every query."""

from sqlalchemy import func, select

from webapp.errors import NotFound
from webapp.models import History, Reading, SettingsVersion, Survey, SurveyMember


def get_survey(db, survey_id, person_id):
    """Return the survey if the person is on it. Raises NotFound, the same for "no such survey" and "not yours"."""
    query = select(Survey).join(SurveyMember).where(Survey.id == survey_id, SurveyMember.person_id == person_id)
    if (survey := db.scalar(query)) is None:
        raise NotFound("There is no such survey, or you are not on it. Ask the office to put you on it.")
    return survey


def current_settings(db, survey_id):
    """Return the newest SettingsVersion of a survey."""
    query = select(SettingsVersion).where(SettingsVersion.survey_id == survey_id)
    return db.scalar(query.order_by(SettingsVersion.number.desc()).limit(1))


def count_readings(db, survey_id):
    """Return how many readings a survey holds."""
    return db.scalar(select(func.count()).where(Reading.survey_id == survey_id))


def history_of(db, survey_id):
    """Return every change to a survey, oldest first."""
    return db.scalars(select(History).where(History.survey_id == survey_id).order_by(History.at, History.id)).all()
