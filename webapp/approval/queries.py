"""What was reviewed, approved and opened again, and the state that follows. Whoever asks is on the survey."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import func, select
from sqlalchemy.orm import joinedload

from webapp.approval.lock import IMPORTED, OWN, PEOPLE
from webapp.approval.lock import REVIEWED as MARKED
from webapp.errors import NotFound
from webapp.models import FrozenDataset, History, SurveyEvent

DRAFT, REVIEWED, APPROVED = "draft", "reviewed", "approved"
# What an import brings has lines of its own.
_NO_CHANGE = OWN | PEOPLE | {IMPORTED}
WORDS = {DRAFT: "Draft", REVIEWED: "Reviewed", APPROVED: "Approved"}


@dataclass(frozen=True)
class State:
    """A survey's state: kind is DRAFT, REVIEWED or APPROVED, last its last event or None.

    changed_at and changed_what tell the last change since it was marked as reviewed, where there was one.
    """

    kind: str
    last: SurveyEvent | None
    changed_at: datetime | None = None
    changed_what: str = ""

    @property
    def word(self):
        """Return the state as a page says it."""
        return WORDS[self.kind]


def state_of(db, survey_id):
    """Return a survey's State: reviewed only while nothing has changed since it was marked so."""
    last = db.scalar(_events(survey_id).order_by(SurveyEvent.made_at.desc(), SurveyEvent.id.desc()).limit(1))
    if last is None or last.kind == "reopened":
        return State(DRAFT, last)
    if last.kind == "approved":
        return State(APPROVED, last)
    told = db.scalar(select(History.particulars).where(History.what == MARKED, History.entity_id == last.id)) or {}
    if told.get("changes") == count_changes(db, survey_id):
        return State(REVIEWED, last)
    query = select(History).where(History.survey_id == survey_id, History.what.not_in(_NO_CHANGE))
    changed = db.scalar(query.order_by(History.at.desc(), History.id.desc()).limit(1))
    return State(DRAFT, last, changed and changed.at, changed.what if changed else "")


def count_changes(db, survey_id):
    """Return how many lines of a survey's history tell of a change to it.

    They are counted, not compared by their times: an import brings lines of earlier times.
    """
    query = select(func.count()).where(History.survey_id == survey_id, History.what.not_in(_NO_CHANGE))
    return db.scalar(query)


def mark_of(db, survey_id):
    """Return a mark of a survey as it is now: how many changes it has seen, and its last event."""
    count = select(func.count()).where(History.survey_id == survey_id).scalar_subquery()
    last = select(SurveyEvent.id).where(SurveyEvent.survey_id == survey_id)
    last = last.order_by(SurveyEvent.made_at.desc(), SurveyEvent.id.desc()).limit(1).scalar_subquery()
    changes, event_id = db.execute(select(count, last)).one()
    return f"{changes}-{event_id or ''}"


def events_of(db, survey_id):
    """Return (SurveyEvent, its kept dataset's row without the bytes, or None), newest first."""
    events = db.scalars(_events(survey_id).order_by(SurveyEvent.made_at.desc(), SurveyEvent.id.desc())).all()
    columns = (FrozenDataset.event_id, FrozenDataset.file_name, FrozenDataset.sha256)
    size = func.length(FrozenDataset.content).label("size")
    query = select(*columns, size).join(SurveyEvent, SurveyEvent.id == FrozenDataset.event_id)
    kept = {row.event_id: row for row in db.execute(query.where(SurveyEvent.survey_id == survey_id))}
    return [(event, kept.get(event.id)) for event in events]


def get_frozen(db, survey_id, event_id):
    """Return the dataset kept at an approval. Raises NotFound."""
    query = select(FrozenDataset).join(SurveyEvent, SurveyEvent.id == FrozenDataset.event_id)
    frozen = db.scalar(query.where(SurveyEvent.survey_id == survey_id, SurveyEvent.id == event_id))
    if frozen is None:
        raise NotFound("No dataset is kept here for this approval: it was made on another server, or never.")
    return frozen


def _events(survey_id):
    return select(SurveyEvent).where(SurveyEvent.survey_id == survey_id).options(joinedload(SurveyEvent.made_by))
