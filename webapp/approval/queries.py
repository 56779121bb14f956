"""What was reviewed, approved and opened again, and the state that follows. Whoever asks is on the survey."""

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import func, select
from sqlalchemy.orm import joinedload

from webapp.approval.lock import OWN, PEOPLE
from webapp.errors import NotFound
from webapp.models import FrozenDataset, History, SurveyEvent

DRAFT, REVIEWED, APPROVED = "draft", "reviewed", "approved"
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
    query = select(History).where(History.survey_id == survey_id, History.what.not_in(OWN | PEOPLE))
    changed = db.scalar(query.where(History.at > last.made_at).order_by(History.at.desc()).limit(1))
    if changed is None:
        return State(REVIEWED, last)
    return State(DRAFT, last, changed.at, changed.what)


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
