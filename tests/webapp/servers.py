"""Further servers for tests of survey files: each a database of its own, and what one side does to a survey."""

import shutil
import uuid
from contextlib import contextmanager

from tests.conftest import ROLES, SURVEY_FORM
from tests.webapp.sheets import TAKEN
from webapp.db import Database, make_engine
from webapp.migrate import upgrade
from webapp.models import Decision, Reading, SettingsVersion
from webapp.people.queries import find_by_sign_in
from webapp.plan import queries as plan_queries
from webapp.plan import service as plan_service
from webapp.surveyfile import service
from webapp.surveys.forms import parse_survey
from webapp.surveys.service import create_survey


@contextmanager
def server(url):
    """Give the Database of a fresh server."""
    upgrade(url)
    database = Database(make_engine(url))
    try:
        yield database
    finally:
        database.engine.dispose()


@contextmanager
def server_with(people_file, folder):
    """Give the Database of a server of its own with the same people as people_file."""
    shutil.copy(people_file, folder / "other.sqlite3")
    with server(f"sqlite:///{folder / 'other.sqlite3'}") as database:
        yield database


@contextmanager
def server_with_survey(people_file, folder, form=SURVEY_FORM):
    """Give such a server's Database with an empty survey of the office's, that survey, and the people by role."""
    facts, errors = parse_survey(form)
    assert not errors
    with server_with(people_file, folder) as database:
        with database.reading() as db:
            people = {role: find_by_sign_in(db, f"{role}.test") for role in ROLES}
        with database.writing() as db:
            survey = create_survey(db, facts, people["office"].id)
        yield database, survey, people


def exported(database, survey):
    """Return the survey's file as that server makes it."""
    with database.reading() as db:
        return service.export(db, survey)


def imported(database, content, by_id):
    """Import a file and return the Outcome."""
    with database.writing() as db:
        return service.import_file(db, service.read(content), by_id)


def looked(database, content, by_id):
    """Return the Outcome that importing a file would have."""
    with database.reading() as db:
        return service.outcome_of(db, service.read(content), by_id)


def add_reading(database, survey, code, person, **more):
    """Store a further reading and return its id."""
    with database.writing() as db:
        station, plan = plan_queries.stations_of(db, survey.id)[code], plan_queries.current_plan(db, survey.id)
        values = {"do_mg_l": 5.5, "water_temp_c": 20.0, "taken_at": TAKEN, "id": str(uuid.uuid4()), **more}
        ids = {"station_id": station.id, "plan_version_id": plan.id, "author_id": person.id}
        db.add(Reading(survey_id=survey.id, **ids, **values))
        db.commit()
    return values["id"]


def add_station(database, survey, code, distance_km, person):
    """Save a plan with one more station; return the version's number."""
    with database.writing() as db:
        stations = plan_queries.current_plan(db, survey.id).tables["stations"]
        row = {"code": code, "distance_km": distance_km, "state": "added", "reason": "the sag is lower down"}
        return plan_service.replace_table(db, survey, "stations", [*stations, row], "day", person.id).number


def add_settings_and_decision(db, survey, person):
    """Store a second version of the settings, and a decision on site."""
    plan = plan_queries.current_plan(db, survey.id)
    row = {"survey_id": survey.id, "made_by_id": person.id}
    db.add(SettingsVersion(number=2, thresholds={"oxygen_step_mg_l": 0.8}, reason="a steep river", **row))
    screen = {"low_mg_l": 3.1, "sentence": "Held between D3 and D4."}
    db.add(Decision(plan_version_id=plan.id, kind="leave", chosen="leave", reason="held", screen=screen, **row))
    db.commit()
