"""What waits on a phone and comes as a file: the same records, stored once, under the names of who made them."""

import json
from collections import Counter
from dataclasses import dataclass
from datetime import UTC, datetime

from sqlalchemy.exc import IntegrityError

from webapp.bottles import copies as bottles
from webapp.errors import Conflict, NotFound
from webapp.meters import copies as checks
from webapp.readings import copies as readings
from webapp.surveys.queries import get_survey
from webapp.surveys.service import remember
from webapp.visits import copies as visits

MOST_RECORDS = 2000
STORED, THERE, REFUSED = "stored", "there already", "not stored"
OTHERS_NAME = "It was taken by somebody else. They can send it from their phone, or the lead or office takes this file."
# Each kind of record is parsed and stored by the feature that it belongs to.
TAKERS = {"reading": readings.take, "visit": visits.take, "check": checks.take, "bottle": bottles.take}


class BadCopy(ValueError):
    """The file is no copy of what waited on a phone; the message says what to do."""


@dataclass(frozen=True)
class Copied:
    """One record of a copy: its kind, survey and station, who made it, what its form was called and what was typed."""

    kind: str
    survey_id: str
    code: str
    author_id: str
    called: str
    form: dict


@dataclass(frozen=True)
class Taken:
    """What became of one record: what says which, outcome is STORED, THERE or REFUSED, reason why it was refused."""

    what: str
    outcome: str
    reason: str = ""


def read_copy(data):
    """Return the Copied records of a file's bytes. Raises BadCopy."""
    try:
        copy = json.loads(data.decode("utf-8-sig"))
    except (ValueError, RecursionError) as error:
        raise BadCopy("This is no file that a phone saved: choose the one named bankside-waiting.") from error
    records = copy.get("records") if isinstance(copy, dict) and copy.get("bankside") == "waiting readings" else None
    if not isinstance(records, list) or not all(_is_record(one) for one in records):
        raise BadCopy("This is no file of what waited on a phone, or it was changed since.")
    if len(records) > MOST_RECORDS:
        raise BadCopy(f"Bankside takes at most {MOST_RECORDS} records from one file.")
    return [
        Copied(_kind(one), one["survey"], one["code"], one["author"], one.get("what", ""), one["fields"])
        for one in records
    ]


def _kind(record):
    """Return the kind of a record; a page from before there were kinds saved readings only."""
    return record.get("kind", "reading")


def _is_record(one):
    return (
        isinstance(one, dict)
        and all(_is_text(one.get(name)) for name in ("survey", "code", "author"))
        and all(_is_text(one.get(name, "")) for name in ("kind", "what"))
        and isinstance(one.get("fields"), dict)
        and all(_is_text(text) for text in one["fields"].values())
    )


def _is_text(text):
    """Return whether a database can hold it: JSON also writes NULs and halves of letters."""
    return isinstance(text, str) and "\x00" not in text and not any("\ud800" <= letter <= "\udfff" for letter in text)


def take_copies(db, copies, person):
    """Store each record of a copy that is not there yet, all in one transaction; return a Taken for each.

    Raises Conflict where somebody sent the same at the same moment, or a survey is approved: then nothing was stored.
    """
    now = datetime.now(UTC)
    try:
        taken = [_take(db, one, person, now) for one in copies]
        stored = [one for one, done in zip(copies, taken, strict=True) if done.outcome == STORED]
        for survey_id in sorted({one.survey_id for one in stored}):
            counts = Counter(one.kind for one in stored if one.survey_id == survey_id)
            remember(db, survey_id, person.id, "records taken from a phone's file", particulars=dict(counts))
        db.commit()
    except IntegrityError as error:
        db.rollback()
        raise Conflict("The phone sent these itself at this moment. Take the file again to see.") from error
    return taken


def _take(db, copied, person, now):
    what = _what(copied)
    if person.survey_id not in (None, copied.survey_id):
        return Taken(what, REFUSED, "It belongs to a survey that this phone was not invited to.")
    if copied.author_id != person.id and not person.may("correct"):
        return Taken(what, REFUSED, OTHERS_NAME)
    if copied.kind not in TAKERS:
        return Taken(what, REFUSED, "This version of Bankside does not know that kind of record.")
    try:
        survey = get_survey(db, copied.survey_id, person.id)
        get_survey(db, copied.survey_id, copied.author_id)
        with db.begin_nested():  # what a refusal left half done must not be stored with the rest
            there, errors = TAKERS[copied.kind](db, survey, copied, now)
    except (NotFound, Conflict) as refusal:
        return Taken(what, REFUSED, refusal.message)
    if errors:
        return Taken(what, REFUSED, " ".join(errors.values()))
    return Taken(what, THERE if there else STORED)


def _what(copied):
    """Return what a record is called in the list: the station and time of a reading, else as its form was called."""
    times = (copied.form.get(name) for name in ("taken_at", "checked_at", "arrived_at", "collected_at"))
    at = next((text for text in times if text), "").replace("T", " ")
    name = copied.code if copied.kind == "reading" else copied.called or copied.code
    return f"{name}, {at}"
