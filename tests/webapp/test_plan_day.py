import copy

import pytest

from tests.webapp.planning import set_survey
from tests.webapp.plans import PLAN, put_plan
from webapp.display import Show
from webapp.plan import queries
from webapp.plan.day import day_changes, predict_today, today_of, today_tables
from webapp.plan.prediction import predict_plan, prediction_of
from webapp.plan.service import replace_table

ELEVATION_M = 210.0
# U2 = U1 (Q2/Q1)^0.34, H2 = H1 (Q2/Q1)^0.40, W2 = W1 (Q2/Q1)^0.26 (Leopold & Maddock 1953), above the outfall halved.
HALF = {"velocity_m_s": 0.24 * 0.5**0.34, "depth_m": 0.9 * 0.5**0.40, "width_m": 12.0 * 0.5**0.26}


def with_day(day=None, reaches=(), plan=PLAN):
    return {**copy.deepcopy(plan), "day": [day or {}], "day_reaches": list(reaches)}


def reach(tables, number=0):
    return today_tables(tables, ELEVATION_M)["reaches"][number]


def test_halved_flow_rescales_velocity_depth_and_width_by_the_rating_exponents():
    changed = reach(with_day({"river_flow_m3_s": 0.9}))
    assert {key: changed[key] for key in HALF} == pytest.approx(HALF)
    assert changed["velocity_m_s"] * changed["depth_m"] * changed["width_m"] == pytest.approx(0.5 * 0.24 * 0.9 * 12.0)


def test_below_the_outfall_the_ratio_is_that_of_the_flow_there():
    changed = reach(with_day({"river_flow_m3_s": 0.9, "outfall_flow_m3_s": 0.7}), 1)
    assert changed["velocity_m_s"] == pytest.approx(0.26 * ((0.9 + 0.7) / (1.8 + 0.35)) ** 0.34)


def test_travel_times_follow_the_flow():
    planned, today = predict_plan(PLAN, ELEVATION_M), predict_today(with_day({"river_flow_m3_s": 0.9}), ELEVATION_M)
    ratio = (0.9 + 0.35) / (1.8 + 0.35)
    assert today.at(5.0).travel_time_h == pytest.approx(planned.at(5.0).travel_time_h * ratio**-0.34)
    assert today.at(27.0).travel_time_h > planned.at(27.0).travel_time_h


def test_reach_without_an_entered_velocity_rescales_from_the_planned_one():
    planned = predict_plan(PLAN, ELEVATION_M).reach_rates[2]
    today = predict_today(with_day({"river_flow_m3_s": 3.6}), ELEVATION_M).reach_rates[2]
    assert today.velocity_m_s == pytest.approx(planned.velocity_m_s * (today.flow_m3_s / planned.flow_m3_s) ** 0.34)
    assert today.velocity_why == "planned, at today's flow"


@pytest.mark.parametrize(
    ("measured", "velocity", "why"),
    [
        ({"velocity_m_s": 0.31}, 0.31, "measured today"),
        ({"travel_time_h": 10.0}, 7.2 / 36, "today's dye"),
        ({"velocity_m_s": 0.31, "travel_time_h": 10.0}, 7.2 / 36, "today's dye"),
    ],
)
def test_what_was_measured_in_a_reach_stands_before_what_the_flow_says(measured, velocity, why):
    tables = with_day({"river_flow_m3_s": 0.9}, [{"reach": "Willow glides", "from_km": 0.0, **measured}])
    rates = predict_today(tables, ELEVATION_M).reach_rates[1]
    assert (rates.velocity_m_s, rates.velocity_why) == (pytest.approx(velocity), why)


def test_reach_measured_at_freezing_point_is_so_cold():
    tables = with_day(reaches=[{"reach": "Willow glides", "from_km": 0.0, "water_temp_c": 0.0}])
    assert predict_today(tables, ELEVATION_M).reach_rates[1].water_temp_c == 0.0


def test_dye_time_is_the_travel_time_through_the_reach():
    tables = with_day(reaches=[{"reach": "Willow glides", "from_km": 0.0, "travel_time_h": 9.0}])
    assert predict_today(tables, ELEVATION_M).at(7.2).travel_time_h == pytest.approx(9.0)


def test_stronger_outfall_replaces_the_planned_strength_and_lowers_the_sag():
    plan = copy.deepcopy(PLAN)
    plan["waters"][1] |= {"cbod_ultimate_mg_l": 60.0}
    tables = with_day({"outfall_bod5_mg_l": 120.0, "outfall_do_mg_l": 2.0}, plan=plan)
    outfall = today_tables(tables, ELEVATION_M)["waters"][1]
    assert (outfall["bod5_mg_l"], outfall.get("cbod_ultimate_mg_l")) == (120.0, None)
    assert (outfall["do_mg_l"], outfall.get("do_percent")) == (2.0, None)
    planned, today = predict_plan(plan, ELEVATION_M), predict_today(tables, ELEVATION_M)
    assert today.critical.do_mg_l < planned.critical.do_mg_l - 0.3


def test_warmer_river_shifts_planned_reach_temperatures_as_the_mixture_below_the_outfall():
    plan = copy.deepcopy(PLAN)
    for row in plan["reaches"][:2]:
        row["water_temp_c"] = 20.0
    tables = with_day({"river_temp_c": 21.5}, plan=plan)
    assert reach(tables)["water_temp_c"] == pytest.approx(22.0)
    assert reach(tables, 1)["water_temp_c"] == pytest.approx(20.0 + 2.0 * 1.8 / (1.8 + 0.35))
    tables["day_reaches"] = [{"reach": "Willow glides", "from_km": 0.0, "water_temp_c": 23.4}]
    assert reach(tables, 1)["water_temp_c"] == 23.4


def test_day_without_measurements_or_with_only_times_is_the_plan():
    assert not day_changes(PLAN) and not day_changes(with_day({"crew_until": "2026-08-12T18:00:00+00:00"}))
    today, planned = (predict_today(each, ELEVATION_M) for each in (with_day({"closeout_min": 20.0}), PLAN))
    assert (today.do_mg_l == planned.do_mg_l).all()


@pytest.mark.parametrize(
    ("day", "reaches"),
    [
        ({"river_flow_m3_s": 1e5}, []),
        ({"river_flow_m3_s": 1e-4, "outfall_flow_m3_s": 0.0}, []),
        ({"outfall_bod5_mg_l": 5e4, "river_temp_c": 40.0, "outfall_temp_c": 0.0}, []),
        ({}, [{"reach": "gone", "from_km": 3.3, "velocity_m_s": 0.2}]),
        ({}, [{"reach": "Willow glides", "from_km": 0.0, "travel_time_h": 0.01}]),
        ({}, [{"reach": "Willow glides", "from_km": 0.0, "travel_time_h": 2000.0, "depth_m": 60.0}]),
    ],
)
def test_no_day_that_the_form_takes_breaks_a_prediction(day, reaches):
    today = predict_today(with_day(day, reaches), ELEVATION_M)
    assert today.ready or all(today.missing)


def test_day_of_an_incomplete_plan_says_what_the_plan_needs():
    today = predict_today({**with_day({"river_flow_m3_s": 1.0}), "waters": PLAN["waters"][:1]}, ELEVATION_M)
    assert today.missing == ("Add the outfall under Waters that meet.",)


def test_plan_as_planned_stays_beside_the_day_and_both_are_kept(db, survey, people):
    version = put_plan(db, survey, people["lead"], tables=with_day({"river_flow_m3_s": 0.9}))
    planned, today = prediction_of(survey, version), today_of(survey, version)
    assert (planned.do_mg_l == predict_plan(PLAN, survey.elevation_m).do_mg_l).all()
    assert today.critical.travel_time_h != planned.critical.travel_time_h
    assert today_of(survey, version) is today


def test_today_is_the_plan_itself_where_nothing_was_entered(db, survey, people):
    version = put_plan(db, survey, people["lead"])
    assert today_of(survey, version) is prediction_of(survey, version)
    assert not today_of(survey, None).ready


def test_reach_measured_and_then_taken_out_of_the_plan_is_said_to_be_unused():
    gone = {"reach": "Old channel", "from_km": 3.3, "velocity_m_s": 0.2}
    today = predict_today(with_day(reaches=[gone]), ELEVATION_M)
    said = [note.said(Show()) for note in today.warnings]
    assert "What the day showed in reach Old channel is not used: no reach begins there any more." in said
    assert (today.do_mg_l == predict_plan(PLAN, ELEVATION_M).do_mg_l).all()


@pytest.fixture
def plan(db, survey, people):
    return put_plan(db, survey, people["lead"])


@pytest.fixture
def address(survey):
    return f"/surveys/{survey.id}/plan/day"


@pytest.fixture
def stored(app, survey):
    def current():
        with app.extensions["bankside_database"].reading() as session:
            return queries.current_plan(session, survey.id)

    return current


TYPED = {"based_on": "1", "river_flow_m3_s": "1,2", "velocity_m_s_1": "0.31", "crew_until": "2026-08-12T19:30",
         "reachable_anywhere": "yes", "version_reason": "gauged at dawn"}  # fmt: skip


def test_saved_day_is_a_new_version_with_its_reason_and_the_planned_tables_unchanged(plan, stored, address, browser_as):
    lead = browser_as("lead")
    answer = lead.post(address, form=TYPED)
    assert (answer.status_code, answer.location.endswith("/sheet")) == (303, True)
    version = stored()
    assert (version.number, version.reason) == (2, "gauged at dawn")
    assert version.tables["day"] == [
        {"river_flow_m3_s": 1.2, "crew_until": "2026-08-12T17:30:00+00:00", "reachable_anywhere": True}
    ]
    assert version.tables["day_reaches"] == [{"reach": "Willow glides", "from_km": 0.0, "velocity_m_s": 0.31}]
    assert version.tables["reaches"] == PLAN["reaches"] and version.tables["waters"] == PLAN["waters"]
    form = lead.get(address).text
    for value in ("1.2", "0.31", "2026-08-12T19:30", "checked"):
        assert value in form
    page = lead.get(address.removesuffix("/day")).text
    assert "1.200 m³/s" in page and "Wed 12 Aug 19:30" in page


def test_day_stays_when_another_table_of_the_plan_changes(db, plan, stored, survey, people, address, browser_as):
    browser_as("lead").post(address, TYPED)
    kept = stored().tables["day"]
    replace_table(db, survey, "weirs", [], "the weir was taken out", people["lead"].id)
    assert (stored().number, stored().tables["day"]) == (3, kept)


def test_emptied_day_is_the_plan_again(plan, stored, address, browser_as, survey):
    lead = browser_as("lead")
    lead.post(address, form=TYPED)
    assert lead.post(address, form={"based_on": "2", "version_reason": "wrong gauge"}).status_code == 303
    assert stored().tables["day"] == [{}]
    assert today_of(survey, stored()) is prediction_of(survey, stored())


@pytest.mark.parametrize(
    ("field", "typed"),
    [
        ("river_flow_m3_s", "a lot"),
        ("river_flow_m3_s", "0"),
        ("river_temp_c", "71"),
        ("outfall_flow_m3_s", "-1"),
        ("outfall_bod5_mg_l", "nan"),
        ("outfall_do_mg_l", "99"),
        ("outfall_temp_c", "inf"),
        ("crew_until", "tea time"),
        ("bottles_until", "2026-13-01T00:00"),
        ("drive_to_lab_min", "1e9"),
        ("closeout_min", "-3"),
        ("latitude", "95"),
        ("velocity_m_s_1", "0"),
        ("travel_time_h_2", "1,234"),
        ("depth_m_0", "\u0663"),
        ("water_temp_c_3", "50"),
        ("version_reason", "x" * 401),
    ],
)
def test_each_bad_field_is_named_and_what_was_typed_stays(plan, stored, address, browser_as, field, typed):
    data = TYPED | {"longitude": "16.2", "latitude": "48.1", field: typed}
    answer = browser_as("lead").post(address, form=data)
    assert answer.status_code == 422 and f'id="{field}-error"' in answer.text
    assert 'value="1,2"' in answer.text or field == "river_flow_m3_s"
    assert typed in answer.text
    assert stored().number == 1


def test_one_half_of_a_position_is_asked_to_be_whole(plan, address, browser_as):
    assert "Enter the longitude too" in browser_as("lead").post(address, form={"latitude": "48"}).text


def test_preview_says_the_effect_in_words_with_and_without_htmx_and_saves_nothing(plan, stored, address, browser_as):
    lead = browser_as("lead")
    page = lead.post(f"{address}/look", form=TYPED).text
    part = lead.post(f"{address}/look", form=TYPED, htmx=True).text
    assert "<html" in page and "<html" not in part
    for words in ("As planned: lowest oxygen", "With the day&#39;s conditions: lowest oxygen", "instead of"):
        assert words in page and words in part
    assert stored().number == 1


def test_preview_of_a_bad_field_uses_the_others(plan, address, browser_as):
    data = TYPED | {"river_temp_c": "warm"}
    answer = browser_as("lead").post(f"{address}/look", form=data, htmx=True)
    assert answer.status_code == 422 and "One entry" in answer.text and "With the day" in answer.text


def test_planned_values_stand_beside_the_fields_in_the_units_shown(app, plan, survey, address, browser_as):
    set_survey(app, survey, unit_system="us")
    page = browser_as("lead").get(address).text
    assert "Planned 63.57 ft³/s" in page and "Planned 0.85 ft/s" in page  # 1.8 m³/s, 0.26 m/s
    assert "Planned 67.1 °F" in page


def test_flow_typed_in_us_units_is_stored_in_si(app, plan, stored, survey, address, browser_as):
    set_survey(app, survey, unit_system="us")
    browser_as("lead").post(address, form={"based_on": "1", "river_flow_m3_s": "63.57"})
    assert stored().tables["day"][0]["river_flow_m3_s"] == pytest.approx(1.8, abs=0.001)


def test_day_saved_on_an_overtaken_plan_is_refused_and_kept(plan, stored, address, browser_as):
    lead = browser_as("lead")
    lead.post(address, form=TYPED)
    answer = lead.post(address, form=TYPED | {"river_flow_m3_s": "1.5"})
    assert answer.status_code == 409 and "meanwhile" in answer.text and 'value="1.5"' in answer.text
    assert stored().number == 2


def test_crew_may_not_change_the_day(plan, address, browser_as):
    crew = browser_as("crew")
    assert [crew.get(address).status_code, crew.post(address).status_code] == [403, 403]
    assert crew.post(f"{address}/look").status_code == 403


@pytest.mark.parametrize("path", ["", "/look"])
def test_day_of_another_crews_survey_is_not_found(plan, browser_as, path):
    assert browser_as("lead").post(f"/surveys/somewhere/plan/day{path}", form=TYPED).status_code == 404


def test_survey_without_a_plan_has_no_day(survey, address, browser_as):
    lead = browser_as("lead")
    assert "There is no plan yet" in lead.get(address).text
    assert lead.post(address, form=TYPED).status_code == 422


def test_incomplete_plan_can_still_take_the_day(db, survey, people, stored, address, browser_as):
    put_plan(db, survey, people["lead"], tables={**PLAN, "reaches": []})
    lead = browser_as("lead")
    assert "The plan is not complete" in lead.get(address).text
    assert lead.post(address, form={"based_on": "1", "river_flow_m3_s": "1.2"}).status_code == 303
    assert lead.get(address).status_code == 200
