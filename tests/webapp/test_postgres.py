"""The same program on PostgreSQL: a day from the first tables to the dataset, against a real server."""

import io
import re
import threading
import uuid
import zipfile
from datetime import UTC, datetime
from functools import partial

import pytest
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from frictionless import Package
from sqlalchemy import func, select

from tests.conftest import PASSWORD, ROLES, SURVEY_FORM, Browser
from tests.needs import postgres_server
from tests.webapp.plans import PLAN
from webapp import create_app
from webapp.approval import forms as approval
from webapp.approval import queries as approval_queries
from webapp.approval import service as approval_service
from webapp.config import read_config
from webapp.db import make_engine
from webapp.display import Show
from webapp.errors import Conflict
from webapp.migrate import upgrade
from webapp.models import Base, PlanVersion, Reading, Survey
from webapp.people import service as people_service
from webapp.people.access import SignedIn
from webapp.people.forms import NewPerson
from webapp.people.queries import find_by_sign_in
from webapp.plan.queries import current_plan
from webapp.plan.tables import LISTS, PLAN_TABLES
from webapp.readings.new import NewReading
from webapp.readings.service import put_reading
from webapp.tablefile import write_table


@pytest.fixture(scope="module")
def url():
    """The address of an empty database on a PostgreSQL of our own."""
    with postgres_server() as address:
        yield address


@pytest.fixture(scope="module")
def apps(url, tmp_path_factory):
    """Two copies of the application on one database, as behind a proxy, with the three people in it."""
    upgrade(url)
    config = read_config({"BANKSIDE_DATABASE_URL": url}, data_dir=tmp_path_factory.mktemp("data"))
    copies = [create_app(config, TESTING=True, RATELIMIT_ENABLED=False) for _ in range(2)]
    with copies[0].extensions["bankside_database"].writing() as db:
        for role, name in ROLES.items():
            people_service.add_person(db, NewPerson(name, f"{role}.test", role, PASSWORD))
    yield copies
    for one in copies:
        one.extensions["bankside_database"].engine.dispose()


@pytest.fixture(scope="module")
def at(apps):
    """A function from a role, and a copy of the application, to a Browser signed in there."""
    with apps[0].extensions["bankside_database"].reading() as db:
        people = {role: find_by_sign_in(db, f"{role}.test") for role in ROLES}

    def signed_in(role, copy=0):
        browser = Browser(apps[copy])
        assert browser.sign_in(people[role]).status_code == 303
        return browser

    signed_in.people = people
    return signed_in


@pytest.fixture(scope="module")
def survey(at):
    """The address of a survey with a plan, made and imported through the pages, with all three people on it."""
    office = at("office")
    made = office.post("/surveys/new", SURVEY_FORM).location.removesuffix("/plan")
    for role in ("lead", "crew"):
        assert office.post(f"{made}/people", {"person_id": at.people[role].id}).status_code == 303
    for number, key in enumerate(LISTS):
        form = {"based_on": str(number), "text": write_table(PLAN[key], PLAN_TABLES[key], Show())}
        assert office.post(f"{made}/plan/{key}/import/save", form).status_code == 303, key
    return made


@pytest.fixture
def count(apps):
    """A function that counts the rows of a model that fit."""

    def counted(model, *conditions):
        with apps[0].extensions["bankside_database"].reading() as db:
            return db.scalar(select(func.count()).select_from(model).where(*conditions))

    return counted


def reading(**more):
    """Return a reading's form as a crew types it."""
    now = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M+00:00")
    return {"submission_id": str(uuid.uuid4()), "taken_at": now, "do_mg_l": "6,1", "water_temp_c": "19.8"} | more


def save(browser, survey, code, form):
    """Send the reading, and answer every question with "keep it"."""
    address = f"{survey}/stations/{code}/reading"
    answer = browser.post(address, form)
    if (kept := re.search(r"name=\"keep\" value=\"([^\"]*)\"", answer.text)) and answer.status_code == 422:
        answer = browser.post(address, form | {"keep": kept[1].replace("&#34;", '"')})
    return answer


def test_migrations_make_exactly_the_models_tables(apps, url):
    engine = make_engine(url)
    with engine.connect() as connection:
        context = MigrationContext.configure(connection, opts={"compare_type": True})
        assert compare_metadata(context, Base.metadata) == []
    engine.dispose()
    assert upgrade(url) is None


def test_a_day_from_the_plan_to_the_dataset(at, survey, tmp_path):
    crew, lead, office = at("crew"), at("lead"), at("office")
    assert "lowest" in lead.get(f"{survey}/plan").text
    saved = save(crew, survey, "D2", reading(pressure="762", pressure_source="weather"))
    assert saved.status_code == 303
    assert "from a weather report" in crew.get(saved.location).text
    id = saved.headers["X-Stored-Id"]
    corrected = {"field": "do_mg_l", "value": "6,4", "reason": "slip of the pen", "based_on": "0"}
    assert office.post(f"{survey}/readings/{id}/correct", corrected).status_code == 303
    aside = {"reason": "the probe hung in the air", "based_on": "1"}
    assert office.post(f"{survey}/readings/{id}/set-aside", aside).status_code == 303
    shown = crew.get(f"{survey}/readings/{id}").text
    assert "slip of the pen" in shown and "the probe hung in the air" in shown
    zipped = office.get(f"{survey}/dataset.zip").data
    assert office.get(f"{survey}/dataset.zip").data == zipped
    zipfile.ZipFile(io.BytesIO(zipped)).extractall(tmp_path)
    report = Package(str(tmp_path / "datapackage.json")).validate()
    assert report.valid, report.flatten(["rowNumber", "fieldName", "message"])
    assert "6.4" in (tmp_path / "readings.csv").read_text(encoding="utf-8")


def test_a_reading_sent_again_is_one_and_with_other_content_refused(at, survey, count):
    crew, form = at("crew"), reading()
    answers = [save(crew, survey, "D3", form) for _ in range(3)]
    assert {answer.headers["X-Stored-Id"] for answer in answers} == {form["submission_id"]}
    assert save(crew, survey, "D3", form | {"do_mg_l": "2.2"}).status_code == 409
    assert count(Reading, Reading.id == form["submission_id"]) == 1


def at_once(*deeds):
    """Do each deed in a thread of its own, all at the same moment; return what each returned."""
    start, results = threading.Barrier(len(deeds)), [None] * len(deeds)

    def run(place, deed):
        start.wait()
        results[place] = deed()

    threads = [threading.Thread(target=run, args=pair) for pair in enumerate(deeds)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    return results


def test_two_copies_that_save_one_reading_at_once_store_it_once(at, survey, count):
    crews = [at("crew", copy) for copy in (0, 1)]
    for _ in range(6):
        form = reading(note="sent twice")
        answers = at_once(*(partial(save, crew, survey, "D6", form) for crew in crews))
        assert [answer.status_code for answer in answers] == [303, 303]
        assert {answer.headers["X-Stored-Id"] for answer in answers} == {form["submission_id"]}
        assert count(Reading, Reading.id == form["submission_id"]) == 1


def test_two_copies_that_change_the_plan_at_once_make_one_version(at, survey, count):
    leads = [at("lead", copy) for copy in (0, 1)]
    number = count(PlanVersion)
    form = {"based_on": str(number), "name": "Side arm", "distance_km": "24", "drop_m": "0.3", "quality": "slight",
            "shape": "vertical", "version_reason": "seen today"}  # fmt: skip
    answers = at_once(*(partial(lead.post, f"{survey}/plan/weirs/new", form) for lead in leads))
    assert sorted(answer.status_code for answer in answers) == [303, 409]
    assert count(PlanVersion) == number + 1


@pytest.mark.parametrize("round_number", range(3))
def test_form_sent_twice_at_once_is_stored_once_and_no_fault(at, survey, count, round_number):
    lead, other = at("lead"), at("lead", copy=1)
    rows = "".join(f"D3,2026-08-1{round_number} 09:{minute:02d},5,20\n" for minute in range(40))
    sheet = {"text": f"station,taken_at,do_mg_l,water_temp_c\n{rows}"}
    before = count(Reading, Reading.note == "")
    answers = at_once(*(partial(one.post, f"{survey}/readings/import", sheet) for one in (lead, other)))
    statuses = sorted(answer.status_code for answer in answers)
    assert statuses in ([303, 303], [303, 409])
    assert count(Reading, Reading.note == "") == before + 40


def test_two_phones_that_use_one_invitation_at_once_sign_one_in(apps, at, survey):
    lead = at("lead")
    for _ in range(4):
        made = lead.post(f"{survey}/invitations", {"person_id": at.people["crew"].id})
        link = re.search(r"(/join/[\w-]+)\"", made.text)[1]
        phones = [Browser(one) for one in apps]
        assert [phone.get(link).status_code for phone in phones] == [200, 200]
        answers = at_once(*(partial(phone.post, link) for phone in phones))
        assert sorted(answer.status_code for answer in answers) == [303, 410]


def test_nul_characters_are_no_trouble_of_ours(at, survey):
    office, nul = at("office"), "a\x00b"
    for address in ("/surveys/%00/sheet", f"{survey}/readings/a%00b", f"{survey}/stations/D%00/reading",
                    f"{survey}/readings?station=%00&author=%00", "/people/%00/password"):  # fmt: skip
        assert office.get(address).status_code in (200, 404, 422), address
    sent = (
        ("/sign-in", {"sign_in": nul, "password": nul}),
        ("/people", {"name": nul, "sign_in": nul, "role": "crew", "password": "a\x00b heron under willow"}),
        (f"{survey}/people", {"person_id": nul}),
        (f"{survey}/people/%00/remove", {}),
        (f"{survey}/invitations", {"person_id": nul}),
        ("/surveys/new", SURVEY_FORM | {"name": nul, "purpose": nul}),
        (f"{survey}/stations/D4/reading", reading(note=nul, meter=nul, submission_id=nul)),
        (f"{survey}/plan/weirs/import", {"text": nul, "based_on": nul}),
        (f"{survey}/readings/import/preview", {"text": f"Station;Time\n{nul};{nul}"}),
        (f"{survey}/readings/%00/set-aside", {"reason": nul, "based_on": nul}),
    )
    for address, form in sent:
        assert office.post(address, form).status_code < 500, address


def test_an_approval_waits_for_a_reading_under_way_and_then_looks_again(apps, at, survey):
    survey_id, told = survey.split("/")[2], []
    save(at("crew"), survey, "D3", reading())
    one, other = (copy.extensions["bankside_database"] for copy in apps)
    new = NewReading(str(uuid.uuid4()), "D3", datetime(2026, 8, 12, 12, tzinfo=UTC), 5.0, 20.0)
    with one.writing() as db:
        step = approval.Asked(str(uuid.uuid4()), approval_queries.mark_of(db, survey_id), "looked through")
        approval_service.mark_reviewed(db, db.get(Survey, survey_id), step, SignedIn(at.people["lead"]))

    def approve():
        with other.writing() as db:
            here = db.get(Survey, survey_id)
            step = approval.Asked(str(uuid.uuid4()), approval_queries.mark_of(db, survey_id), "for the permit")
            waiting.set()
            with pytest.raises(Conflict, match="changed since this page was opened"):
                approval_service.approve(db, here, step, SignedIn(at.people["office"]))
            told.append("refused")

    waiting, slow = threading.Event(), threading.Thread(target=approve)
    with one.writing() as db:
        plan = current_plan(db, survey_id)
        put_reading(db, db.get(Survey, survey_id), new, at.people["crew"].id, plan, datetime.now(UTC))
        slow.start()
        assert waiting.wait(20)
        slow.join(0.5)
        assert told == []
        db.commit()
    slow.join(20)
    assert told == ["refused"]
