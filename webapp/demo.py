"""Loads the demo survey through the imports that anybody uses, moved in time so that its day is going on now."""

import csv
from dataclasses import replace
from datetime import timedelta

from webapp.config import SHIPPED
from webapp.display import Show
from webapp.people import queries as people_queries
from webapp.people import service as people_service
from webapp.people.forms import parse_person
from webapp.plan import service as plan_service
from webapp.plan.tables import PLAN_TABLES
from webapp.readings.columns import READINGS
from webapp.review import service as review_service
from webapp.surveys import service as survey_service
from webapp.surveys.forms import parse_survey
from webapp.tablefile import read_table

FOLDER = SHIPPED / "demo_survey"
SIGN_INS = (
    ("crew", "river-crew-demo", "crew"),
    ("lead", "river-lead-demo", "lead"),
    ("office", "river-office-demo", "office"),
)
NAMES = {"crew": "Cleo Banks", "lead": "Linus Ford", "office": "Olive Reed"}
HOURS_INTO_THE_DAY = 10.5


def load(db, now):
    """Load the demo unless it is there; return whether it was loaded. now is about when D5 is due."""
    people = {role: _person(db, sign_in, password, role) for sign_in, password, role in SIGN_INS}
    if people_queries.surveys_of(db, people["office"].id):
        return False
    facts, errors = parse_survey(_survey_facts())
    _refuse(errors)
    moved = _whole_minutes(now - timedelta(hours=HOURS_INTO_THE_DAY) - facts.release_at)
    show = Show(time_zone=facts.time_zone)
    office = people["office"].id
    survey = survey_service.create_survey(db, replace(facts, release_at=facts.release_at + moved), office)
    for role in ("crew", "lead"):
        survey_service.add_member(db, survey.id, people[role].id, office)
    tables = {key: _rows(f"{key}.csv", table, show) for key, table in PLAN_TABLES.items()}
    plan_service.save_tables(db, survey, tables, "the plan of the demo", office)
    rows = _rows("readings.csv", READINGS, show)
    for row in rows:
        row["taken_at"] += moved
    review_service.import_readings(db, survey, rows, people["crew"].id)
    return True


def _person(db, sign_in, password, role):
    if (there := people_queries.find_by_sign_in(db, sign_in)) is not None:  # a start that was broken off made it
        return there
    new, errors = parse_person({"name": NAMES[role], "sign_in": sign_in, "password": password, "role": role})
    _refuse(errors)
    return people_service.add_person(db, new)


def _survey_facts():
    with (FOLDER / "survey.csv").open(encoding="utf-8", newline="") as file:
        return {row["fact"]: row["value"] for row in csv.DictReader(file)}


def _rows(name, table, show):
    read = read_table((FOLDER / name).read_text(encoding="utf-8"), table, show, show.time_zone)
    _refuse({str(cell): cell.message for cell in read.errors} | {text: text for text in read.header_errors})
    return read.rows


def _whole_minutes(difference):
    return timedelta(minutes=round(difference.total_seconds() / 60))


def _refuse(errors):
    if errors:
        raise ValueError(f"the demo survey does not read: {errors}")
