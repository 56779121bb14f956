"""A database of its own for each test, the three people, and a survey to work in."""

import re
import shutil

import pytest
from jinja2 import FileSystemBytecodeCache
from werkzeug.security import generate_password_hash

from webapp import create_app
from webapp.config import read_config
from webapp.db import Database, make_engine
from webapp.migrate import upgrade
from webapp.models import SurveyMember
from webapp.people import service as people_service
from webapp.people.forms import NewPerson
from webapp.people.queries import find_by_sign_in
from webapp.surveys import service as survey_service
from webapp.surveys.forms import parse_survey

PASSWORD = "heron under willow"
ROLES = {"office": "Olive Reed", "lead": "Linus Ford", "crew": "Cleo Banks"}
SURVEY_FORM = {
    "name": "Alder Brook low flow",
    "river": "Alder Brook",
    "time_zone": "Europe/Vienna",
    "elevation_m": "210",
    "do_criterion_mg_l": "5",
    "release_at": "2026-08-12T06:00",
}


@pytest.fixture(scope="session")
def database_with_people(tmp_path_factory):
    """A database file with every table and the three people; each test gets a copy, since hashing passwords is slow."""
    config = read_config({}, data_dir=tmp_path_factory.mktemp("template"))
    upgrade(config.database_url)
    database = Database(make_engine(config.database_url))
    for role, name in ROLES.items():
        with database.writing() as session:
            people_service.add_person(session, NewPerson(name, f"{role}.test", role, PASSWORD))
    with database.writing() as session:
        # Checking a real hash takes a tenth of a second, more than most tests.
        quick = generate_password_hash(PASSWORD, method="pbkdf2:sha256:1")
        for role in ROLES:
            find_by_sign_in(session, f"{role}.test").password_hash = quick
        session.commit()
    database.engine.dispose()
    return config.sqlite_path


@pytest.fixture
def config(tmp_path, database_with_people):
    """Settings of a fresh data folder with the three people in it, untouched by the environment."""
    config = read_config({}, data_dir=tmp_path / "data")
    config.data_dir.mkdir()
    shutil.copy(database_with_people, config.sqlite_path)
    return config


@pytest.fixture(scope="session")
def compiled_templates(tmp_path_factory):
    """Templates as Python compiled them for an earlier test: that takes longer than most tests."""
    return FileSystemBytecodeCache(str(tmp_path_factory.mktemp("templates")))


@pytest.fixture
def app(config, compiled_templates):
    """The application, with request limits off."""
    app = create_app(config, TESTING=True, RATELIMIT_ENABLED=False)
    app.jinja_env.bytecode_cache = compiled_templates
    yield app
    app.extensions["bankside_database"].engine.dispose()


@pytest.fixture
def db(app):
    """A writing session on the application's database; commit before a client asks for something."""
    database = Database(make_engine(app.config["BANKSIDE"].database_url))
    session = database.writing()
    yield session
    session.close()
    database.engine.dispose()


@pytest.fixture
def people(app):
    """The three people, by role, all with PASSWORD."""
    with app.extensions["bankside_database"].reading() as session:
        return {role: find_by_sign_in(session, f"{role}.test") for role in ROLES}


@pytest.fixture
def survey(app, people):
    """A survey without a plan, with all three people on it."""
    facts, errors = parse_survey(SURVEY_FORM)
    assert not errors
    database = app.extensions["bankside_database"]
    with database.writing() as session:
        survey = survey_service.create_survey(session, facts, people["office"].id)
    with database.writing() as session:
        for role in ("lead", "crew"):
            session.add(SurveyMember(survey_id=survey.id, person_id=people[role].id))
        session.commit()
    return survey


class Browser:
    """A test client that signs in and puts the forgery token into every form it posts."""

    def __init__(self, app):
        self.client = app.test_client()
        self.token = self._token_of(self.client.get("/sign-in"))

    def sign_in(self, person, password=PASSWORD):
        """Sign in and return the answer."""
        answer = self.post("/sign-in", {"sign_in": person.sign_in, "password": password})
        if answer.status_code == 303:
            self.token = self._token_of(self.client.get("/"))
        return answer

    def get(self, address, **more):
        """GET."""
        return self.client.get(address, **more)

    def post(self, address, form=None, htmx=False, **more):
        """POST a form with the token."""
        headers = {"HX-Request": "true"} if htmx else {}
        return self.client.post(address, data={"csrf_token": self.token, **(form or {})}, headers=headers, **more)

    @staticmethod
    def _token_of(answer):
        return re.search(r'name="csrf_token" value="([^"]+)"', answer.text).group(1)


@pytest.fixture
def browser_as(app, people):
    """A function from a role to a Browser signed in as that role."""

    def signed_in(role):
        browser = Browser(app)
        assert browser.sign_in(people[role]).status_code == 303
        return browser

    return signed_in
