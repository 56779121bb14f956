from datetime import UTC, datetime

import pytest
from sqlalchemy import update

from tests.conftest import SURVEY_FORM
from webapp.models import History, SettingsVersion, Survey


def test_new_survey_is_stored_in_si_with_the_default_settings(browser_as, db):
    form = {
        **SURVEY_FORM,
        "unit_system": "us",
        "elevation_m": "689",
        "distance_rule": "river_mile",
        "outfall_mark": "41,2",
    }
    answer = browser_as("lead").post("/surveys/new", form)
    assert answer.status_code == 303
    survey = db.query(Survey).one()
    assert survey.elevation_m == pytest.approx(210.0, abs=0.01)
    assert survey.outfall_mark == 41.2
    assert survey.release_at.isoformat() == "2026-08-12T04:00:00+00:00"
    assert db.query(SettingsVersion).one().number == 1


@pytest.mark.parametrize(
    ("field", "value", "message"),
    [
        ("name", "", "Enter the survey&#39;s name"),
        ("time_zone", "Middle/Nowhere", "Enter a time zone"),
        ("elevation_m", "high", "as a number"),
        ("elevation_m", "70000", "must lie between"),
        ("do_criterion_mg_l", "1,234", "two ways"),
        ("release_at", "soon", "date and time"),
        ("release_at", "2026-03-29T02:30", "skipped when the clocks changed"),
        ("distance_rule", "river_mile", "Enter the outfall&#39;s own river mark"),
        ("unit_system", "cubits", "Choose the units"),
    ],
)
def test_bad_survey_is_named_beside_its_field_and_typing_stays(browser_as, db, field, value, message):
    answer = browser_as("office").post("/surveys/new", {**SURVEY_FORM, field: value})
    assert answer.status_code == 422
    assert message in answer.text
    assert 'value="Alder Brook"' in answer.text
    assert db.query(Survey).count() == 0


def test_crew_cannot_make_a_survey(browser_as):
    assert browser_as("crew").post("/surveys/new", SURVEY_FORM).status_code == 403


def test_people_see_only_surveys_they_are_on(browser_as, survey, people, app):
    office, crew = browser_as("office"), browser_as("crew")
    assert survey.name in crew.get("/").text
    assert office.post(f"/surveys/{survey.id}/people/{people['crew'].id}/remove").status_code == 303
    assert survey.name not in crew.get("/").text
    assert crew.get(f"/surveys/{survey.id}/about").status_code == 404
    assert office.post(f"/surveys/{survey.id}/people", {"person_id": people["crew"].id}).status_code == 303
    assert crew.get(f"/surveys/{survey.id}/about").status_code == 200


def test_not_even_the_office_sees_a_survey_it_is_not_on(browser_as, db, people, survey):
    lead = browser_as("lead")
    address = lead.post("/surveys/new", {**SURVEY_FORM, "name": "Elsewhere"}).headers["Location"]
    elsewhere = address.split("/")[2]
    office = browser_as("office")
    for path in (f"/surveys/{elsewhere}/about", f"/surveys/{elsewhere}/plan", f"/surveys/{elsewhere}/sag"):
        assert office.get(path).status_code == 404
    assert office.post(f"/surveys/{elsewhere}/about", SURVEY_FORM).status_code == 404
    assert office.post(f"/surveys/{elsewhere}/people", {"person_id": people["office"].id}).status_code == 404


def test_changed_facts_keep_what_they_were_in_the_history(browser_as, survey, db):
    form = {**SURVEY_FORM, "do_criterion_mg_l": "6"}
    assert browser_as("lead").post(f"/surveys/{survey.id}/about", form).status_code == 303
    line = db.query(History).filter_by(survey_id=survey.id, what="survey changed").one()
    assert line.particulars == {"do_criterion_mg_l": [5.0, 6.0]}


def test_nobody_takes_themselves_off_a_survey(browser_as, survey, people):
    answer = browser_as("office").post(f"/surveys/{survey.id}/people/{people['office'].id}/remove")
    assert answer.status_code == 409


def test_unknown_person_and_unknown_survey_are_not_found(browser_as, survey):
    office = browser_as("office")
    assert office.post(f"/surveys/{survey.id}/people", {"person_id": "nobody"}).status_code == 404
    assert office.get("/surveys/no-such-survey/about").status_code == 404


def test_other_units_on_screen_do_not_change_what_nobody_touched(app, browser_as, db, survey):
    later = datetime(2026, 10, 25, 1, 30, 20, tzinfo=UTC)  # 02:30 for the second time, as the clocks go back
    marked = {"distance_rule": "river_km", "outfall_mark": 66.0, "release_at": later}
    db.execute(update(Survey).values(**marked))
    db.commit()
    lead, about = browser_as("lead"), f"/surveys/{survey.id}/about"
    form = {**SURVEY_FORM, "outfall_mark": "66", "release_at": "2026-10-25T02:30"}
    form |= {"unit_system": "us", "distance_rule": "river_mile"}
    assert lead.post(about, form).status_code == 303
    with app.extensions["bankside_database"].reading() as session:
        now = session.get(Survey, survey.id)
    assert (now.unit_system, now.elevation_m, now.release_at) == ("us", 210.0, later)
    assert now.outfall_mark == pytest.approx(66 / 1.609344)
    assert lead.post(about, {**form, "outfall_mark": "41", "elevation_m": "700"}).status_code == 303
    with app.extensions["bankside_database"].reading() as session:
        now = session.get(Survey, survey.id)
    assert (now.elevation_m, now.outfall_mark) == (pytest.approx(213.36), 41.0)


def test_a_double_tap_on_a_new_survey_makes_one(browser_as, db):
    lead = browser_as("lead")
    form = {**SURVEY_FORM, "survey_id": "6f9f0d3c-7f1e-4c0e-9a55-0c5a1d9a4b11"}
    answers = [lead.post("/surveys/new", form) for _ in range(2)]
    assert answers[0].headers["Location"] == answers[1].headers["Location"]
    assert db.query(Survey).count() == 1


def test_the_id_of_somebody_elses_survey_makes_none(browser_as, survey):
    form = {**SURVEY_FORM, "survey_id": survey.id}
    assert browser_as("lead").post("/surveys/new", form).status_code == 409


def test_a_release_moved_since_the_page_was_opened_is_not_moved_back(browser_as, survey, db):
    opened = browser_as("office")
    moved = {**SURVEY_FORM, "release_at": "2026-08-12T07:30", "was_release_at": SURVEY_FORM["release_at"]}
    assert browser_as("lead").post(f"/surveys/{survey.id}/about", moved).status_code == 303
    late = {**SURVEY_FORM, "safety_note": "Call 555.", "was_release_at": SURVEY_FORM["release_at"]}
    assert opened.post(f"/surveys/{survey.id}/about", late).status_code == 303
    stored = db.get(Survey, survey.id)
    assert (stored.safety_note, stored.release_at.isoformat()) == ("Call 555.", "2026-08-12T05:30:00+00:00")
