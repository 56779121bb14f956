import pytest

from tests.conftest import PASSWORD, Browser
from webapp.models import History, Person


def test_front_page_asks_a_stranger_to_sign_in(app):
    answer = app.test_client().get("/")
    assert answer.status_code == 302
    assert "/sign-in" in answer.headers["Location"]


def test_right_password_opens_the_surveys(browser_as):
    answer = browser_as("crew").get("/")
    assert answer.status_code == 200
    assert "Cleo Banks" in answer.text


def test_wrong_password_keeps_the_name_and_says_so_beside_the_field(app, people):
    answer = Browser(app).post("/sign-in", {"sign_in": "crew.test", "password": "nonsense"})
    assert answer.status_code == 422
    assert 'value="crew.test"' in answer.text
    assert "do not fit together" in answer.text
    assert "nonsense" not in answer.text


def test_sign_in_leads_back_to_the_page_that_was_asked_for(app, people):
    browser = Browser(app)
    form = {"sign_in": "crew.test", "password": PASSWORD, "next": "/surveys/abc/sheet?x=1"}
    assert browser.post("/sign-in", form).headers["Location"] == "/surveys/abc/sheet?x=1"


@pytest.mark.parametrize(
    "next_page", ["//elsewhere.example/", "https://elsewhere.example/", "/\\elsewhere.example", "x", "//[", "http://[x"]
)
def test_sign_in_never_leads_to_another_server(app, people, next_page):
    form = {"sign_in": "crew.test", "password": PASSWORD, "next": next_page}
    assert Browser(app).post("/sign-in", form).headers["Location"] == "/"


def test_guesses_at_one_account_are_slowed(config, people, app):
    from webapp import create_app

    strict = create_app(config, TESTING=True)
    browser = Browser(strict)
    statuses = [browser.post("/sign-in", {"sign_in": "slow.test", "password": f"no{n}"}).status_code for n in range(12)]
    assert statuses[:10] == [422] * 10
    assert statuses[10:] == [429] * 2
    strict.extensions["bankside_database"].engine.dispose()


def test_form_without_its_token_is_refused(app, people):
    answer = app.test_client().post("/sign-in", data={"sign_in": "crew.test", "password": PASSWORD})
    assert answer.status_code == 400
    assert "out of date" in answer.text


def test_signing_out_ends_the_session(browser_as):
    browser = browser_as("crew")
    browser.post("/sign-out")
    assert browser.get("/").status_code == 302


def test_office_makes_an_account_that_can_sign_in(app, browser_as, db):
    office = browser_as("office")
    form = {"name": "Dana Marsh", "sign_in": "D.Marsh", "role": "crew", "password": "reed warbler nest"}
    assert office.post("/people", form).status_code == 303
    assert office.post("/people", form).status_code == 409
    new = Browser(app)
    assert new.post("/sign-in", {"sign_in": "d.marsh", "password": "reed warbler nest"}).status_code == 303
    db.rollback()
    person = db.query(Person).filter_by(sign_in="d.marsh").one()
    assert "reed warbler" not in person.password_hash
    assert db.query(History).filter_by(entity_id=person.id, what="account made").count() == 1


@pytest.mark.parametrize(
    ("field", "value", "message"),
    [
        ("name", "", "Enter the person&#39;s name"),
        ("sign_in", "d marsh", "Use letters"),
        ("role", "captain", "Choose the role"),
        ("password", "short", "10 characters"),
        ("password", "aaaaaaaaaaaa", "easy to guess"),
        ("password", "x" * 201, "200 characters"),
    ],
)
def test_bad_account_is_named_beside_its_field_and_typing_stays(browser_as, field, value, message):
    form = {"name": "Dana Marsh", "sign_in": "d.marsh", "role": "crew", "password": "reed warbler nest", field: value}
    answer = browser_as("office").post("/people", form)
    assert answer.status_code == 422
    assert message in answer.text
    if field != "name":
        assert 'value="Dana Marsh"' in answer.text


@pytest.mark.parametrize("role", ["crew", "lead"])
def test_only_the_office_manages_people(browser_as, role, people):
    browser = browser_as(role)
    assert browser.get("/people").status_code == 403
    assert browser.post("/people", {"name": "x"}).status_code == 403
    assert browser.post(f"/people/{people['office'].id}/active", {"active": "no"}).status_code == 403


def test_closing_an_account_ends_its_sessions(browser_as, people):
    crew = browser_as("crew")
    office = browser_as("office")
    office.post(f"/people/{people['crew'].id}/active", {"active": "no"})
    assert crew.get("/").status_code == 302
    assert crew.sign_in(people["crew"]).status_code == 422


def test_last_office_account_cannot_be_closed(browser_as, people):
    answer = browser_as("office").post(f"/people/{people['office'].id}/active", {"active": "no"})
    assert answer.status_code == 409
    assert "last office account" in answer.text


def test_new_password_ends_the_other_sessions_but_not_this_one(browser_as, people):
    here, elsewhere = browser_as("crew"), browser_as("crew")
    address = f"/people/{people['crew'].id}/password"
    assert here.post(address, {"password": "short"}).status_code == 422
    assert here.post(address, {"password": "otter at the ford"}).status_code == 303
    assert here.get("/").status_code == 200
    assert elsewhere.get("/").status_code == 302


def test_crew_cannot_set_another_persons_password(browser_as, people):
    answer = browser_as("crew").post(f"/people/{people['office'].id}/password", {"password": "otter at the ford"})
    assert answer.status_code == 404


def test_session_ends_after_its_time(browser_as):
    browser = browser_as("office")
    with browser.client.session_transaction() as session:
        session["until"] = session["until"] - 13 * 3600
    assert browser.get("/").status_code == 302
