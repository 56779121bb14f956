"""Readings that come as a file from a phone: the same records, stored once, under the names of those who took them."""

import json
from collections import Counter
from dataclasses import dataclass
from datetime import UTC, datetime

from sqlalchemy.exc import IntegrityError

from webapp.display import Show
from webapp.errors import Conflict, NotFound
from webapp.plan.queries import current_plan
from webapp.readings import forms, queries, service
from webapp.surveys.queries import get_survey
from webapp.surveys.service import remember

MOST_RECORDS = 2000
STORED, THERE, REFUSED = "stored", "there already", "not stored"
OTHERS_NAME = "It was taken by somebody else. They can send it from their phone, or the lead or office takes this file."


class BadCopy(ValueError):
    """The file is no copy of waiting readings; the message says what to do."""


@dataclass(frozen=True)
class Copied:
    """One reading of a copy: its survey and station, who took it, and the form as it was typed."""

    survey_id: str
    code: str
    author_id: str
    form: dict


@dataclass(frozen=True)
class Taken:
    """What became of one reading: what says which, outcome is STORED, THERE or REFUSED, reason why it was refused."""

    what: str
    outcome: str
    reason: str = ""


def read_copy(data):
    """Return the Copied readings of a file's bytes. Raises BadCopy."""
    try:
        copy = json.loads(data.decode("utf-8-sig"))
    except (ValueError, RecursionError) as error:
        raise BadCopy("This is no file that a phone saved: choose the one named bankside-waiting.") from error
    records = copy.get("records") if isinstance(copy, dict) and copy.get("bankside") == "waiting readings" else None
    if not isinstance(records, list) or not all(_is_record(one) for one in records):
        raise BadCopy("This is no file of readings that waited on a phone, or it was changed since.")
    if len(records) > MOST_RECORDS:
        raise BadCopy(f"Bankside takes at most {MOST_RECORDS} readings from one file.")
    return [Copied(one["survey"], one["code"], one["author"], one["fields"]) for one in records]


def _is_record(one):
    return (
        isinstance(one, dict)
        and all(_is_text(one.get(name)) for name in ("survey", "code", "author"))
        and isinstance(one.get("fields"), dict)
        and all(_is_text(text) for text in one["fields"].values())
    )


def _is_text(text):
    """Return whether a database can hold it: JSON also writes NULs and halves of letters."""
    return isinstance(text, str) and "\x00" not in text and not any("\ud800" <= letter <= "\udfff" for letter in text)


def take_copies(db, copies, person):
    """Store each reading of a copy that is not there yet, all in one transaction; return a Taken for each.

    Raises Conflict where somebody sent the same readings at the same moment: then nothing was stored.
    """
    now = datetime.now(UTC)
    try:
        taken = [_take(db, one, person, now) for one in copies]
        stored = Counter(one.survey_id for one, done in zip(copies, taken, strict=True) if done.outcome == STORED)
        for survey_id, count in stored.items():
            remember(db, survey_id, person.id, "readings taken from a phone's file", particulars={"readings": count})
        db.commit()
    except IntegrityError as error:
        db.rollback()
        raise Conflict("The phone sent these readings itself at this moment. Take the file again to see.") from error
    return taken


def _take(db, copied, person, now):
    what = f"{copied.code}, {copied.form.get('taken_at', '')}".replace("T", " ")
    if person.survey_id not in (None, copied.survey_id):
        return Taken(what, REFUSED, "It belongs to a survey that this phone was not invited to.")
    if copied.author_id != person.id and not person.may("correct"):
        return Taken(what, REFUSED, OTHERS_NAME)
    try:
        survey = get_survey(db, copied.survey_id, person.id)
        get_survey(db, copied.survey_id, copied.author_id)
        show = forms.show_of_form(copied.form, Show.of(survey))
        new, errors = forms.parse_reading(copied.form, show, copied.code, now)
        if errors or new is None:
            return Taken(what, REFUSED, " ".join(errors.values()))
        there = queries.find_reading(db, new.id) is not None
        service.put_reading(db, survey, new, copied.author_id, current_plan(db, survey.id), now)
    except (NotFound, Conflict) as refusal:
        return Taken(what, REFUSED, refusal.message)
    return Taken(what, THERE if there else STORED)
