import math

import pytest

from calc.quality_oxygen import (
    air_signature,
    frozen_value,
    oxygen_unlikely,
    percent_against_concentration,
    percent_as_concentration,
    replicate_conductance,
    replicate_spread,
    replicate_temperature,
    step_against_neighbour,
    step_against_prediction,
    supersaturation,
)
from calc.settings import Settings

SETTINGS = Settings()
NAN = math.nan


@pytest.mark.parametrize(
    ("do_mg_l", "found"), [(-0.05, True), (0.0, True), (0.19, True), (0.2, False), (15, False), (15.1, True)]
)
def test_oxygen_below_0_2_or_above_15_is_asked_about(do_mg_l, found):
    assert bool(oxygen_unlikely(do_mg_l, SETTINGS)) is found


@pytest.mark.parametrize("do_mg_l", [0.0, -0.05])
def test_oxygen_near_zero_is_kept_as_read_and_reported_as_a_limit(do_mg_l):
    (finding,) = oxygen_unlikely(do_mg_l, SETTINGS)
    assert f"{do_mg_l:.2f} mg/L is below 0.2" in finding.says
    assert "kept as read" in finding.do and "less than the limit" in finding.do
    assert finding.suggestion is None


@pytest.mark.parametrize(("do_mg_l", "found"), [(20, False), (20.1, True), (92, True)])
def test_more_than_20_in_the_concentration_box_looks_like_percent(do_mg_l, found):
    assert bool(percent_as_concentration(do_mg_l, 9.0, SETTINGS)) is found


def test_percent_in_the_concentration_box_is_offered_as_concentration():
    (finding,) = percent_as_concentration(92, 9.0, SETTINGS)
    assert finding.suggestion == {"do_mg_l": 8.28, "do_percent_meter": 92.0}
    assert "8.28 mg/L" in finding.says


def test_without_saturation_no_conversion_is_offered():
    (finding,) = percent_as_concentration(92, NAN, SETTINGS)
    assert finding.suggestion is None


@pytest.mark.parametrize(("percent", "found"), [(53.0, False), (53.1, True), (47.0, False), (46.9, True)])
def test_meter_percent_more_than_3_points_off_is_asked_about(percent, found):
    # Saturation 8: 4 mg/L is 50 %, and 3 points are 0.24 mg/L, inside the other limit.
    assert bool(percent_against_concentration(4.0, percent, 8.0, NAN, SETTINGS)) is found


@pytest.mark.parametrize(("percent", "found"), [(52.5, False), (52.6, True), (47.5, False), (47.4, True)])
def test_meter_percent_worth_more_than_0_3_mg_l_is_asked_about(percent, found):
    # Saturation 12: 0.3 mg/L are 2.5 points, inside the other limit.
    assert bool(percent_against_concentration(6.0, percent, 12.0, NAN, SETTINGS)) is found


def test_percent_relative_to_760_mmhg_is_recognised():
    # At 1000 m and 20 °C saturation is 8.04 mg/L, at 760 mmHg 9.09: 6 mg/L is 74.6 % here and 66.0 % there.
    (finding,) = percent_against_concentration(6.0, 66.0, 8.04, 9.09, SETTINGS)
    assert "relative to 760 mmHg" in finding.cause
    assert "74.6 %" in finding.says and "66.0 % would be 5.31 mg/L" in finding.says


def test_a_percentage_neither_basis_explains_points_at_the_settings():
    (finding,) = percent_against_concentration(6.0, 90.0, 8.04, 9.09, SETTINGS)
    assert "pressure, salinity or percent setting" in finding.cause


def test_the_same_number_in_both_boxes_is_recognised():
    (finding,) = percent_against_concentration(8.3, 8.3, 9.09, 9.09, SETTINGS)
    assert "same number" in finding.cause


@pytest.mark.parametrize(("percent", "found"), [(100, False), (119.9, False), (120, False), (120.1, True), (182, True)])
def test_supersaturation_is_asked_about_above_120_percent(percent, found):
    assert bool(supersaturation(percent, SETTINGS)) is found


def test_supersaturation_may_be_kept():
    (finding,) = supersaturation(182, SETTINGS)
    assert "182 %" in finding.says
    for cause in ("Bubbles", "weir", "pressure", "photosynthesis"):
        assert cause in finding.cause
    assert finding.suggestion is None


@pytest.mark.parametrize(("do_mg_l", "found"), [(7.3, False), (7.29, True), (9.3, False), (9.31, True)])
def test_step_of_more_than_1_mg_l_against_a_neighbour_is_asked_about(do_mg_l, found):
    assert bool(step_against_neighbour(do_mg_l, 8.3, SETTINGS, side="upstream")) is found


@pytest.mark.parametrize(("do_mg_l", "found"), [(6.7, False), (6.69, True)])
def test_a_wide_band_widens_the_step_against_a_neighbour(do_mg_l, found):
    assert bool(step_against_neighbour(do_mg_l, 8.3, SETTINGS, side="upstream", band_half_mg_l=0.8)) is found


def test_a_step_the_plan_expects_is_no_finding():
    assert step_against_neighbour(5.0, 8.3, SETTINGS, side="upstream", expected_step_mg_l=-2.5) == ()


def test_a_missing_step_the_plan_expects_is_a_finding():
    (finding,) = step_against_neighbour(8.3, 8.3, SETTINGS, side="upstream", expected_step_mg_l=-2.5)
    assert "8.30 mg/L is the same as the next station upstream, 8.30" in finding.says
    assert "2.50 mg/L lower than there" in finding.says


def test_a_point_off_the_centre_is_named_as_a_cause():
    (left,) = step_against_neighbour(5.0, 8.3, SETTINGS, side="downstream", position="left")
    (centre,) = step_against_neighbour(5.0, 8.3, SETTINGS, side="downstream", position="centre")
    assert "(left) is not mixed" in left.cause
    assert "not mixed" not in centre.cause
    assert "3.30 mg/L lower than the next station downstream" in left.says


@pytest.mark.parametrize(
    ("do_mg_l", "low", "high", "found"),
    [
        (5.0, NAN, NAN, False),
        (4.99, NAN, NAN, True),
        (7.01, NAN, NAN, True),
        (4.99, 5.8, 6.2, True),
        (4.6, 5.3, 6.7, False),
        (4.59, 5.3, 6.7, True),
    ],
)
def test_step_against_prediction_is_the_larger_of_1_mg_l_and_the_whole_band(do_mg_l, low, high, found):
    assert bool(step_against_prediction(do_mg_l, 6.0, low, high, SETTINGS)) is found


@pytest.mark.parametrize(
    ("do_mg_l", "replicate", "found"),
    [
        (6.2, 6.0, False),
        (6.21, 6.0, True),
        (5.79, 6.0, True),
        (1.3, 1.0, False),
        (1.31, 1.0, True),
        (2.1, 1.9, False),
        (2.11, 1.9, True),
    ],
)
def test_replicates_agree_within_0_2_and_below_2_mg_l_within_0_3(do_mg_l, replicate, found):
    assert bool(replicate_spread(do_mg_l, replicate, SETTINGS)) is found


@pytest.mark.parametrize(("water_temp_c", "found"), [(15.2, False), (15.3, True), (14.8, False), (14.7, True)])
def test_replicate_temperature_agrees_within_0_2(water_temp_c, found):
    assert bool(replicate_temperature(water_temp_c, 15.0, SETTINGS)) is found


@pytest.mark.parametrize(("conductance", "found"), [(515, False), (516, True), (485, False), (484, True)])
def test_replicate_conductance_agrees_within_3_percent(conductance, found):
    assert bool(replicate_conductance(conductance, 500, SETTINGS)) is found


@pytest.mark.parametrize(
    ("percent", "water_temp_c", "found"),
    [
        (97, 18, True),
        (96.9, 18, False),
        (103, 18, True),
        (103.1, 18, False),
        (100, 18.5, True),
        (100, 18.6, False),
        (100, 17.5, True),
        (100, 17.4, False),
    ],
)
def test_saturated_and_as_warm_as_the_air_looks_like_air(percent, water_temp_c, found):
    findings = air_signature(percent, water_temp_c, 18.0, SETTINGS)
    assert bool(findings) is found
    assert all("Is the probe in the water?" in finding.do for finding in findings)


def test_without_the_air_temperature_saturated_water_is_not_taken_for_air():
    assert air_signature(100, 18, NAN, SETTINGS) == ()


@pytest.mark.parametrize(
    ("recent", "found"),
    [
        ((), False),
        ((8.21,), False),
        ((8.21, 8.21), True),
        ((8.21, 8.20), False),
        ((8.21, 8.22), False),
        ((7.0, 8.21, 8.21), True),
        ((8.21, 7.0, 8.21), False),
        ((8.21, NAN), False),
    ],
)
def test_the_same_value_at_three_stations_running_is_frozen(recent, found):
    assert bool(frozen_value(8.21, recent, SETTINGS)) is found


def test_a_river_without_oxygen_is_not_frozen():
    assert frozen_value(0.0, (0.0, 0.0), SETTINGS) == ()


def test_missing_values_give_no_finding():
    for missing in (NAN, None, math.inf):
        assert oxygen_unlikely(missing, SETTINGS) == ()
        assert percent_as_concentration(missing, 9.0, SETTINGS) == ()
        assert percent_against_concentration(missing, 90, 9.0, 9.0, SETTINGS) == ()
        assert percent_against_concentration(5, missing, 9.0, 9.0, SETTINGS) == ()
        assert percent_against_concentration(5, 90, missing, 9.0, SETTINGS) == ()
        assert supersaturation(missing, SETTINGS) == ()
        assert step_against_neighbour(5, missing, SETTINGS, side="upstream") == ()
        assert step_against_prediction(5, missing, 4, 6, SETTINGS) == ()
        assert replicate_spread(5, missing, SETTINGS) == ()
        assert replicate_temperature(missing, 5, SETTINGS) == ()
        assert replicate_conductance(500, missing, SETTINGS) == ()
        assert frozen_value(missing, (8.21, 8.21), SETTINGS) == ()


def test_nothing_divides_by_zero():
    assert percent_against_concentration(5, 90, 0, 0, SETTINGS) == ()
    assert replicate_conductance(500, 0, SETTINGS) == ()
