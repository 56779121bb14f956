import re

import pytest

from tests.webapp.plans import put_plan
from webapp.readings import queries

READING = "0b8f6f2c-32cb-4a52-9a6f-0f5b0d3b1c11"
FORM = {"submission_id": READING, "taken_at": "2026-08-12T13:20", "do_mg_l": "6.4", "water_temp_c": "19"}


@pytest.fixture
def address(db, survey, people):
    """The address of the reading form at D3 of a ready plan."""
    put_plan(db, survey, people["lead"])
    return f"/surveys/{survey.id}/stations/D3/reading"


def test_phone_learns_who_is_signed_in_and_gets_a_token_that_fits(browser_as, people, address):
    crew = browser_as("crew")
    page = crew.get("/phone/here").text
    assert re.search(r'data-person="([^"]*)"', page).group(1) == people["crew"].id
    crew.token = re.search(r'data-token="([^"]+)"', page).group(1)
    assert crew.post(address, FORM, htmx=True).headers["X-Stored-Id"] == READING


def test_phone_whose_session_ended_gets_the_form_to_sign_in_over_the_page(app):
    page = app.test_client().get("/phone/here").text
    assert 'data-person=""' in page and 'name="password"' in page
    assert 'name="next" value="/phone/here"' in page


def test_reading_is_never_stored_under_another_name(browser_as, db, survey, people, address):
    lead = browser_as("lead")
    answer = lead.post(address, {**FORM, "author_id": people["crew"].id}, htmx=True)
    assert (answer.status_code, answer.headers["X-Belongs-To"]) == (409, "another")
    assert "X-Stored-Id" not in answer.headers
    assert "under their name only" in answer.text
    assert queries.readings_of(db, survey.id) == []


def test_reading_of_the_person_signed_in_names_its_id_each_time(browser_as, db, survey, people, address):
    crew = browser_as("crew")
    form = {**FORM, "author_id": people["crew"].id}
    for _ in range(5):
        assert crew.post(address, form, htmx=True).headers["X-Stored-Id"] == READING
    assert [one.author_id for one in queries.readings_of(db, survey.id)] == [people["crew"].id]


@pytest.mark.parametrize("author", ["nobody", "\x00", "é" * 4000, "crew\r\nX-Stored-Id: yes"])
def test_odd_author_is_refused_in_words(browser_as, address, author):
    answer = browser_as("crew").post(address, {**FORM, "author_id": author}, htmx=True)
    assert (answer.status_code, answer.headers["X-Belongs-To"]) == (409, "another")


def test_suggestion_comes_with_the_fields_it_sets_so_that_the_phone_keeps_what_is_sent(browser_as, address):
    answer = browser_as("crew").post(address, {**FORM, "water_temp_c": "68"}, htmx=True)
    assert answer.status_code == 422
    assert 'data-sets="{&#34;water_temp_c&#34;: &#34;20&#34;}"' in answer.text


def test_page_about_the_phone_wants_a_sign_in_and_works_for_everybody(app, browser_as):
    assert app.test_client().get("/phone").status_code == 302
    assert "What waits on this phone" in browser_as("crew").get("/phone").text


def test_script_is_kept_a_year_under_its_own_mark_only(app):
    client = app.test_client()
    page = client.get("/sign-in").text
    address = re.search(r'src="(/scripts/[^"]+/page.js)"', page).group(1)
    assert "max-age=31536000" in client.get(address).headers["Cache-Control"]
    assert "max-age=31536000" not in client.get("/scripts/old/page.js").headers["Cache-Control"]
    assert client.get("/scripts/old/../webapp/__init__.py").status_code == 404
