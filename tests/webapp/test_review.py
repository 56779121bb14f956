"""The table of readings and its filters, and what is computed for all readings at once."""

import html
import re
from datetime import timedelta
from types import SimpleNamespace

import pytest
from sqlalchemy import event as sql_event

from tests.webapp.plans import PLAN, put_plan
from tests.webapp.sheets import TAKEN, correct, put_readings, rows, set_aside
from webapp.models import Reading
from webapp.people import service as people_service
from webapp.people.forms import NewPerson
from webapp.plan.queries import current_plan, stations_of
from webapp.readings import judging
from webapp.readings.asking import thresholds
from webapp.readings.check import on_site_check
from webapp.readings.queries import readings_of
from webapp.review import service
from webapp.review.rows import rows_of
from webapp.surveys.queries import current_settings


@pytest.fixture
def ids(db, survey, people):
    """Four readings by station code: D3 corrected, D5 set aside."""
    ids = put_readings(db, survey, people)
    correct(db, survey, people, ids["D3"], 4.52)
    set_aside(db, survey, people, ids["D5"])
    return ids


def codes_on(answer):
    assert answer.status_code == 200
    return re.findall(r"<strong>([UD]\d)</strong>", answer.text)


def table(browser_as, survey, query="", role="crew"):
    return browser_as(role).get(f"/surveys/{survey.id}/readings{query}")


def test_table_shows_every_reading_newest_first(browser_as, survey, ids):
    assert codes_on(table(browser_as, survey)) == ["D5", "D4", "D3", "U1"]


def test_corrected_oxygen_stands_beside_what_was_recorded(browser_as, survey, ids):
    text = " ".join(re.sub(r"<[^>]+>", " ", table(browser_as, survey, "?station=D3").text).split())
    assert "4.52 mg/L was 4.25" in text
    assert "used, corrected" in text


@pytest.mark.parametrize(
    ("query", "codes"),
    [
        ("?station=D4", ["D4"]),
        ("?state=all", ["D5", "D4", "D3", "U1"]),
        ("?state=used", ["D4", "D3", "U1"]),
        ("?state=set_aside", ["D5"]),
        ("?state=corrected", ["D3"]),
        ("?since=2026-08-12T17:00", ["D5", "D4"]),
        ("?until=2026-08-12T13:30", ["D3", "U1"]),
        ("?since=2026-08-12T13:30&until=2026-08-12T13:30", ["D3"]),
        ("?station=D3&state=set_aside", []),
        ("?author=nobody", []),
    ],
)
def test_filters_let_through_what_they_say(browser_as, survey, ids, query, codes):
    assert codes_on(table(browser_as, survey, query)) == codes


def test_findings_filter_shows_what_a_check_found_odd(browser_as, survey, ids, db):
    odd = {row.final.station_code for row in rows(db, survey) if row.reading.kept_findings}
    assert odd and "U1" not in odd
    assert set(codes_on(table(browser_as, survey, "?state=findings"))) == odd


def test_reading_used_again_counts_as_used(browser_as, survey, ids, db, people):
    person = SimpleNamespace(id=people["lead"].id, may=lambda deed: True)
    service.restore(db, survey.id, ids["D5"], "the log shows it was under water", 1, person)
    assert "D5" in codes_on(table(browser_as, survey, "?state=used"))
    assert codes_on(table(browser_as, survey, "?state=set_aside")) == []


def test_filter_by_author_offers_who_recorded_something(browser_as, survey, ids, people):
    page = table(browser_as, survey, f"?author={people['crew'].id}")
    assert len(codes_on(page)) == 4
    assert "Cleo Banks</option>" in page.text and "Linus Ford</option>" not in page.text


@pytest.mark.parametrize(
    ("query", "message"),
    [
        ("?since=yesterday", "as date and time"),
        ("?state=lost", "Choose the state"),
        ("?since=2026-08-13T00:00&until=2026-08-12T00:00", "before the earliest time"),
    ],
)
def test_unreadable_filter_is_named_beside_its_field(browser_as, survey, ids, query, message):
    assert message in table(browser_as, survey, query).text


@pytest.mark.parametrize(
    "query",
    ["?page=0", "?page=-1", "?page=999999", "?page=x", "?page=²", "?since=9999-12-31T23:59",
     "?author=" + "x" * 500, "?until=0001-01-01T00:00", "?added=1&known=x", "?added=²&known=1"],
)  # fmt: skip
def test_odd_addresses_still_give_a_page(browser_as, survey, ids, query):
    assert table(browser_as, survey, query).status_code == 200


def test_htmx_gets_the_table_alone(browser_as, survey, ids):
    answer = browser_as("crew").get(f"/surveys/{survey.id}/readings?state=used", headers={"HX-Request": "true"})
    assert answer.text.lstrip().startswith('<section id="readings-table">')
    assert len(codes_on(answer)) == 3


def test_empty_survey_says_what_to_do(browser_as, survey, db, people):
    assert "Open the plan" in table(browser_as, survey).text
    put_plan(db, survey, people["lead"])
    page = table(browser_as, survey, role="lead").text
    assert "Open the field sheet" in page and "Import from a paper sheet" in page


def test_buttons_are_those_of_the_role(browser_as, survey, ids):
    crew, lead, office = (table(browser_as, survey, role=role).text for role in ("crew", "lead", "office"))
    assert "Import from a paper sheet" not in crew and "Dataset" not in crew
    assert "Import from a paper sheet" in lead and "Dataset" not in lead
    assert "Import from a paper sheet" in office and "Dataset" in office


def test_other_crew_does_not_find_the_table(app, browser_as, survey):
    assert table(browser_as, SimpleNamespace(id="elsewhere")).status_code == 404
    with app.extensions["bankside_database"].writing() as session:
        people_service.add_person(session, NewPerson("Ida Brook", "ida.test", "crew", "heron under willow"))
    browser = browser_as("office")
    browser.client.get("/")
    from tests.conftest import Browser

    stranger = Browser(app)
    stranger.sign_in(SimpleNamespace(sign_in="ida.test"))
    assert stranger.get(f"/surveys/{survey.id}/readings").status_code == 404


def many(db, survey, people, count):
    station, plan = stations_of(db, survey.id)["D3"], current_plan(db, survey.id)
    db.add_all(
        Reading(survey_id=survey.id, station_id=station.id, plan_version_id=plan.id, author_id=people["crew"].id,
                taken_at=TAKEN + timedelta(days=1, minutes=number), do_mg_l=5.0, water_temp_c=20.0, pressure_mmhg=741.0)
        for number in range(count)
    )  # fmt: skip
    db.commit()


def test_pages_of_a_hundred_keep_the_filters(browser_as, survey, ids, db, people):
    many(db, survey, people, 230)
    first = table(browser_as, survey, "?station=D3")
    assert len(codes_on(first)) == 100
    assert "231 of 234 readings, newest first; page 1 of 3" in first.text
    assert "page=2&station=D3" in html.unescape(first.text)
    assert len(codes_on(table(browser_as, survey, "?station=D3&page=3"))) == 31
    assert "There is no page 9" in table(browser_as, survey, "?page=9").text


def test_page_takes_the_same_few_queries_however_many_readings(app, browser_as, survey, ids, db, people):
    browser, counted = browser_as("crew"), []
    engine = app.extensions["bankside_database"].engine
    sql_event.listen(engine, "before_cursor_execute", lambda *args: counted.append(args[2]))
    browser.get(f"/surveys/{survey.id}/readings")
    few = len(counted)
    many(db, survey, people, 95)
    counted.clear()
    browser.get(f"/surveys/{survey.id}/readings")
    assert len(counted) <= few, "only the readings are new"
    judging.forget()
    counted.clear()
    browser.get(f"/surveys/{survey.id}/readings")
    assert len(counted) == few <= 15


def test_computed_numbers_are_those_of_the_on_site_check(db, survey, ids):
    readings, plan = readings_of(db, survey.id), current_plan(db, survey.id)
    settings = thresholds(None)
    for row in rows(db, survey):
        check = on_site_check(survey, plan, settings, row.reading, readings)
        expected = {
            "saturation_mg_l": check.saturation_mg_l,
            "percent_saturation": check.percent,
            "deficit_mg_l": check.deficit_mg_l,
            "travel_time_h": check.around.travel_time_h,
            "hours_late": check.around.hours_late,
            "predicted_do_mg_l": check.predicted_mg_l,
            "predicted_low_mg_l": check.low_mg_l,
            "predicted_high_mg_l": check.high_mg_l,
            "difference_mg_l": check.difference_mg_l,
        }
        assert {name: getattr(row.derived, name) for name in expected} == pytest.approx(expected, nan_ok=True)


def test_numbers_outside_the_equations_leave_a_dash_and_no_error(browser_as, survey, db, people):
    put_plan(db, survey, people["lead"])
    base = {"station": "D3", "taken_at": TAKEN, "do_mg_l": 5.0}
    odd = (
        {"water_temp_c": -0.5},
        {"water_temp_c": 44.0},
        {"water_temp_c": 20.0, "conductance_us_cm": 90000.0},
        {"water_temp_c": 20.0, "pressure": 3.0, "pressure_source": "meter"},
        {},
    )
    service.import_readings(db, survey, [base | one for one in odd], people["crew"].id)
    assert [row.derived.saturation_mg_l for row in rows(db, survey)] == [None] * len(odd)
    assert len(codes_on(table(browser_as, survey))) == len(odd)


def test_stations_without_prediction_have_no_difference(db, survey, people):
    put_plan(db, survey, people["lead"], tables={**PLAN, "waters": []})
    service.import_readings(
        db, survey, [{"station": "D3", "taken_at": TAKEN, "do_mg_l": 5.0, "water_temp_c": 20.0}], people["crew"].id
    )
    (row,) = rows(db, survey)
    assert row.derived.difference_mg_l is None and row.derived.deficit_mg_l > 3


def test_table_and_on_site_check_tell_the_same_difference_also_with_a_measured_flow(db, survey, ids, people):
    tables = {**PLAN, "day": [{"river_flow_m3_s": 0.9}], "day_reaches": []}
    plan = put_plan(db, survey, people["lead"], tables, number=9)
    readings = readings_of(db, survey.id)
    settings = thresholds(current_settings(db, survey.id))
    for row in rows_of(survey, plan, readings):
        check = on_site_check(survey, plan, settings, row.reading, readings)
        assert row.derived.difference_mg_l == pytest.approx(check.difference_mg_l, abs=1e-9)
        assert row.derived.travel_time_h == pytest.approx(check.around.travel_time_h, abs=1e-9)
