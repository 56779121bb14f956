"""The bottles of a survey, their hand-overs and results. Whoever asks has shown that they are on the survey."""

from sqlalchemy import func, select
from sqlalchemy.orm import joinedload

from webapp.errors import NotFound
from webapp.models import Bottle, HandOver, History, LabResult

_WITH = (joinedload(Bottle.station), joinedload(Bottle.author))


def bottles_of(db, survey_id):
    """Return the bottles of a survey with station and author, in the order they were filled."""
    query = select(Bottle).where(Bottle.survey_id == survey_id).options(*_WITH)
    return list(db.scalars(query.order_by(Bottle.collected_at, Bottle.code, Bottle.id)))


def hand_overs_of(db, survey_id):
    """Return the hand-overs of a survey with author, in the order they happened."""
    query = select(HandOver).where(HandOver.survey_id == survey_id).options(joinedload(HandOver.author))
    return list(db.scalars(query.order_by(HandOver.at, HandOver.id)))


def results_of(db, survey_id):
    """Return every laboratory result of a survey with author, oldest first: the last of a bottle holds."""
    query = select(LabResult).where(LabResult.survey_id == survey_id).options(joinedload(LabResult.author))
    return list(db.scalars(query.order_by(LabResult.made_at, LabResult.id)))


def find_bottle(db, bottle_id):
    """Return the bottle of that id, of whatever survey, or None."""
    return db.scalar(select(Bottle).where(Bottle.id == bottle_id).options(*_WITH))


def get_bottle(db, survey_id, bottle_id):
    """Return a bottle of the survey. Raises NotFound."""
    bottle = find_bottle(db, bottle_id)
    if bottle is None or bottle.survey_id != survey_id:
        raise NotFound("This survey has no such bottle.")
    return bottle


def find_code(db, survey_id, code):
    """Return the survey's first bottle with this code on its label, however it is written, or None."""
    query = select(Bottle).where(Bottle.survey_id == survey_id, func.lower(Bottle.code) == code.lower())
    return db.scalar(query.options(*_WITH).order_by(Bottle.received_at, Bottle.id).limit(1))


def find_hand_over(db, hand_over_id):
    """Return the hand-over of that id, of whatever survey, or None."""
    return db.get(HandOver, hand_over_id)


def find_result(db, result_id):
    """Return the laboratory result of that id, of whatever survey, or None."""
    return db.get(LabResult, result_id)


def last_by(db, survey_id, person_id):
    """Return the bottle a person recorded last on the survey, or None."""
    query = select(Bottle).where(Bottle.survey_id == survey_id, Bottle.author_id == person_id)
    return db.scalar(query.order_by(Bottle.received_at.desc(), Bottle.id).limit(1))


def kept_of(db, survey_id, bottle_id):
    """Return what the crew was asked about a bottle when it was stored, and answered with "keep it"."""
    query = select(History.particulars).where(History.survey_id == survey_id, History.entity_id == bottle_id)
    told = db.scalar(query.where(History.what == "bottle filled").limit(1)) or {}
    return [text for text in told.get("kept", []) if isinstance(text, str)]
