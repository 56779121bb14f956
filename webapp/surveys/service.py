"""Making and changing surveys, and who is on them."""

from dataclasses import asdict

from calc.settings import Settings
from webapp.approval.lock import refuse_if_approved
from webapp.errors import Conflict, NotFound
from webapp.models import History, SettingsVersion, Survey, SurveyMember, new_id
from webapp.people.queries import get_person
from webapp.surveys import queries


def create_survey(db, facts, by_id, survey_id=None):
    """Store a survey with the default settings and its maker on it. Return it; the stored one for a double tap."""
    if survey_id and (stored := db.get(Survey, survey_id)) is not None:
        if stored.created_by_id != by_id:
            raise Conflict("A survey with this id is there already. Open the form again.")
        return stored
    survey = Survey(id=survey_id or new_id(), created_by_id=by_id, **asdict(facts))
    db.add(survey)
    db.flush()
    db.add(SurveyMember(survey_id=survey.id, person_id=by_id))
    db.add(
        SettingsVersion(
            survey_id=survey.id,
            number=1,
            thresholds=Settings().as_dict(),
            reason="the trade's defaults",
            made_by_id=by_id,
        )
    )
    remember(db, survey.id, by_id, "survey made")
    db.commit()
    return survey


def change_survey(db, survey_id, facts, by_id):
    """Store changed facts; what they were stays in the history."""
    survey = queries.get_survey(db, survey_id, by_id)
    changes = {}
    for name, value in asdict(facts).items():
        if (old := getattr(survey, name)) != value:
            changes[name] = [_plain(old), _plain(value)]
            setattr(survey, name, value)
    if changes:
        remember(db, survey.id, by_id, "survey changed", particulars=changes)
    db.commit()
    return survey


def add_member(db, survey_id, person_id, by_id):
    """Put an active person on the survey."""
    queries.get_survey(db, survey_id, by_id)
    person = get_person(db, person_id)
    if not person.active:
        raise Conflict(f"{person.name}'s account is closed. Open it first.")
    if db.get(SurveyMember, (survey_id, person_id)) is None:
        db.add(SurveyMember(survey_id=survey_id, person_id=person_id))
        remember(db, survey_id, by_id, "person added", "person", person_id)
    db.commit()


def remove_member(db, survey_id, person_id, by_id):
    """Take a person off the survey; what they recorded stays. Raises Conflict for oneself."""
    queries.get_survey(db, survey_id, by_id)
    if person_id == by_id:
        raise Conflict("You can't take yourself off a survey; somebody else of the office can.")
    if (member := db.get(SurveyMember, (survey_id, person_id))) is None:
        raise NotFound("This person is not on the survey.")
    db.delete(member)
    remember(db, survey_id, by_id, "person removed", "person", person_id)
    db.commit()


def remember(db, survey_id, by_id, what, entity="survey", entity_id=None, particulars=None):
    """Add a line to the survey's history; the caller commits. Raises Conflict where the survey is approved.

    Whatever changes a survey comes here before its commit, and best before it adds its rows: see approval.lock.
    """
    refuse_if_approved(db, survey_id, what)
    db.add(
        History(
            survey_id=survey_id,
            person_id=by_id,
            what=what,
            entity=entity,
            entity_id=entity_id or survey_id,
            particulars=particulars or {},
        )
    )


def _plain(value):
    return value.isoformat() if hasattr(value, "isoformat") else value
