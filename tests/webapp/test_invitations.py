"""Invitations: one phone, once, for a while; and the phones they signed in."""

import logging
import re
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from types import SimpleNamespace

import pytest

from tests.conftest import SURVEY_FORM, Browser
from webapp import create_app
from webapp.invitations import service
from webapp.models import History, Invitation, PhoneSession, SurveyMember
from webapp.people.forms import NewPerson
from webapp.people.service import add_person

PHONE = {"User-Agent": "Mozilla/5.0 (Linux; Android 15) Chrome/140"}


@pytest.fixture
def address(survey):
    return f"/surveys/{survey.id}/invitations"


@pytest.fixture
def link(browser_as, address, people):
    """The path of a fresh invitation by the lead for the crew."""
    return made(browser_as("lead"), address, people["crew"])


def made(browser, address, person):
    answer = browser.post(address, {"person_id": person.id})
    assert answer.status_code == 201, answer.text
    return re.search(r"http://[^/]+(/join/[\w-]+)", answer.text).group(1)


class Phone(Browser):
    """A phone that nobody is signed in on."""

    def join(self, link):
        page = self.client.get(link)
        assert page.status_code == 200, page.text
        self.token = self._token_of(page)
        return self.client.post(link, data={"csrf_token": self.token}, headers=PHONE)


@pytest.fixture
def phone(app):
    return Phone(app)


def test_a_phone_is_signed_in_as_the_person_and_led_to_the_field_sheet(phone, link, survey):
    answer = phone.join(link)
    assert answer.status_code == 303
    assert answer.headers["Location"] == f"/surveys/{survey.id}/sheet"
    assert "Cleo Banks" in phone.get("/").text


def test_looking_at_the_link_does_not_use_it(app, phone, link):
    for _ in range(3):
        answer = app.test_client().get(link)
        assert "Cleo Banks" in answer.text
        assert answer.headers["Referrer-Policy"] == "strict-origin"
        assert answer.headers["Cache-Control"] == "no-store"
    assert phone.join(link).status_code == 303


def test_a_second_phone_is_told_that_it_was_used_and_what_to_do(app, phone, link):
    other = Phone(app)
    page = other.get(link)
    phone.join(link)
    late = other.client.post(link, data={"csrf_token": other._token_of(page)})
    for answer in (late, other.get(link)):
        assert answer.status_code == 410
        assert "It was used on" in answer.text
        assert "Ask Linus Ford for a new one" in answer.text
    assert other.get("/").status_code == 302


def test_a_doubled_tap_or_a_lost_answer_still_signs_the_same_phone_in(app, link, db):
    phone = Phone(app)
    page = phone.client.get(link)
    before = phone.client.get_cookie("session").value
    form = {"csrf_token": phone._token_of(page)}
    assert phone.client.post(link, data=form).status_code == 303
    phone.client.set_cookie("session", before)  # the answer with the new cookie never arrived
    assert phone.client.post(link, data=form).status_code == 303
    assert phone.get("/").status_code == 200
    assert db.query(PhoneSession).count() == 1


def test_the_phone_that_used_it_is_led_on_when_it_opens_the_link_again(phone, link, survey):
    phone.join(link)
    assert phone.get(link).headers["Location"] == f"/surveys/{survey.id}/sheet"


def test_an_old_invitation_is_refused(app, phone, link, db):
    page = phone.client.get(link)
    invitation = db.query(Invitation).one()
    assert invitation.expires_at - invitation.made_at == timedelta(minutes=15)
    invitation.expires_at = datetime.now(UTC) - timedelta(seconds=1)
    db.commit()
    answer = phone.client.post(link, data={"csrf_token": phone._token_of(page)})
    assert answer.status_code == 410
    assert "a few minutes only" in answer.text
    assert phone.get("/").status_code == 302


def test_a_withdrawn_invitation_is_refused(browser_as, phone, link, address, db):
    invitation = db.query(Invitation).one()
    db.rollback()
    lead = browser_as("lead")
    assert lead.post(f"{address}/{invitation.id}/withdraw").status_code == 303
    assert phone.get(link).status_code == 410
    assert "withdrawn" in phone.get(link).text


def test_an_invitation_that_was_used_is_not_withdrawn_but_its_phone_signed_out(browser_as, phone, link, address, db):
    phone.join(link)
    invitation = db.query(Invitation).one()
    db.rollback()
    answer = browser_as("lead").post(f"{address}/{invitation.id}/withdraw")
    assert answer.status_code == 409
    assert "sign that phone out" in answer.text


def test_an_invitation_ends_with_the_account_and_with_the_place_on_the_survey(browser_as, phone, link, survey, people):
    office, crew = browser_as("office"), people["crew"].id
    office.post(f"/people/{crew}/active", {"active": "no"})
    assert phone.get(link).status_code == 410
    office.post(f"/people/{crew}/active", {"active": "yes"})
    assert phone.get(link).status_code == 200
    office.post(f"/surveys/{survey.id}/people/{crew}/remove")
    assert "not on this survey any more" in phone.get(link).text


def test_nobody_is_invited_to_a_closed_account(browser_as, address, people):
    browser_as("office").post(f"/people/{people['crew'].id}/active", {"active": "no"})
    lead = browser_as("lead")
    assert lead.post(address, {"person_id": people["crew"].id}).status_code == 409
    assert "nobody you may invite" in lead.get(address).text


def test_an_invitation_lasts_as_long_as_the_office_has_set(config, people, survey, db):
    app = create_app(replace(config, invitation_minutes=40), TESTING=True, RATELIMIT_ENABLED=False)
    lead = Browser(app)
    lead.sign_in(people["lead"])
    made(lead, f"/surveys/{survey.id}/invitations", people["crew"])
    invitation = db.query(Invitation).one()
    assert invitation.expires_at - invitation.made_at == timedelta(minutes=40)
    app.extensions["bankside_database"].engine.dispose()


def test_a_new_invitation_for_the_same_person_ends_the_one_before(browser_as, phone, link, address, people):
    newer = made(browser_as("lead"), address, people["crew"])
    assert phone.get(link).status_code == 410
    assert phone.join(newer).status_code == 303


def test_an_unknown_token_leads_nowhere(phone):
    for token in ("x", "0" * 5000, "%F0%9F%90%9F", "a%00b", "..%2F.."):
        answer = phone.get(f"/join/{token}")
        assert answer.status_code == 404
    assert "not known here" in phone.get("/join/x").text


def test_using_it_without_the_forgery_token_is_refused(app, phone, link):
    assert app.test_client().post(link).status_code == 400
    assert phone.join(link).status_code == 303


def test_only_the_hash_of_a_token_is_stored(link, db):
    token = link.removeprefix("/join/")
    assert len(token) >= 22  # 128 bits in base64
    invitation = db.query(Invitation).one()
    assert re.fullmatch(r"[0-9a-f]{64}", invitation.token_hash)
    stored = [str(value) for row in (invitation, *db.query(History)) for value in vars(row).values()]
    assert not [text for text in stored if token in text]


def test_a_token_stays_out_of_the_log(app, link, caplog, monkeypatch):
    app.testing = False
    app.config["PROPAGATE_EXCEPTIONS"] = False
    monkeypatch.setattr(service, "look_at", lambda *_: 1 / 0)
    with caplog.at_level(logging.DEBUG):
        assert app.test_client().get(link).status_code == 500
    assert "/join/…" in caplog.text
    assert link not in caplog.text


def test_a_phone_that_is_signed_out_by_the_lead_is_out_at_its_next_request(browser_as, phone, link, address, db):
    phone.join(link)
    assert phone.get("/").status_code == 200
    lead = browser_as("lead")
    assert "Android" in lead.get(address).text
    session = db.query(PhoneSession).one()
    db.rollback()
    assert lead.post(f"{address.removesuffix('/invitations')}/phones/{session.id}/end").status_code == 303
    assert phone.get("/").status_code == 302
    assert "Signed out" in lead.get(address).text


def test_a_stolen_cookie_is_worth_nothing_after_signing_out(phone, link):
    phone.join(link)
    phone.token = phone._token_of(phone.get("/"))
    cookie = phone.client.get_cookie("session").value
    phone.post("/sign-out")
    phone.client.set_cookie("session", cookie)
    assert phone.get("/").status_code == 302


def test_a_phone_is_out_when_its_person_is_taken_off_the_survey(browser_as, phone, link, survey, people):
    phone.join(link)
    browser_as("office").post(f"/surveys/{survey.id}/people/{people['crew'].id}/remove")
    assert phone.get("/").status_code == 302


def test_a_phone_is_out_when_its_account_is_closed(browser_as, phone, link, people):
    phone.join(link)
    browser_as("office").post(f"/people/{people['crew'].id}/active", {"active": "no"})
    assert phone.get("/").status_code == 302


def test_a_phone_is_out_when_its_time_has_passed(phone, link, db):
    phone.join(link)
    db.query(PhoneSession).one().until = datetime.now(UTC) - timedelta(seconds=1)
    db.commit()
    assert phone.get("/").status_code == 302


def test_an_invited_phone_cannot_take_the_account_over(phone, link, people):
    phone.join(link)
    phone.token = phone._token_of(phone.get("/"))
    own = f"/people/{people['crew'].id}/password"
    assert phone.get(own).status_code == 403
    assert phone.post(own, {"password": "otter at the ford"}).status_code == 403


def test_joining_signs_out_whoever_was_signed_in_before(browser_as, app, link):
    phone = Phone(app)
    office = browser_as("office")
    phone.client = office.client
    assert "Olive Reed is signed in here now" in phone.get(link).text
    assert phone.join(link).status_code == 303
    assert phone.get("/people").status_code == 403


@pytest.mark.parametrize(
    ("by", "whom", "status"),
    [("lead", "crew", 201), ("lead", "lead", 403), ("lead", "office", 403), ("office", "lead", 201)]
    + [("office", "crew", 201), ("office", "office", 403), ("crew", "crew", 403)],
)
def test_nobody_invites_to_a_role_as_strong_as_their_own(browser_as, address, people, by, whom, status, db):
    assert browser_as(by).post(address, {"person_id": people[whom].id}).status_code == status
    assert db.query(Invitation).count() == (status == 201)


def test_another_surveys_lead_can_do_nothing_here(app, browser_as, address, survey, people, link, phone, db):
    phone.join(link)
    session, invitation = db.query(PhoneSession).one(), db.query(Invitation).one()
    db.query(SurveyMember).filter_by(person_id=people["lead"].id).delete()
    db.commit()
    lead = browser_as("lead")
    assert lead.get(address).status_code == 404
    assert lead.post(address, {"person_id": people["crew"].id}).status_code == 404
    assert lead.post(f"{address}/{invitation.id}/withdraw").status_code == 404
    assert lead.post(f"/surveys/{survey.id}/phones/{session.id}/end").status_code == 404
    assert phone.get("/").status_code == 200


def test_an_invited_phone_reaches_the_survey_it_was_invited_to_and_no_other(browser_as, phone, link, people, survey):
    office = browser_as("office")
    elsewhere = office.post("/surveys/new", {**SURVEY_FORM, "name": "Elsewhere"}).headers["Location"].split("/")[2]
    office.post(f"/surveys/{elsewhere}/people", {"person_id": people["crew"].id})
    phone.join(link)
    assert phone.get(f"/surveys/{survey.id}/sheet").status_code == 200
    assert "Elsewhere" not in phone.get("/").text
    for path in ("sheet", "sag", "readings", "about"):
        answer = phone.get(f"/surveys/{elsewhere}/{path}")
        assert answer.status_code == 404
        assert "invited to another survey" in answer.text
    crew = browser_as("crew")
    assert crew.get(f"/surveys/{elsewhere}/sheet").status_code == 200


def test_an_invitation_for_nobody_is_refused(browser_as, address):
    for form in ({}, {"person_id": "nobody"}, {"person_id": "\x00"}):
        assert browser_as("lead").post(address, form).status_code == 404


def test_inviting_puts_the_person_on_the_survey_and_history_tells_it_all(app, browser_as, address, survey, phone, db):
    new = add_person(db, NewPerson("Dana Marsh", "dana", "crew", "reed warbler nest"))
    phone.join(made(browser_as("lead"), address, new))
    assert phone.get(f"/surveys/{survey.id}/about").status_code == 200
    lines = [line.what for line in db.query(History).filter_by(survey_id=survey.id).order_by(History.at)]
    assert lines[-3:] == ["person added", "phone invited", "phone signed in by invitation"]


@pytest.mark.parametrize(
    ("release_at", "until"),
    [
        (None, "2026-08-14T22:00"),  # today in Vienna, and 48 h
        ("2026-08-13T04:00", "2026-08-15T22:00"),
        ("2026-08-10T04:00", "2026-08-14T22:00"),
        ("2026-09-30T04:00", "2026-08-19T09:00"),  # never longer than 7 days
    ],
)
def test_a_phone_stays_for_the_surveys_day_and_48_hours_at_most_7_days(release_at, until):
    release = datetime.fromisoformat(release_at).replace(tzinfo=UTC) if release_at else None
    survey = SimpleNamespace(time_zone="Europe/Vienna", release_at=release)
    now = datetime(2026, 8, 12, 9, tzinfo=UTC)
    assert service.stays_until(survey, now) == datetime.fromisoformat(until).replace(tzinfo=UTC)


def test_a_link_made_on_the_laptop_itself_is_one_that_phones_reach(browser_as, address, people, monkeypatch):
    monkeypatch.setattr("webapp.reach.network_addresses", lambda: ["10.42.0.1"])
    answer = browser_as("lead").post(address, {"person_id": people["crew"].id})
    assert "http://10.42.0.1:8080/join/" in answer.text
    assert 'src="data:image/svg+xml' in answer.text
