"""Fixtures for pages that work on a plan: its address, its current version, a reading taken on it, the lead."""

import copy
from datetime import UTC, datetime

import pytest

from tests.webapp.plans import PLAN
from webapp.models import Reading
from webapp.plan import queries, service


@pytest.fixture
def plan(app, survey, people):
    """The address of the survey's plan, whose first version is PLAN."""
    with app.extensions["bankside_database"].writing() as db:
        service.save_tables(db, survey, copy.deepcopy(PLAN), "First plan", people["lead"].id)
    return f"/surveys/{survey.id}/plan"


@pytest.fixture
def now(app, survey):
    """A function to the current PlanVersion."""

    def current():
        with app.extensions["bankside_database"].reading() as db:
            return queries.current_plan(db, survey.id)

    return current


@pytest.fixture
def a_reading(app, survey, people, plan):
    """A reading at D3."""
    with app.extensions["bankside_database"].writing() as db:
        where = queries.stations_of(db, survey.id)["D3"].id
        version = queries.current_plan(db, survey.id).id
        taken = datetime(2026, 8, 12, 6, tzinfo=UTC)
        author = people["crew"].id
        db.add(
            Reading(survey_id=survey.id, station_id=where, plan_version_id=version, taken_at=taken, author_id=author)
        )
        db.commit()


@pytest.fixture
def lead(browser_as):
    """A browser signed in as the lead."""
    return browser_as("lead")
