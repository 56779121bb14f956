import math

import pytest

from calc.quality_water import (
    conductance_high,
    conductance_step,
    depth_unlikely,
    sensor_depth,
    temperature_step,
    temperature_unit,
    temperature_unlikely,
    velocity_unlikely,
)
from calc.settings import Settings

SETTINGS = Settings()
NAN = math.nan


def names(findings):
    return [finding.name for finding in findings]


def test_68_among_twenties_is_offered_as_fahrenheit():
    (finding,) = temperature_unit(68, (20.5, 19.8, NAN), SETTINGS)
    assert finding.suggestion == {"water_temp_c": 20.0}
    assert "20.0 °C" in finding.do


@pytest.mark.parametrize(
    ("entered", "nearby", "found"), [(32.9, 1, False), (33, 1, True), (104, 39, True), (104.1, 39, False)]
)
def test_fahrenheit_is_looked_for_from_33_to_104(entered, nearby, found):
    assert bool(temperature_unit(entered, (nearby,), SETTINGS)) is found


def test_a_warm_reading_among_warm_neighbours_is_no_fahrenheit():
    assert temperature_unit(34, (33, 32), SETTINGS) == ()


def test_a_reading_whose_conversion_lies_further_off_is_no_fahrenheit():
    # 35 °F is 1.7 °C, further from 25 than 35 is.
    assert temperature_unit(35, (25,), SETTINGS) == ()


@pytest.mark.parametrize(("entered", "found"), [(40, False), (40.1, True), (68, True)])
def test_with_nothing_nearby_only_what_no_river_reaches_is_taken_for_fahrenheit(entered, found):
    assert bool(temperature_unit(entered, (NAN, None), SETTINGS)) is found


def test_neighbours_that_are_no_water_temperatures_are_not_believed():
    # 66 is itself a slip, so it does not vouch for 68.
    (finding,) = temperature_unit(68, (66, 20), SETTINGS)
    assert "nearby it is 20.0 °C" in finding.says


@pytest.mark.parametrize(("water_temp_c", "found"), [(-0.1, True), (0, False), (35, False), (35.1, True)])
def test_temperature_below_0_or_above_35_is_unlikely(water_temp_c, found):
    assert bool(temperature_unlikely(water_temp_c, SETTINGS)) is found


@pytest.mark.parametrize(("water_temp_c", "found"), [(21.3, False), (21.4, True), (15.3, False), (15.2, True)])
@pytest.mark.parametrize("neighbours", [(18.3, NAN), (NAN, 18.3)])
def test_temperature_step_of_more_than_3_is_asked_about(water_temp_c, found, neighbours):
    assert bool(temperature_step(water_temp_c, *neighbours, SETTINGS)) is found


def test_the_larger_temperature_step_is_told():
    (finding,) = temperature_step(20, 16, 14, SETTINGS)
    assert "6.0 °C warmer than the next station downstream, 14.0 °C" in finding.says


@pytest.mark.parametrize(("conductance", "found"), [(550, False), (551, True), (450, False), (449, True)])
def test_conductance_step_of_more_than_10_percent_is_asked_about(conductance, found):
    assert bool(conductance_step(conductance, 500, NAN, SETTINGS)) is found
    assert bool(conductance_step(conductance, NAN, 500, SETTINGS)) is found


def test_conductance_against_a_neighbour_of_zero_gives_no_finding():
    assert conductance_step(500, 0, -1, SETTINGS) == ()


@pytest.mark.parametrize(("conductance", "found"), [(2000, False), (2001, True)])
def test_conductance_above_2000_needs_salinity(conductance, found):
    assert bool(conductance_high(conductance, 20, SETTINGS)) is found


def test_the_effect_of_salinity_is_told_where_it_can_be():
    # 5000 µS/cm lowers saturation by about 0.15 mg/L near 20 °C.
    assert "about 0.15 mg/L" in conductance_high(5000, 20, SETTINGS)[0].says
    assert "mg/L" not in conductance_high(90000, 20, SETTINGS)[0].says
    assert "mg/L" not in conductance_high(5000, NAN, SETTINGS)[0].says


@pytest.mark.parametrize(("depth_m", "name"), [(15, []), (15.1, ["depth_unlikely"]), (0.3, [])])
def test_depth_above_15_m_is_unlikely(depth_m, name):
    assert names(depth_unlikely(depth_m, NAN, SETTINGS)) == name
    assert names(depth_unlikely(depth_m, 0, SETTINGS)) == name


@pytest.mark.parametrize(
    ("depth_m", "found"), [(2.80, True), (3.28, True), (3.77, True), (2.78, False), (3.78, False), (1.0, False)]
)
def test_depth_near_3_28_times_the_plan_looks_like_feet(depth_m, found):
    # The limits are 0.85 and 1.15 times 3.2808.
    assert (names(depth_unlikely(depth_m, 1.0, SETTINGS)) == ["depth_unit"]) is found


def test_feet_are_offered_as_metres():
    (finding,) = depth_unlikely(4.0, 1.2, SETTINGS)
    assert finding.suggestion == {"depth_m": 1.22}
    assert "3.3 times the planned 1.20 m" in finding.says


@pytest.mark.parametrize(
    ("sensor_m", "expected"),
    [
        (0.09, ["sensor_at_surface"]),
        (0.1, []),
        (0.6, []),
        (0.9, []),
        (0.91, ["sensor_near_bed"]),
        (1.0, ["sensor_near_bed"]),
        (1.01, ["sensor_below_bed"]),
        (NAN, []),
    ],
)
def test_the_sensor_keeps_clear_of_surface_and_bed(sensor_m, expected):
    assert names(sensor_depth(sensor_m, 1.0, SETTINGS)) == expected


def test_without_the_depth_only_the_surface_is_checked():
    assert names(sensor_depth(0.05, NAN, SETTINGS)) == ["sensor_at_surface"]
    assert sensor_depth(5.0, NAN, SETTINGS) == ()


def test_water_too_shallow_for_both_limits_is_told_so():
    (shallow,) = sensor_depth(0.1, 0.15, SETTINGS)
    (deep,) = sensor_depth(0.95, 1.0, SETTINGS)
    assert "too shallow" in shallow.do
    assert "0.6 of the depth" in deep.do


@pytest.mark.parametrize(
    ("velocity_m_s", "found"), [(-0.1, True), (0.019, True), (0.02, False), (2, False), (2.01, True), (0.0, True)]
)
def test_velocity_below_0_02_or_above_2_is_unlikely(velocity_m_s, found):
    assert bool(velocity_unlikely(velocity_m_s, SETTINGS)) is found


def test_velocity_against_the_stream_is_told_so():
    (finding,) = velocity_unlikely(-0.1, SETTINGS)
    assert "upstream" in finding.says


def test_missing_values_give_no_finding():
    for missing in (NAN, None, math.inf):
        assert temperature_unit(missing, (20,), SETTINGS) == ()
        assert temperature_unlikely(missing, SETTINGS) == ()
        assert temperature_step(missing, 20, 20, SETTINGS) == ()
        assert temperature_step(20, missing, missing, SETTINGS) == ()
        assert conductance_step(missing, 500, 500, SETTINGS) == ()
        assert conductance_high(missing, 20, SETTINGS) == ()
        assert depth_unlikely(missing, 1, SETTINGS) == ()
        assert sensor_depth(missing, 1, SETTINGS) == ()
        assert velocity_unlikely(missing, SETTINGS) == ()
