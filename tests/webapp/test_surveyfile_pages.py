import base64
import io
import re
from dataclasses import replace

import pytest

from tests.conftest import Browser
from tests.webapp import servers
from tests.webapp.sheets import put_readings
from webapp import create_app
from webapp.models import Reading, Survey, SurveyMember
from webapp.people import service as people_service
from webapp.people.forms import NewPerson


@pytest.fixture
def here(app):
    """The server that the pages are of."""
    return app.extensions["bankside_database"]


@pytest.fixture
def filled(db, survey, people):
    """A survey with readings."""
    put_readings(db, survey, people)
    db.close()
    return survey


@pytest.fixture
def there(database_with_people, tmp_path):
    """Another server with the same three people."""
    with servers.server_with(database_with_people, tmp_path) as database:
        yield database


@pytest.fixture
def grown(here, there, filled, people):
    """The file of a copy that has one more reading and another note on the survey."""
    servers.imported(there, servers.exported(here, filled), people["office"].id)
    servers.add_reading(there, filled, "D4", people["crew"])
    with there.writing() as db:
        db.get(Survey, filled.id).criterion_basis = "the <permit>"
        db.commit()
    return servers.exported(there, filled)


@pytest.fixture
def office(browser_as):
    """A browser of the office."""
    return browser_as("office")


def upload(browser, content, name="day.bankside"):
    return browser.post("/survey-file/preview", {"file": (io.BytesIO(content), name)})


def agree(browser, page):
    fields = dict(re.findall(r'name="(held|mark)" value="([^"]*)"', page.text))
    return browser.post("/survey-file", fields)


def count(database):
    with database.reading() as db:
        return db.query(Reading).count()


def test_the_office_takes_the_file_away(office, here, filled):
    page = office.get(f"/surveys/{filled.id}/survey-file")
    assert f"/surveys/{filled.id}/survey-file/download" in page.text
    answer = office.get(f"/surveys/{filled.id}/survey-file/download")
    assert answer.data == servers.exported(here, filled)
    assert "filename=alder-brook-low-flow.bankside" in answer.headers["Content-Disposition"]
    assert f"/surveys/{filled.id}/survey-file" in office.get(f"/surveys/{filled.id}/dataset").text


def test_a_file_is_looked_at_first_and_then_added(office, here, filled, grown):
    before = count(here)
    page = upload(office, grown)
    assert page.status_code == 200
    assert "Add 1 row<" in page.text
    assert "the &lt;permit&gt;" in page.text and "What is here stays as it is" in page.text
    assert count(here) == before
    answer = agree(office, page)
    assert answer.status_code == 303
    after = office.get(answer.location)
    assert "1 row was new here" in after.text and "1 row differs" in after.text
    assert count(here) == before + 1
    with here.reading() as db:
        assert db.get(Survey, filled.id).criterion_basis == ""
    assert "survey file imported" in office.get(f"/surveys/{filled.id}/about").text
    again = upload(office, grown)
    assert "There is nothing to add" in again.text and 'name="held"' not in again.text


def test_sent_twice_it_is_added_once(office, here, grown):
    page = upload(office, grown)
    assert agree(office, page).status_code == 303
    before = count(here)
    answer = agree(office, page)
    assert answer.status_code == 409
    assert "changed here since you looked" in answer.text and "There is nothing to add" in answer.text
    assert count(here) == before


def test_a_survey_from_elsewhere_is_seen_by_whoever_imported_it(office, here, app, filled, people, tmp_path):
    with servers.server(f"sqlite:///{tmp_path / 'truck.sqlite3'}") as truck:
        with here.reading() as db:
            content = servers.exported(here, filled)
            assert db.get(Survey, filled.id)
        with truck.writing() as db:
            by_id = people_service.add_person(db, NewPerson("Ivo Marsh", "ivo", "office", "otter at the ford")).id
        servers.imported(truck, content, by_id)
        with truck.writing() as db:
            copy = db.get(Survey, filled.id)
            copy.name = "Alder Brook, second day"
            db.commit()
        moved = servers.exported(truck, copy)
    page = upload(office, moved)
    assert "Ivo Marsh (office)" in page.text and "closed account without a password" in page.text
    assert agree(office, page).status_code == 303
    assert "Known from a survey file" in office.get("/people").text


def test_every_page_of_an_imported_survey_works(here, there, filled, people, config):
    other = create_app(replace(config, database_url=str(there.engine.url)), TESTING=True, RATELIMIT_ENABLED=False)
    browser = Browser(other)
    browser.sign_in(people["office"])
    answer = agree(browser, upload(browser, servers.exported(here, filled)))
    assert answer.status_code == 303
    for page in ("/sheet", "/sag", "/readings", "/plan", "/about", "/dataset", "/dataset.zip", "/survey-file"):
        assert browser.get(f"/surveys/{filled.id}{page}").status_code == 200, page
    other.extensions["bankside_database"].engine.dispose()


@pytest.mark.parametrize("content", [b"", b"hello", b"PK\x03\x04", b"\xff" * 1000])
def test_a_bad_file_gets_a_message_and_adds_nothing(office, here, filled, content):
    answer = upload(office, content)
    assert answer.status_code == 422
    assert "Nothing was added" in answer.text
    assert office.post("/survey-file/preview").status_code == 422


@pytest.mark.parametrize("held", ["", "not base64!", "ä", base64.b64encode(b"junk").decode(), "AAAA" * 1000])
def test_a_page_that_lost_its_file_says_so(office, held):
    answer = office.post("/survey-file", {"held": held, "mark": "x"})
    assert answer.status_code == 422
    assert "Nothing was added" in answer.text


def test_a_survey_here_that_one_is_not_on_stays_closed(office, here, filled, people):
    content = servers.exported(here, filled)
    with here.writing() as db:
        db.delete(db.get(SurveyMember, (filled.id, people["office"].id)))
        db.commit()
    answer = upload(office, content)
    assert answer.status_code == 403
    assert "not on it" in answer.text


@pytest.mark.parametrize("role", ["crew", "lead"])
def test_only_the_office_exports_and_imports(browser_as, here, filled, role):
    browser = browser_as(role)
    content = servers.exported(here, filled)
    assert browser.get(f"/surveys/{filled.id}/survey-file").status_code == 403
    assert browser.get(f"/surveys/{filled.id}/survey-file/download").status_code == 403
    assert browser.get("/survey-file").status_code == 403
    assert upload(browser, content).status_code == 403
    assert browser.post("/survey-file", {"held": base64.b64encode(content).decode()}).status_code == 403


@pytest.mark.parametrize("address", ["survey-file", "survey-file/download"])
def test_another_survey_or_none_is_not_found(office, address):
    assert office.get(f"/surveys/elsewhere/{address}").status_code == 404


@pytest.mark.parametrize(
    "query", ["added=x&differ=1", "added=1", "added=²&differ=1", "added=" + "9" * 99 + "&differ=0"]
)
def test_strange_counts_are_not_shown(office, filled, query):
    page = office.get(f"/surveys/{filled.id}/survey-file?{query}")
    assert page.status_code == 200
    assert 'role="status"' not in page.text
