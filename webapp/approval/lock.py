"""An approved survey does not change: every change is a line of its history, and that line is refused here."""

from sqlalchemy import select

from webapp.errors import Conflict
from webapp.models import Survey, SurveyEvent

REVIEWED, APPROVED, REOPENED = "survey reviewed", "survey approved", "survey opened again"
# What of a survey's history changes no number, plan, setting or fact of it: who is on it, how they sign in, and that it
# came here whole.
PEOPLE = frozenset(
    {
        "person added",
        "person removed",
        "phone invited",
        "invitation withdrawn",
        "phone signed in by invitation",
        "phone signed out",
        "dataset imported",
    }
)
OWN = frozenset({REVIEWED, APPROVED, REOPENED})
# An import of a survey file asks for itself: one that adds people alone is no change.
IMPORTED = "survey file imported"
LOCKED = (
    "This survey is approved, so nothing of it changes any more. The office can open it again under Approval; "
    "then send or save this once more."
)


def refuse_if_approved(db, survey_id, what=""):
    """Raise Conflict where the survey is approved and what, a line of its history, would change it."""
    if what not in PEOPLE | OWN | {IMPORTED} and is_approved(db, survey_id):
        raise Conflict(LOCKED)


def is_approved(db, survey_id):
    """Return whether the survey's last event is its approval; asked of the database once in a transaction.

    Where several processes write at once, whoever asks keeps an approval waiting until their transaction ends, and
    waits for one under way.
    """
    transaction, known = db.info.get("approved", (None, {}))
    if transaction is None or transaction is not db.get_transaction():
        known = {}
    if survey_id not in known:
        with db.no_autoflush:  # what the caller is about to store is flushed where they expect it
            if db.get_bind().dialect.name != "sqlite":
                db.execute(select(Survey.id).where(Survey.id == survey_id).with_for_update(read=True, key_share=True))
            known[survey_id] = db.scalar(last_kind(survey_id)) == "approved"
        db.info["approved"] = db.get_transaction(), known
    return known[survey_id]


def last_kind(survey_id):
    """Return the query for the kind of a survey's last event."""
    query = select(SurveyEvent.kind).where(SurveyEvent.survey_id == survey_id)
    return query.order_by(SurveyEvent.made_at.desc(), SurveyEvent.id.desc()).limit(1)
