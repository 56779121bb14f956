"""Visits over a day: several crews, past midnight, over a change of the clocks; what the water and the sun did."""

import json
import uuid
from datetime import UTC, datetime, timedelta

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from calc.settings import Settings
from tests.webapp.plans import put_plan
from webapp.display import Show
from webapp.plan.queries import current_plan
from webapp.readings.judging import judgement_of
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading
from webapp.visits import forms, queries, service
from webapp.visits.changes import judged_wading, news_of_the_day, seen_at, wading_limits
from webapp.visits.layers import FinalVisit, final_visit
from webapp.visits.line import visits_on_sheet
from webapp.visits.sun import place_of, sun_at

NOW = datetime(2026, 12, 1, tzinfo=UTC)
VIENNA = Show(time_zone="Europe/Vienna")
SETTINGS = Settings()


@pytest.fixture
def saved(app, survey, people):
    """A function that saves a visit's form as somebody, and returns the FinalVisit."""
    database = app.extensions["bankside_database"]
    with database.writing() as db:
        put_plan(db, survey, people["lead"])

    def save(role, code, **typed):
        form = {"submission_id": str(uuid.uuid4()), **typed}
        entry, errors = forms.parse_entry(form, VIENNA, code, NOW)
        assert errors == {}
        with database.writing() as db:
            stored = service.add_entry(db, survey, entry, people[role].id, NOW)
            return final_visit(queries.get_visit(db, survey.id, stored.visit_id))

    return save


def test_two_crews_and_two_visits_at_a_station_stay_apart_and_each_has_its_own_readings(app, saved, survey, people):
    one = saved("crew", "D3", arrived_at="2026-08-12T09:00", left_at="2026-08-12T09:40")
    two = saved("lead", "D3", arrived_at="2026-08-12T09:20", left_at="2026-08-12T10:00")
    late = saved("crew", "D3", arrived_at="2026-08-12T23:40", left_at="2026-08-13T00:20")
    with app.extensions["bankside_database"].writing() as db:
        plan = current_plan(db, survey.id)
        for role, at in (("crew", "07:30"), ("lead", "07:30"), ("crew", "22:10")):
            taken = datetime.fromisoformat(f"2026-08-12T{at}+00:00")
            add_reading(db, survey, NewReading(str(uuid.uuid4()), "D3", taken, 6.0, 19.0), people[role].id, plan, NOW)
        occasions = {one.visit.id: one for one in judgement_of(db, survey).occasions if one.visit}
    assert [len(occasions[visit.id].readings) for visit in (one, two, late)] == [1, 1, 1]
    assert [occasions[visit.id].visit_no for visit in (one, two, late)] == [1, 2, 3]
    assert [visit.opened_by for visit in (one, two, late)] == ["Cleo Banks", "Linus Ford", "Cleo Banks"]


def test_visit_past_midnight_ends_on_the_next_day_and_is_told_with_it(app, saved, survey):
    visit = saved("crew", "D3", arrived_at="2026-08-12T23:40", left_at="2026-08-13T00:20")
    assert visit.left_at - visit.arrived_at == timedelta(minutes=40)
    with app.extensions["bankside_database"].reading() as db:
        sheet = visits_on_sheet(VIENNA, queries.visits_of(db, survey.id), SETTINGS, NOW)
    assert sheet.lines["D3"][1] == "Visit by Cleo Banks, Wed 12 Aug 23:40 to Thu 13 Aug 00:20"


# On 25 October 2026 the clocks in Vienna went from 03:00 back to 02:00, at 01:00 UTC.
AUTUMN = [
    ("02:40", "02:10", "2026-10-25T01:15:00+00:00", ("00:40", "01:10")),  # left in the second hour of that name
    ("02:05", "03:20", "2026-10-25T02:30:00+00:00", ("00:05", "02:20")),
    ("02:05", "02:20", "2026-10-25T01:25:00+00:00", ("01:05", "01:20")),  # saved in the second: it is the nearer
    ("02:05", "02:20", "2026-10-25T00:25:00+00:00", ("00:05", "00:20")),
]


@pytest.mark.parametrize(("arrived", "left", "saved_at", "expected"), AUTUMN)
def test_visit_over_the_end_of_summer_time_keeps_its_order_and_length(arrived, left, saved_at, expected):
    form = {"submission_id": str(uuid.uuid4()), "arrived_at": f"2026-10-25T{arrived}", "left_at": f"2026-10-25T{left}"}
    entry, errors = forms.parse_entry(form | {"saved_at": saved_at}, VIENNA, "D3", NOW)
    assert errors == {}
    assert (entry.facts["arrived_at"], entry.facts["left_at"]) == tuple(f"2026-10-25T{at}:00+00:00" for at in expected)


def test_hour_that_the_clocks_skipped_in_spring_is_asked_about():
    form = {"submission_id": str(uuid.uuid4()), "arrived_at": "2026-03-29T02:30"}
    assert "skipped" in forms.parse_entry(form, VIENNA, "D3", NOW)[1]["arrived_at"]


def visit(code="D3", at="09:00", name="a", **facts):
    arrived = datetime.fromisoformat(f"2026-08-12T{at}+00:00")
    return FinalVisit(name, code, "Cleo Banks", "c", {"arrived_at": arrived, **facts})


@pytest.mark.parametrize(
    ("stages", "names"),
    [((0.40, 0.43), []), ((0.40, 0.431), ["flow_changing"]), ((0.40, 0.42, 0.44), ["flow_changing"]), ((None, 1), [])],
)
def test_stage_is_held_against_the_first_and_the_last_visit_to_its_station(stages, names):
    visits = [visit(at=f"{9 + hour:02d}:00", name=str(hour), stage_m=stage) for hour, stage in enumerate(stages)]
    elsewhere = visit("D4", "08:00", "other", stage_m=5.0)
    seen = seen_at(visits[-1], [*visits, elsewhere], SETTINGS)
    assert [one.name for one in seen.findings] == names
    assert {one.since.station_code for one in seen.changes} <= {"D3"}


@pytest.mark.parametrize(
    ("flow", "said"), [(1.1, ""), (1.15, "Ask the plant"), (1.2, "Ask the plant"), (1.3, "Stop and think")]
)
def test_flow_that_changes_by_a_fifth_makes_one_stop_and_think(flow, said):
    first, again = visit(flow_m3_s=1.0), visit(at="12:00", name="b", flow_m3_s=flow)
    findings = seen_at(again, [first, again], SETTINGS).findings
    assert (findings[0].do if findings else "").startswith(said)
    assert bool(findings) == bool(said)


def test_thunder_and_rain_are_told_on_the_field_sheet_hazards_first_and_old_news_is_not():
    yesterday = visit("D2", "09:00", "old", weather="thunder")
    yesterday.facts["arrived_at"] -= timedelta(hours=25)
    visits = [yesterday, visit("D3", rain_mm=4.0), visit("D4", "10:00", "b", weather="thunder")]
    assert [(one.station_code, finding.name) for one, finding in news_of_the_day(visits, SETTINGS)] == [
        ("D4", "thunder"),
        ("D3", "rained"),
    ]


@pytest.mark.parametrize(
    ("depth", "velocity", "said"),
    [
        (1.0, 0.93, "Do not wade. Depth 1.00 m times velocity 0.93 m/s is 0.93 m²/s (10.0 ft²/s)."),
        (0.8, 0.75, "wading limit is 0.6 m²/s"),
        (0.95, None, "above the project's wading limit of 0.9 m"),
        (0.5, 0.5, "Depth times velocity is 0.25 m²/s (2.7 ft²/s). That is below the limits, which is no permission"),
        (None, 0.5, ""),
    ],
)
def test_wading_is_warned_about_with_its_limits_in_both_units_and_never_called_safe(depth, velocity, said):
    wading = judged_wading(depth, velocity, SETTINGS)
    words = " ".join([*(one.says + one.do for one in wading.findings), wading.says])
    assert said in words
    assert "safe" not in (words + wading_limits(SETTINGS)).lower()
    assert "0.93 m²/s (10 ft²/s)" in wading_limits(SETTINGS)


# Sunrise and sunset at 48.2° N, 16.4° E, to within two minutes: on 21 June 04:54 and 20:58 summer time, on 21 December
# 07:42 and 16:03; the sun is highest near 12:56 summer time in June.
@pytest.mark.parametrize(
    ("instant", "state"),
    [
        ("2026-06-21T04:44+02:00", "before sunrise"),
        ("2026-06-21T05:04+02:00", "morning"),
        ("2026-06-21T12:46+02:00", "morning"),
        ("2026-06-21T13:06+02:00", "afternoon"),
        ("2026-06-21T20:48+02:00", "afternoon"),
        ("2026-06-21T21:08+02:00", "after sunset"),
        ("2026-12-21T07:32+01:00", "before sunrise"),
        ("2026-12-21T16:13+01:00", "after sunset"),
        ("2026-12-22T00:10+01:00", "before sunrise"),
    ],
)
def test_sun_state_agrees_with_the_almanac(instant, state):
    assert sun_at((48.2, 16.4), datetime.fromisoformat(instant)).state == state


def test_solar_time_follows_the_meridian_and_not_the_clock():
    instant = datetime(2026, 9, 1, 12, tzinfo=UTC)  # the equation of time is near zero on this day
    assert [sun_at((10.0, longitude), instant).solar_time for longitude in (0.0, 15.0, -90.0)] == [
        "12:00",
        "13:00",
        "06:00",
    ]


def test_where_the_sun_does_not_set_or_rise_there_is_still_a_time_of_day():
    assert sun_at((70.0, 25.0), datetime(2026, 6, 21, 22, 30, tzinfo=UTC)).state == "morning"
    assert sun_at((70.0, 25.0), datetime(2026, 12, 21, 11, tzinfo=UTC)).state == "after sunset"
    assert sun_at(None, datetime(2026, 6, 21, tzinfo=UTC)) is None


def test_position_of_a_station_is_that_of_its_access_point_else_any_that_is_known():
    access = [{"name": "Ford", "latitude": 1.0, "longitude": 2.0}, {"name": "Mill", "latitude": 3.0, "longitude": 4.0}]
    tables = {"stations": [{"code": "D1", "access": "Mill"}, {"code": "D2", "access": None}], "access": access}
    assert [place_of(tables, code) for code in ("D1", "D2", "D9")] == [(3.0, 4.0), (1.0, 2.0), (1.0, 2.0)]
    assert place_of({}, "D1") is None


NASTY = ["", "0", "-1", "4,05", "1,234", "nan", "1e999", "9" * 400, "٣٫٥", "\x00", "a\x00b", "[[", '["a"', "null",
         "2026-10-25T02:30", "0001-01-01T00:00", "9999-12-31T23:59+23:59", "yes", "x" * 3000,
         "31 30;29/28"]  # fmt: skip
FIELDS = ["submission_id", "visit_id", "seen", "units", "saved_at", "arrived_at", "left_at", "platform", "weather",
          "status", "partial_reason", "flow_method", "flow_m3_s", "flow_uncertainty_percent", "float_distance",
          "float_times", "stage_m", "wading_depth_m", "wading_velocity_m_s", "crew", "note", "reason"]  # fmt: skip


@settings(max_examples=150, deadline=None, derandomize=True)
@given(st.dictionaries(st.sampled_from(FIELDS), st.sampled_from(NASTY) | st.text(max_size=20), max_size=8))
def test_whatever_is_typed_is_either_taken_or_said_beside_a_field(typed):
    form = {"submission_id": str(uuid.uuid4()), "arrived_at": "2026-08-12T10:14", **typed}
    entry, errors = forms.parse_entry(form, VIENNA, "D3", NOW)
    assert (entry is None) == bool(errors)
    assert set(errors) <= {*FIELDS}
    judged_wading(*forms.parse_wading(form, VIENNA), SETTINGS)
    if entry is not None:
        json.dumps([entry.facts, entry.entered, entry.seen])
