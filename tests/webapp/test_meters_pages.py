import html
import re
import uuid
from datetime import UTC, datetime, timedelta
from functools import partial
from zoneinfo import ZoneInfo

import pytest

from tests.webapp.meter_day import MeterDay
from tests.webapp.plans import put_plan
from webapp.display import Show
from webapp.meters import forms, queries
from webapp.models import Meter, MeterCheck, Survey, SurveyMember
from webapp.surveys.service import remove_member

VIENNA = ZoneInfo("Europe/Vienna")
VIENNA_SHOW = Show(time_zone="Europe/Vienna")
METERS = [Meter(id="m", name="Meter A")]


def typed(instant):
    return instant.astimezone(VIENNA).strftime("%Y-%m-%dT%H:%M")


def a_meter_form(**more):
    return {"submission_id": str(uuid.uuid4()), "name": "Meter A", "method": "optical", "serial": "17-204", **more}


def a_check_form(meter_id, **more):
    return {
        "submission_id": str(uuid.uuid4()),
        "taken_at": typed(datetime.now(UTC)),
        "meter": meter_id,
        "kind": "as_found",
        "parameter": "do",
        "standard": "air_saturated_water",
        "water_temp_c": "25,0",
        "pressure": "741",
        "pressure_unit": "mm[Hg]",
        "pressure_source": "barometer",
        "value": "8.1",
        **more,
    }


@pytest.fixture
def day(app, survey, people):
    return MeterDay(app, survey, people)


@pytest.fixture
def meter(day):
    return day.meter()


@pytest.fixture
def address(survey):
    return f"/surveys/{survey.id}/meters"


@pytest.fixture
def crew(browser_as):
    return browser_as("crew")


@pytest.fixture
def a_form(meter):
    """A function to the form of a check as found, made now, that passes."""
    return partial(a_check_form, meter.id)


@pytest.fixture
def stored(day):
    """A function to every stored check of the survey."""

    def read():
        with day.database.reading() as db:
            return queries.checks_of(db, day.survey.id)

    return read


@pytest.fixture
def meters(day):
    def read():
        with day.database.reading() as db:
            return queries.meters_of(db, day.survey.id)

    return read


def value_of(answer, name):
    return re.search(rf'name="{name}" value="([^"]*)"', answer.text).group(1)


def test_survey_without_meters_says_what_to_do(crew, address):
    answer = crew.get(address)
    assert answer.status_code == 200
    assert "Register each meter that goes to the river" in answer.text and f"{address}/add" in answer.text
    assert "There is no meter to check yet." in crew.get(f"{address}/check").text


def test_meter_is_registered_and_stands_in_the_list(crew, address, meters):
    answer = crew.post(f"{address}/add", a_meter_form(name="  Meter   A ", resolution_mg_l="0,01"))
    assert (answer.status_code, answer.location) == (303, address)
    (meter,) = meters()
    assert (meter.name, meter.method, meter.resolution_mg_l) == ("Meter A", "optical", 0.01)
    page = crew.get(address).text
    assert "No check yet today: check it as found first." in page and "serial 17-204" in page


def test_meter_is_registered_with_htmx(crew, address, meters):
    answer = crew.post(f"{address}/add", a_meter_form(), htmx=True)
    assert (answer.status_code, answer.headers["HX-Redirect"]) == (204, address)
    assert len(meters()) == 1


@pytest.mark.parametrize(
    ("field", "text", "says"),
    [
        ("name", "", "Enter the name of the meter."),
        ("name", "x" * 61, "Shorten the name"),
        ("method", "sonar", "Choose the way it measures"),
        ("percent_basis", "500", "Choose the basis of the percent"),
        ("resolution_mg_l", "5", "must lie between 0.001 and 1 mg/L"),
        ("cap_changed_on", "last week", "as year, month and day"),
        ("serviced_on", "1800-01-01", "Check the year"),
        ("note", "x" * 2001, "Shorten the note"),
        ("submission_id", "17", "without its id"),
    ],
)
def test_what_a_meter_cannot_be_is_said_beside_its_field(field, text, says):
    new, errors = forms.parse_meter(a_meter_form(**{field: text}), Show())
    assert new is None and list(errors) == [field]
    assert says in errors[field]


def test_bad_meter_is_refused_with_and_without_htmx_and_the_typing_kept(crew, address, meters):
    for htmx in (False, True):
        answer = crew.post(f"{address}/add", a_meter_form(name="", resolution_mg_l="fine"), htmx=htmx)
        assert answer.status_code == 422
        assert "Enter the name of the meter." in answer.text and "2 entries need another look" in answer.text
        assert 'value="17-204"' in answer.text and 'value="fine"' in answer.text
    assert meters() == []


def test_taken_name_is_refused_and_the_typing_kept(crew, address, meter, meters):
    answer = crew.post(f"{address}/add", a_meter_form(name="meter a", serial="99-1"))
    assert answer.status_code == 409
    assert "There is a meter “meter a” already" in answer.text and 'value="99-1"' in answer.text
    assert len(meters()) == 1


def test_meter_is_changed_but_not_its_name(crew, address, meter, meters):
    edit = f"{address}/{meter.id}/edit"
    assert "The name stays" in crew.get(edit).text
    form = a_meter_form(name="Meter Z", out_of_service="yes", cap_changed_on="2026-08-01")
    assert crew.post(edit, form).status_code == 303
    (changed,) = meters()
    assert (changed.name, changed.out_of_service, changed.cap_changed_on) == ("Meter A", True, "2026-08-01")
    assert "Out of service: no → yes" in crew.get(edit).text
    assert crew.post(edit, a_meter_form(resolution_mg_l="x"), htmx=True).status_code == 422
    assert crew.get(f"{address}/{uuid.uuid4()}/edit").status_code == 404


@pytest.fixture
def elsewhere(day, people):
    """A function that makes another survey with a meter and puts these people on it."""

    def make(*roles):
        with day.database.writing() as db:
            other = Survey(name="Reed Beck", river="Reed Beck", time_zone="UTC", created_by_id=people["office"].id)
            db.add(other)
            db.flush()
            for role in roles:
                db.add(SurveyMember(survey_id=other.id, person_id=people[role].id))
            db.commit()
        there = MeterDay.__new__(MeterDay)
        there.database, there.survey, there.people = day.database, other, people
        there.meter("Meter R")
        return other

    return make


def test_meters_of_another_survey_that_one_is_on_are_offered_and_brought(crew, address, elsewhere, meters):
    other = elsewhere("crew")
    assert "Reed Beck: 1 meter" in crew.get(address).text
    for _ in range(2):
        assert crew.post(f"{address}/bring", {"from_survey": other.id}).status_code == 303
    assert [one.name for one in meters()] == ["Meter R"]


def test_meters_of_a_survey_that_one_is_not_on_are_neither_offered_nor_brought(crew, address, elsewhere, meters):
    other = elsewhere("lead")
    assert "Reed Beck" not in crew.get(address).text
    for wanted in (other.id, "", "nonsense\x00"):
        assert crew.post(f"{address}/bring", {"from_survey": wanted}).status_code == 404
    assert meters() == []


def test_fresh_form_proposes_the_only_meter_and_the_next_check(crew, address, meter, day):
    answer = crew.get(f"{address}/check")
    assert uuid.UUID(value_of(answer, "submission_id"))
    assert 'data-kind="check"' in answer.text and 'data-what="Meter check, Meter A"' in answer.text
    assert "data-fresh" in answer.text
    assert '<option value="as_found" selected>' in answer.text
    asked = crew.get(f"{address}/check?meter=meter+a&kind=zero").text
    assert '<option value="zero" selected>' in asked and '<option value="zero_solution" selected>' not in asked


def test_form_proposes_the_meter_that_the_person_checked_last(crew, address, meter, day):
    other = day.meter("Meter B")
    assert "Choose it" in crew.get(f"{address}/check").text
    day.check(other)
    assert f'<option value="{other.id}" selected>' in crew.get(f"{address}/check").text


def test_form_of_another_parameter_asks_for_its_own_numbers(crew, address, meter):
    answer = crew.get(f"{address}/check?parameter=temperature").text
    assert "Reference thermometer" in answer and "Air pressure" not in answer and "Zero check" not in answer


def test_check_is_saved_and_says_what_to_do_next(crew, address, a_form, stored):
    form = a_form(value="7,60", note="fog")
    answer = crew.post(f"{address}/check", form)
    assert (answer.status_code, answer.headers["X-Stored-Id"]) == (303, form["submission_id"])
    (check,) = stored()
    assert (check.value, check.water_temp_c, check.pressure_mmhg, check.note) == (7.6, 25.0, 741.0, "fog")
    assert check.entered["value"] == {"text": "7,60", "unit": "mg/L"}
    page = crew.get(answer.location).text
    assert "Does not pass" in page and "Adjust it to 8.05 mg/L, then read it back." in page
    assert "kind=adjusted" in page


def test_check_made_at_once_after_another_begins_with_its_pressure_and_place(crew, address, a_form, day):
    form = a_form(pressure="741", place="U1")
    stored = crew.get(crew.post(f"{address}/check", form).location).text
    assert "A zero check is due: make it now." in stored and "kind=zero" in stored
    beside = crew.get(f"{address}/check?meter={form['meter']}&kind=read_back")
    assert value_of(beside, "pressure") == "741" and 'value="U1"' in beside.text
    assert value_of(beside, "water_temp_c") == ""
    elsewhere = crew.get(f"{address}/check?meter={day.meter('Meter B').id}&kind=as_found")
    assert value_of(elsewhere, "pressure") == "" and 'value="U1"' not in elsewhere.text


def test_form_for_a_zero_check_that_becomes_another_kind_is_not_against_zero_solution(crew, address, meter):
    page = crew.get(f"{address}/check?meter={meter.id}&kind=zero").text
    assert '<option value="zero" selected>' in page and '<option value="air_saturated_water" selected>' in page


def test_with_htmx_the_verdict_comes_in_place(crew, address, a_form):
    form = a_form()
    answer = crew.post(f"{address}/check", form, htmx=True)
    assert (answer.status_code, answer.headers["X-Stored-Id"]) == (200, form["submission_id"])
    assert answer.headers["HX-Push-Url"].endswith(f"/checks/{form['submission_id']}")
    assert "<html" not in answer.text and "Passes" in answer.text


def test_same_form_sent_twice_is_one_check_and_other_content_is_refused(crew, address, a_form, stored):
    form = a_form()
    assert [crew.post(f"{address}/check", form).status_code for _ in range(2)] == [303, 303]
    answer = crew.post(f"{address}/check", {**form, "value": "8.0"}, htmx=True)
    assert answer.status_code == 409 and "X-Stored-Id" not in answer.headers
    assert "stored already, with other values" in answer.text and value_of(answer, "value") == "8.0"
    assert [one.value for one in stored()] == [8.1]


@pytest.mark.parametrize(
    ("field", "text", "says"),
    [
        ("meter", "", "Enter the meter."),
        ("meter", "Meter Q", "Choose the meter from the list."),
        ("kind", "guess", "Choose the kind of check"),
        ("standard", "ph_buffer", "Choose the standard"),
        ("parameter", "turbidity", "Choose the value to be checked"),
        ("value", "", "Enter the value the meter shows."),
        ("value", "8.1 mg", "as a number"),
        ("value", "98.4", "must lie between -0.5 and 30 mg/L"),
        ("value", "nan", "as a number"),
        ("water_temp_c", "", "Enter the temperature of the water."),
        ("water_temp_c", "77", "must lie between 0 and 40 °C"),
        ("pressure", "1,013", "Say which you mean"),
        ("pressure", "5000", "must lie between 0 and 1200 mmHg"),
        ("pressure_unit", "psi", "Choose the unit of the air pressure"),
        ("pressure_source", "standard", "Say where the air pressure comes from"),
        ("conductance_us_cm", "-1", "must lie between 0 and 70000"),
        ("taken_at", "", "Enter the time of the check."),
        ("taken_at", "2199-01-01T10:00", "still to come"),
        ("expires_on", "soon", "as year, month and day"),
        ("place", "x" * 61, "Shorten the place"),
        ("lot", "x" * 61, "Shorten the standard's lot"),
        ("action", "thrown", "Choose the thing that was done"),
        ("note", "x" * 2001, "Shorten the note"),
        ("submission_id", "17", "without its id"),
    ],
)
def test_what_cannot_be_is_said_beside_its_field(field, text, says):
    new, errors = forms.parse_check(a_check_form("m", **{field: text}), VIENNA_SHOW, METERS, datetime.now(UTC))
    assert new is None and list(errors) == [field]
    assert says in errors[field]


def test_bad_check_is_refused_with_and_without_htmx_and_the_typing_kept(crew, address, a_form, stored):
    for htmx in (False, True):
        answer = crew.post(f"{address}/check", a_form(value="8.1 mg", taken_at="", note="fog"), htmx=htmx)
        assert answer.status_code == 422
        assert "Enter the value the meter shows as a number" in answer.text
        assert "Enter the time of the check." in answer.text and 'aria-describedby="value-error"' in answer.text
        assert value_of(answer, "water_temp_c") == "25,0" and value_of(answer, "value") == "8.1 mg"
        assert ">fog</textarea>" in answer.text
    assert stored() == []


def test_other_value_is_asked_for_where_nothing_is_computed(crew, address, a_form, stored):
    form = a_form(standard="winkler", water_temp_c="", pressure="", pressure_source="standard")
    assert "Enter the value it is compared with." in crew.post(f"{address}/check", form).text
    assert crew.post(f"{address}/check", {**form, "compared": "8,0"}).status_code == 303
    assert (stored()[0].compared, stored()[0].expected) == (8.0, 8.0)


def test_zero_check_needs_nothing_but_what_the_meter_shows(crew, address, a_form, stored):
    form = a_form(kind="zero", water_temp_c="cold", pressure="", value="0.14")
    assert crew.post(f"{address}/check", form).status_code == 303
    (check,) = stored()
    assert (check.standard, check.expected, check.judged["passes"]) == ("zero_solution", 0.0, True)


def test_adjusting_without_a_check_as_found_is_a_question_and_no_refusal(crew, address, a_form, stored):
    form = a_form(kind="adjusted")
    asked = crew.post(f"{address}/check", form)
    assert asked.status_code == 422
    assert "Not saved yet." in asked.text and "no check as found today" in asked.text and stored() == []
    keep = html.unescape(re.search(r'name="keep" value="([^"]+)"', asked.text).group(1))
    assert crew.post(f"{address}/check", {**form, "keep": keep}).status_code == 303
    assert [one["name"] for one in stored()[0].judged["kept"]] == ["as_found_missing"]
    assert "Asked, and kept" in crew.get(f"{address}/checks/{form['submission_id']}").text


def test_sea_level_pressure_is_offered_as_a_weather_value_and_taken_in_one_tap(crew, address, a_form, stored):
    form = a_form(pressure="765")
    asked = crew.post(f"{address}/check", form)
    assert asked.status_code == 422 and "Use it as a weather value" in asked.text
    assert crew.post(f"{address}/check", {**form, "use": "sea_level_pressure"}).status_code == 303
    (check,) = stored()
    assert (check.pressure_source, round(check.pressure_mmhg)) == ("weather", 746)
    assert check.entered["pressure"] == {"text": "765", "unit": "mm[Hg]"}


def test_check_that_another_person_made_waits_for_them(crew, address, a_form, people, stored):
    answer = crew.post(f"{address}/check", a_form(author_id=people["lead"].id))
    assert (answer.status_code, answer.headers["X-Belongs-To"]) == (409, "another")
    assert stored() == []


def test_form_filled_in_other_units_is_read_in_them(crew, address, a_form, stored):
    assert crew.post(f"{address}/check", a_form(units="us", water_temp_c="77")).status_code == 303
    assert stored()[0].water_temp_c == pytest.approx(25.0)


def test_expected_value_is_told_while_the_form_is_filled_in(crew, address, meter):
    query = "standard=air_saturated_water&water_temp_c=25&pressure=760&pressure_unit=mm[Hg]&pressure_source=meter"
    answer = crew.get(f"{address}/expected?{query}", headers={"HX-Request": "true"})
    assert "It should show 8.26 mg/L at 25.0 °C and 760 mmHg (read on the meter)." in answer.text
    for rest in ("", "standard=winkler&compared=x", "water_temp_c=900", "kind=zero", "units=us&water_temp_c=nan"):
        assert "It should show" not in crew.get(f"{address}/expected?{rest}").text


def test_checks_stand_newest_first_with_their_verdicts(crew, address, day, meter):
    day.check(meter, value=7.8)
    day.check(meter, 0.2, "adjusted")
    page = crew.get(address).text
    assert page.index("Meter A: adjusted") < page.index("Meter A: as found")
    assert page.count("Does not pass") == 1 and "Passes" in page


def test_check_is_set_aside_with_a_reason_and_used_again(crew, address, day, meter, stored):
    one = f"{address}/checks/{day.check(meter).id}"
    assert "Enter the reason" in crew.post(f"{one}/set-aside", {"based_on": "0"}, htmx=True).text
    done = crew.post(f"{one}/set-aside", {"based_on": "0", "reason": "bubble"}, htmx=True)
    assert done.status_code == 200 and "Set aside, not used:" in done.text
    assert crew.post(f"{one}/set-aside", {"based_on": "7", "reason": "bubble"}).status_code == 409
    assert crew.post(f"{one}/restore", {"based_on": "1", "reason": "no bubble"}).status_code == 303
    assert [event.kind for event in stored()[0].events] == ["set_aside", "restored"]


def test_crew_is_not_offered_to_set_others_checks_aside_and_may_not(crew, address, day, meter):
    one = f"{address}/checks/{day.check(meter, by='office').id}"
    assert "ask the lead or the office" in crew.get(one).text
    assert crew.post(f"{one}/set-aside", {"based_on": "0", "reason": "x"}).status_code == 403


def test_nobody_sees_or_changes_meters_of_a_survey_they_are_not_on(crew, address, day, meter, a_form, people):
    check = day.check(meter)
    with day.database.writing() as db:
        remove_member(db, day.survey.id, people["crew"].id, people["office"].id)
    for path in ("", "/add", "/check", "/expected", f"/checks/{check.id}", f"/{meter.id}/edit"):
        assert crew.get(address + path).status_code == 404, path
    for path, form in (
        ("/add", a_meter_form()),
        (f"/{meter.id}/edit", a_meter_form()),
        ("/bring", {}),
        ("/check", a_form()),
        (f"/checks/{check.id}/set-aside", {"reason": "x", "based_on": "0"}),
        (f"/checks/{check.id}/restore", {"reason": "x", "based_on": "0"}),
    ):
        assert crew.post(address + path, form).status_code == 404, path


def test_check_of_another_survey_is_not_found_here(crew, address, day, meter):
    assert crew.get(f"{address}/checks/{uuid.uuid4()}").status_code == 404


def test_sag_page_says_that_the_end_check_is_missing_before_the_crew_leaves(app, db, survey, people, browser_as, day):
    put_plan(db, survey, people["lead"])
    db.rollback()
    meter, now = day.meter(), datetime.now(UTC).replace(second=0, microsecond=0)
    hours_to_now = (now - day.START).total_seconds() / 3600
    at = now - timedelta(hours=5)
    day.check(meter, hours_to_now - 5, "read_back", 8.2)
    for late, code in enumerate(("D1", "D2", "D3"), -4):
        day.reading(code, hours_to_now + late)
    page = html.unescape(browser_as("lead").get(f"/surveys/{survey.id}/sag").text)
    clock = at.astimezone(VIENNA).strftime("%H:%M")
    assert re.search(
        rf"Meter A has no end check since [^:]*{clock}: all its readings today count as questionable", page
    )
    assert f"/meters/check?meter={meter.id}&kind=end_of_day" in page


def test_stored_check_of_settings_that_changed_shows_both_verdicts(crew, address, day, meter):
    check = day.check(meter, value=8.15)
    with day.database.writing() as db:
        stored = db.get(MeterCheck, check.id)
        stored.judged = {**stored.judged, "says": "It was judged otherwise then."}
        db.commit()
    assert "by settings version 1: It was judged otherwise then." in crew.get(f"{address}/checks/{check.id}").text


def test_reading_says_which_checks_it_lies_between(crew, db, survey, people, day):
    put_plan(db, survey, people["lead"])
    db.rollback()
    meter = day.meter()
    before = day.check(meter, 0, "read_back", 8.2)
    one = day.reading("D2", 1)
    page = f"/surveys/{survey.id}/readings/{one.id}/check"
    assert "questionable until it is checked again" in crew.get(page).text
    after = day.check(meter, 8, "end_of_day", 7.8)
    shown = crew.get(page).text
    assert "drifted: a correction is offered" in shown and "13:30, does not pass</a>, grade good" in shown
    assert f"/meters/checks/{before.id}" in shown and f"/meters/checks/{after.id}" in shown
