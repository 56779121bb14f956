"""Taking a dataset in: stored as the survey it was on a server that does not have it, compared where it does."""

from dataclasses import dataclass

from webapp.dataset.private import public_rows
from webapp.dataset.takenback import BadDataset, read
from webapp.errors import Conflict, NotAllowed
from webapp.models import History, SurveyMember
from webapp.surveyfile import merge, queries, service
from webapp.surveyfile.archive import BadSurveyFile
from webapp.surveyfile.tables import CARRIED, DATASET_IMPORTED, carried

__all__ = ["BadDataset", "BadSurveyFile", "Found", "import_dataset", "look"]


@dataclass(frozen=True)
class Found:
    """What a dataset holds, and how that compares with what is here.

    version is what it calls itself, changed the files that were changed since it was made, here_only how many rows of
    each table only this server has, by what they are called.
    """

    outcome: merge.Outcome
    version: str
    changed: tuple
    here_only: tuple

    @property
    def equal(self):
        """Return whether the survey here holds the same, neither more nor less."""
        outcome = self.outcome
        return not (outcome.new or outcome.total or outcome.differences or self.here_only)


def look(db, content, person_id):
    """Return what a dataset's zip holds. Raises BadDataset, BadSurveyFile; NotAllowed for a survey of others here."""
    file, version, changed = read(content)
    survey_id = file["survey"][0]["id"]
    if queries.find_survey(db, survey_id) is None:
        here = {name: [] for name in CARRIED}
    elif db.get(SurveyMember, (survey_id, person_id)) is None:
        raise NotAllowed(
            "This server has the survey already, and you are not on it. Ask somebody who is to put you on."
        )
    else:
        here = public_rows(queries.rows_of(db, survey_id))
    here["person"] = queries.people_of(db, {row["id"] for row in file["person"]})
    outcome = merge.merged(file, here)
    service.refuse_ids_of_others(db, outcome)
    return Found(outcome, version, changed, _here_only(file, here) if not outcome.new else ())


def _here_only(file, here):
    counted = []
    for name, one in carried().items():
        known = {one.key_of(row) for row in file[name]}
        if extra := sum(one.key_of(row) not in known for row in here[name]):
            counted.append((CARRIED[name][1], extra))
    return tuple(counted)


def import_dataset(db, content, person_id, mark):
    """Store a dataset as the survey it was, in one transaction, and return the Found.

    mark is that of the Outcome which the person agreed to. Whoever imports it may look at it from then on; that is told
    in the history here, and stays here, as the import itself does. Raises Conflict where the server has the survey, or
    mark is not that of what would happen now; BadDataset, BadSurveyFile; NotAllowed.
    """
    found = look(db, content, person_id)
    if not found.outcome.new:
        raise Conflict("This server has the survey already: a dataset adds nothing to it.")
    if mark != found.outcome.mark:
        raise Conflict("Something changed here since you looked. See what the dataset would do now.")
    service.store(db, found.outcome, person_id, _saying(found))
    return found


def _saying(found):
    def say(db, outcome, by_id):
        told = {**service.told_of(outcome), "version": found.version, "changed": list(found.changed)}
        if by_id not in {row["person_id"] for row in outcome.added["survey_member"]}:
            db.add(SurveyMember(survey_id=outcome.survey_id, person_id=by_id))
            told["put_on"] = by_id
        # Not by remember: a survey that was approved comes as it was, and nothing of it changes by coming.
        line = {"survey_id": outcome.survey_id, "entity": "survey", "entity_id": outcome.survey_id}
        db.add(History(person_id=by_id, what=DATASET_IMPORTED, particulars=told, **line))

    return say
