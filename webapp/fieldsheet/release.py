"""Changing the release time: every arrival time follows, and the history keeps both."""

from webapp.errors import Conflict
from webapp.surveys.service import remember


def change_release(db, survey, new, by_id):
    """Store the release time. Raises Conflict where somebody changed it since the form was opened."""
    old = survey.release_at
    if old is not None and old.replace(second=0, microsecond=0) == new.release_at:
        return
    if _whole(old) != _whole(new.was_at):
        raise Conflict("Somebody changed the release time meanwhile; the one that holds now is shown. Look once more.")
    survey.release_at = new.release_at
    both = [old.isoformat() if old else None, new.release_at.isoformat()]
    remember(db, survey.id, by_id, "release time changed", particulars={"release_at": both})
    db.commit()


def _whole(instant):
    return instant.replace(microsecond=0) if instant else None
