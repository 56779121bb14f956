"""People, and who is on which survey."""

from sqlalchemy import func, select

from webapp.errors import NotFound
from webapp.models import Person, PhoneSession, Survey, SurveyMember


def find_person(db, person_id):
    """Return the person or None."""
    return None if "\x00" in person_id else db.get(Person, person_id)  # PostgreSQL takes no NUL


def get_person(db, person_id):
    """Return the person. Raises NotFound."""
    if (person := find_person(db, person_id)) is None:
        raise NotFound("There is no such person.")
    return person


def find_by_sign_in(db, sign_in):
    """Return the person with this sign-in name, however it is capitalised, or None."""
    return db.scalar(select(Person).where(Person.sign_in == sign_in.replace("\x00", "").strip().lower()))


def people(db):
    """Return everybody, active first, by name."""
    return db.scalars(select(Person).order_by(Person.active.desc(), func.lower(Person.name))).all()


def active_offices(db):
    """Return how many active office accounts there are."""
    return db.scalar(select(func.count()).where(Person.role == "office", Person.active))


def surveys_of(db, person_id, only=None):
    """Return the surveys a person is on, newest first; only the one an invited phone is for, where its id is given."""
    query = select(Survey).join(SurveyMember).where(SurveyMember.person_id == person_id)
    if only is not None:
        query = query.where(Survey.id == only)
    return db.scalars(query.order_by(Survey.created_at.desc(), Survey.name)).all()


def members_of(db, survey_id):
    """Return the people on a survey, by name."""
    query = select(Person).join(SurveyMember).where(SurveyMember.survey_id == survey_id)
    return db.scalars(query.order_by(func.lower(Person.name))).all()


def find_survey_of_phone(db, phone_id, person_id, now):
    """Return the id of the survey that a phone signed in by invitation is for, None where it no longer is signed in.

    It ends with its time, when somebody ends it, and when its person is taken off the survey.
    """
    on_survey = (SurveyMember.survey_id == PhoneSession.survey_id) & (SurveyMember.person_id == PhoneSession.person_id)
    query = select(PhoneSession.survey_id).join(SurveyMember, on_survey)
    query = query.where(PhoneSession.id == phone_id, PhoneSession.person_id == person_id)
    return db.scalar(query.where(PhoneSession.ended_at.is_(None), PhoneSession.until > now))
