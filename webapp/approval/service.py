"""A survey marked as reviewed, approved, and opened again: each is an event that names the dataset it was about."""

import hashlib
from dataclasses import dataclass

from sqlalchemy import select

from webapp.approval import lock, queries
from webapp.approval.standing import Standing, standing_of
from webapp.dataset import service as dataset
from webapp.errors import Conflict, NotAllowed
from webapp.models import FrozenDataset, Survey, SurveyEvent
from webapp.surveys.service import remember

__all__ = ["approve", "mark_reviewed", "prepare", "reopen", "standing_of", "why_not_approve", "why_not_review"]

_CHANGED = "The survey changed since this page was opened. Look at it as it is now, then decide."
_QUESTIONS = "Questions to the crew are open. Wait for their answers, or take the questions back."


@dataclass(frozen=True)
class Prepared:
    """What a step rests on, worked out while others may write: it holds where the survey still has this mark."""

    mark: str
    standing: Standing
    version: str


def prepare(db, survey):
    """Return the Prepared of a survey as it is: all that takes time and needs no place in the writers' line."""
    mark = queries.mark_of(db, survey.id)
    return Prepared(mark, standing_of(db, survey), dataset.dataset_of(db, survey).version)


def mark_reviewed(db, survey, asked, person, prepared=None):
    """Store that somebody looked through the survey as it is now; return the event. Raises Conflict.

    asked.seen is queries.mark_of of the page. The same step sent twice is one.
    """
    if (stored := _stored(db, survey, asked)) is not None:
        return stored
    prepared = _held(db, survey, asked, prepared)
    if why := why_not_review(queries.state_of(db, survey.id), prepared.standing):
        raise Conflict(why)
    event = _event(db, survey, asked, person, "reviewed", lock.REVIEWED, prepared.version)
    db.commit()
    return event


def approve(db, survey, asked, person, prepared=None):
    """Approve the survey as it was reviewed, and keep its dataset for ever; return the event.

    Raises Conflict, or NotAllowed for whoever marked it as reviewed or recorded one of its readings.
    """
    if (stored := _stored(db, survey, asked)) is not None:
        return stored
    prepared = _held(db, survey, asked, prepared)
    state, standing = queries.state_of(db, survey.id), prepared.standing
    if why := _own_work(state, standing, person):
        raise NotAllowed(why)
    if why := why_not_approve(state, standing, person):
        raise Conflict(why)
    event = _event(db, survey, asked, person, "approved", lock.APPROVED, prepared.version)
    # The dataset that is kept tells of its own approval, so that whoever makes it again has the same bytes.
    approved = dataset.dataset_of(db, survey)
    content = dataset.zip_of(approved)
    sha256 = hashlib.sha256(content).hexdigest()
    db.add(FrozenDataset(event_id=event.id, file_name=approved.file_name, sha256=sha256, content=content))
    db.commit()
    return event


def reopen(db, survey, asked, person, prepared=None):
    """Open an approved survey again; what was approved stays as it was delivered. Raises Conflict."""
    if (stored := _stored(db, survey, asked)) is not None:
        return stored
    prepared = _held(db, survey, asked, prepared)
    if queries.state_of(db, survey.id).kind != queries.APPROVED:
        raise Conflict(_CHANGED)
    event = _event(db, survey, asked, person, "reopened", lock.REOPENED, prepared.version)
    db.commit()
    return event


def why_not_review(state, standing):
    """Return why a survey can't be marked as reviewed now; empty where it can."""
    if state.kind == queries.APPROVED:
        return "It is approved already."
    if state.kind == queries.REVIEWED:
        return "It is marked as reviewed already, and nothing has changed since."
    if not standing.readings:
        return "There is no reading yet."
    return _QUESTIONS if standing.asked else ""


def why_not_approve(state, standing, person):
    """Return why a person can't approve a survey now; empty where they can."""
    if state.kind == queries.APPROVED:
        return "It is approved already."
    if state.kind != queries.REVIEWED:
        return "It is approved as it was reviewed: mark it as reviewed first."
    return _own_work(state, standing, person) or (_QUESTIONS if standing.asked else "")


def _own_work(state, standing, person):
    if state.kind == queries.REVIEWED and state.last.made_by_id == person.id:
        return "You marked it as reviewed; somebody else of the office approves it."
    if person.id in standing.authors:
        return "You recorded readings of this survey; somebody of the office who did not approves it."
    return ""


def _stored(db, survey, asked):
    """Return the event of this id, or None. Raises Conflict where it is another survey's."""
    stored = db.get(SurveyEvent, asked.id)
    if stored is not None and stored.survey_id != survey.id:
        raise Conflict("This form is of another survey. Open the page again.")
    return stored


def _held(db, survey, asked, prepared):
    """Keep every other writer of this survey waiting; return what is prepared for it as it is. Raises Conflict.

    Where several processes write at once, the row of the survey is what they wait for: see approval.lock.
    """
    db.execute(select(Survey.id).where(Survey.id == survey.id).with_for_update())
    if asked.seen != queries.mark_of(db, survey.id):
        raise Conflict(_CHANGED)
    return prepared if prepared is not None and prepared.mark == asked.seen else prepare(db, survey)


def _event(db, survey, asked, person, kind, what, version):
    event = SurveyEvent(
        id=asked.id,
        survey_id=survey.id,
        kind=kind,
        version=version[:60],
        reason=asked.reason,
        made_by_id=person.id,
    )
    particulars = {"version": event.version, "reason": event.reason, "changes": queries.count_changes(db, survey.id)}
    remember(db, survey.id, person.id, what, "survey event", event.id, particulars)
    db.add(event)
    db.flush()
    return event
