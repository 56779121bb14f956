"""The readings of the surveys that were asked for last, kept in memory: none is ever changed, so only new ones load."""

import threading
from collections import OrderedDict

from sqlalchemy.orm import Session

from webapp.readings import queries
from webapp.readings.layers import final

_KEPT_SURVEYS = 4
_kept = OrderedDict()
_keeping = threading.Lock()


def readings_kept(db, survey_id):
    """Return (PlainReadings, FinalReadings) of a survey in time order, as queries.readings_of would give them now.

    Those about which nothing was decided since they were last asked for are the same objects.
    """
    with _keeping:
        rows, finals = _kept.get(survey_id, ((), ()))
    known = {row.id: (row, standing) for row, standing in zip(rows, finals, strict=True)}
    # What is kept needs rows of its own: those of a session that rolls back are emptied, and filled by no other.
    with Session(db.connection(), join_transaction_mode="rollback_only") as aside:
        rows = queries.plain_readings_of(aside, survey_id, rows)
    finals = [_standing(row, *known.get(row.id, (None, None))) for row in rows]
    with _keeping:
        _kept[survey_id] = (rows, finals)
        _kept.move_to_end(survey_id)
        while len(_kept) > _KEPT_SURVEYS:
            _kept.popitem(last=False)
    return rows, list(finals)


def forget():
    """Drop all that is kept, as a start of the server does."""
    with _keeping:
        _kept.clear()


def _standing(row, known, standing):
    """Return the FinalReading of a row: the one that is known where the row is the same."""
    return standing if known is row else final(row)
