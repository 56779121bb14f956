import copy

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.webapp.plans import PLAN, put_plan
from webapp.charts import sag_chart
from webapp.display import Show
from webapp.errors import NotFound
from webapp.plan import queries
from webapp.plan.prediction import Unready, predict_plan, prediction_of
from webapp.plan.tables import PLAN_TABLES


@pytest.fixture(scope="module")
def predicted():
    return predict_plan(PLAN, 210.0)


def test_band_encloses_the_prediction_everywhere(predicted):
    assert (predicted.low_mg_l <= predicted.do_mg_l).all()
    assert (predicted.do_mg_l <= predicted.high_mg_l).all()
    assert (predicted.low_mg_l >= 0).all()


def test_critical_point_is_the_lowest_of_the_grid_below_the_outfall(predicted):
    below = predicted.do_mg_l[predicted.grid_km >= 0]
    assert predicted.critical.do_mg_l <= below.min()
    assert predicted.critical.do_mg_l == pytest.approx(below.min(), abs=0.01)


def test_interval_of_the_critical_point_holds_it(predicted):
    interval, critical = predicted.critical_interval, predicted.critical
    assert interval.low_km <= critical.distance_km <= interval.high_km
    assert interval.low_h <= critical.travel_time_h <= interval.high_h
    assert interval.low_mg_l <= critical.do_mg_l <= interval.high_mg_l


def test_mixing_is_the_flow_weighted_mean(predicted):
    mixing = predicted.mixing
    assert mixing.flow_m3_s == pytest.approx(2.15)
    assert mixing.water_temp_c == pytest.approx((1.8 * 19.5 + 0.35 * 22.0) / 2.15)
    assert mixing.conductance_us_cm == pytest.approx((1.8 * 310 + 0.35 * 890) / 2.15)
    assert mixing.deficit_mg_l == pytest.approx(mixing.saturation_mg_l - mixing.do_mg_l)


def test_place_between_grid_points_is_predicted_exactly(predicted):
    here = predicted.at(12.4)
    assert here.do_mg_l == pytest.approx(np.interp(12.4, predicted.grid_km, predicted.do_mg_l), abs=0.01)
    assert here.low_mg_l < here.do_mg_l < here.high_mg_l
    assert here.do_mg_l == pytest.approx(here.saturation_mg_l - here.deficit_mg_l)
    assert here.depth_m == 1.1


def test_oxygen_jumps_at_a_weir(predicted):
    assert predicted.at(22.0).do_mg_l - predicted.at(21.9999).do_mg_l > 1


@pytest.mark.parametrize("distance_km", [-1.01, 30.01, None, float("nan")])
def test_outside_the_river_nothing_is_predicted(predicted, distance_km):
    assert predicted.at(distance_km) is None


def test_travel_time_counts_from_the_outfall(predicted):
    assert predicted.at(0.0).travel_time_h == 0
    assert predicted.at(7.2).travel_time_h == pytest.approx(7.2 / (3.6 * 0.26))
    assert predicted.at(-0.5).travel_time_h < 0


def test_band_narrows_with_the_plans_doubts(predicted):
    tables = copy.deepcopy(PLAN)
    names = ("sd_kd", "sd_ka", "sd_velocity", "sd_cbod", "sd_nbod", "sd_deficit_mg_l")
    tables["basis"] = [dict.fromkeys(names, 0.0)]
    surer = predict_plan(tables, 210.0)
    widths = [(one.high_mg_l - one.low_mg_l)[one.grid_km > 1].max() for one in (surer, predicted)]
    assert widths[0] < 0.5 * widths[1]


def test_doubt_that_is_no_doubt_any_more_is_named():
    tables = copy.deepcopy(PLAN)
    tables["basis"] = [{"sd_deficit_mg_l": 4.0}]
    (sentence,) = predict_plan(tables, 210.0).missing
    assert sentence.startswith("Rates and doubts: doubt about the deficit after mixing lies outside")


def test_mixing_distance_needs_width_and_slope(predicted):
    tables = copy.deepcopy(PLAN)
    tables["reaches"][1]["slope"] = None
    assert predicted.mix_km.low_km < predicted.mix_km.best_km < predicted.mix_km.high_km
    assert predict_plan(tables, 210.0).mix_km is None


def test_formula_outside_its_range_is_a_warning_in_the_surveys_units():
    tables = copy.deepcopy(PLAN)
    tables["reaches"][1]["ka_formula"] = "churchill"
    (warning,) = predict_plan(tables, 210.0).warnings
    assert "another range of velocity than 0.26 m/s" in warning.said(Show())
    assert "0.85 ft/s" in warning.said(Show(unit_system="us"))


def test_rates_are_given_at_the_temperature_of_the_water(predicted):
    rates = predicted.reach_rates[3]
    assert rates.ka_per_day == pytest.approx(4.2 * 1.024 ** (rates.water_temp_c - 20))


def test_incomplete_plan_is_unready_with_what_it_needs():
    unready = predict_plan({}, 210.0)
    assert isinstance(unready, Unready)
    assert "Add the outfall under Waters that meet." in unready.missing


def _cells():
    """Every number of the plan that a form lets in, as (table, row, key, lowest, highest)."""
    return [
        (name, row, column.key, column.low, column.high)
        for name, rows in PLAN.items()
        for row in range(len(rows))
        for column in PLAN_TABLES[name].columns
        if column.quantity not in ("text", "choice")
    ]


@settings(max_examples=40, deadline=None)
@given(
    st.lists(st.tuples(st.sampled_from(_cells()), st.sampled_from([None, 0.0, 0.001, 0.1, 0.5, 0.9, 1.0])), max_size=4),
    st.sampled_from([-430.0, 210.0, 6000.0]),
)
def test_whatever_a_form_lets_in_is_predicted_or_answered_in_words(cells, elevation_m):
    tables = copy.deepcopy(PLAN)
    for (name, row, key, low, high), share in cells:
        tables[name][row][key] = None if share is None else low + share * (high - low)
    answer = predict_plan(tables, elevation_m)
    if answer.ready:
        assert np.isfinite(answer.do_mg_l).all()
        assert (answer.low_mg_l >= 0).all()
        assert sag_chart(Show(), answer).sentence
    else:
        assert answer.missing
        assert "_" not in " ".join(answer.missing)


def test_stored_plan_is_predicted_once(db, survey, people):
    version = put_plan(db, survey, people["lead"])
    assert prediction_of(survey, version) is prediction_of(survey, version)


def test_survey_without_plan_is_unready(survey):
    assert prediction_of(survey, None).missing == ("Make a plan first.",)


def test_newest_version_is_the_current_plan(db, survey, people):
    put_plan(db, survey, people["lead"])
    second = put_plan(db, survey, people["lead"], number=2)
    assert queries.current_plan(db, survey.id).id == second.id
    assert [one.number for one in queries.plan_versions(db, survey.id)] == [2, 1]
    assert queries.get_version(db, survey.id, 1).made_by.name == people["lead"].name


def test_version_that_is_not_there_is_not_found(db, survey):
    assert queries.current_plan(db, survey.id) is None
    with pytest.raises(NotFound, match="no plan version"):
        queries.get_version(db, survey.id, 7)


def test_stations_are_known_by_their_codes(db, survey, people):
    put_plan(db, survey, people["lead"])
    assert list(queries.stations_of(db, survey.id)) == ["D1", "D2", "D3", "D4", "D5", "D6", "D7", "D8", "U1"]
