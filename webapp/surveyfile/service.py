"""Survey files: one survey with everything in it, to move between servers, merge back or archive."""

import re
import unicodedata
from dataclasses import replace

from sqlalchemy import insert
from sqlalchemy.exc import IntegrityError

from webapp.approval.lock import LOCKED, is_approved, refuse_if_approved
from webapp.dataset.service import slug
from webapp.errors import Conflict, NotAllowed
from webapp.models import Base, History, Person, SurveyMember
from webapp.surveyfile import archive, checks, merge, queries
from webapp.surveyfile.archive import BadSurveyFile
from webapp.surveyfile.rows import complete, lines_of, rows_in
from webapp.surveyfile.tables import CARRIED, FILE_IMPORTED, carried
from webapp.surveys.service import remember

# What of a file an approved survey here still takes.
_OF_PEOPLE = {"person", "survey_member", "history"}
__all__ = ["BadSurveyFile", "export", "file_name", "import_file", "outcome_of", "read"]


def export(db, survey):
    """Return the survey file's bytes. The same survey gives the same bytes, on whatever server."""
    rows = queries.rows_of(db, survey.id)
    about = {"survey": survey.name, "survey_id": survey.id, "rows": {name: len(some) for name, some in rows.items()}}
    return archive.pack(about, {name: lines_of(some) for name, some in rows.items()})


def file_name(survey):
    """Return what the survey's file is called."""
    return f"{slug(survey.name)}.bankside"


def read(content):
    """Return {table: rows} of a survey file that is whole and fits together. Raises BadSurveyFile."""
    _manifest, lines = archive.unpack(content)
    tables = {name: rows_in(carried()[name], lines[name]) for name in CARRIED}
    checks.check(tables)
    return tables


def outcome_of(db, file, person_id):
    """Return what importing a file would do. Raises NotAllowed for a survey here that the person is not on."""
    survey_id = file["survey"][0]["id"]
    if queries.find_survey(db, survey_id) is None:
        here = {name: [] for name in CARRIED}
        here["person"] = queries.people_of(db, {row["id"] for row in file["person"]})
    elif db.get(SurveyMember, (survey_id, person_id)) is None:
        raise NotAllowed(
            "This server has the survey already, and you are not on it. Ask somebody who is to put you on."
        )
    else:
        here = queries.rows_of(db, survey_id)
        here["person"] = queries.people_of(db, {row["id"] for row in file["person"]})
    outcome = merge.merged(file, here)
    refuse_ids_of_others(db, outcome)
    if _changes(outcome) and is_approved(db, survey_id):
        outcome = replace(outcome, notes=(LOCKED, *outcome.notes))
    return outcome


def refuse_ids_of_others(db, outcome):
    """Raise BadSurveyFile where a row that would be added has the id of another survey's row here."""
    for name, rows in outcome.added.items():
        if "id" in carried()[name].columns and queries.known_ids(db, name, {row["id"] for row in rows}):
            raise BadSurveyFile(f"{CARRIED[name][1]} of the file have ids that belong to another survey here.")


def import_file(db, file, by_id, mark=None):
    """Add what is new, in one transaction, and return the Outcome; what is here stays as it is.

    Whoever imports a survey that was not here is on it. Raises Conflict where mark, that of the Outcome which the
    person agreed to, is not that of what would happen now; NotAllowed; BadSurveyFile.
    """
    outcome = outcome_of(db, file, by_id)
    if mark is not None and mark != outcome.mark:
        raise Conflict("The survey was changed here since you looked. See what the file would do now.")
    if outcome.total:
        if _changes(outcome):
            refuse_if_approved(db, outcome.survey_id)
        store(db, outcome, by_id, _say)
    return outcome


def _changes(outcome):
    """Return whether a file brings more to a survey that is here than who is on it."""
    return not outcome.new and not {name for name, rows in outcome.added.items() if rows} <= _OF_PEOPLE


def store(db, outcome, by_id, say):
    """Add the rows of an Outcome and what say(db, outcome, by_id) adds to the history, in one transaction."""
    try:
        _add_people(db, outcome.added["person"], by_id)
        for name, one in carried().items():
            if name != "person" and outcome.added[name]:
                rows = [complete(one, row) for row in outcome.added[name]]
                db.execute(insert(Base.metadata.tables[name]), rows)
        say(db, outcome, by_id)
        db.commit()
    except IntegrityError as clash:  # two processes on one PostgreSQL
        db.rollback()
        raise Conflict("Somebody changed the survey at this moment. See what the file would do now.") from clash


def _say(db, outcome, by_id):
    remember(db, outcome.survey_id, by_id, FILE_IMPORTED, particulars=told_of(outcome))
    on_it = {row["person_id"] for row in outcome.added["survey_member"]}
    if outcome.new and by_id not in on_it:
        db.add(SurveyMember(survey_id=outcome.survey_id, person_id=by_id))
        remember(db, outcome.survey_id, by_id, "person added", "person", by_id)


def told_of(outcome):
    """Return what the history tells of an import."""
    added = {name: len(rows) for name, rows in outcome.added.items() if rows}
    return {"added": added, "differences": len(outcome.differences), "notes": list(outcome.notes)}


def _add_people(db, rows, by_id):
    """Make closed accounts without a password for people whom only the file knows, so that authors keep their names."""
    taken = queries.sign_ins(db) if rows else set()
    for row in rows:
        sign_in = _sign_in(row, taken)
        taken.add(sign_in)
        db.add(Person(**row, sign_in=sign_in, password_hash="", active=False))
    db.flush()
    for row in rows:
        told = {"role": row["role"], "from": "survey file"}
        db.add(History(person_id=by_id, what="account made", entity="person", entity_id=row["id"], particulars=told))
    db.flush()


def _sign_in(row, taken):
    """Return a sign-in name that the office can hand out should it open the account."""
    plain = unicodedata.normalize("NFKD", row["name"]).encode("ascii", "ignore").decode().lower()
    stem = re.sub(r"[^a-z0-9]+", ".", plain).strip(".")[:50] or "person"
    short = f"{stem}.{row['id'].lower()[:4]}"
    return short if short not in taken else f"{stem}.{row['id'].lower()}"
