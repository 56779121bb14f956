"""Reaeration equations against published values, their ranges, weirs and temperature."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from calc import reaeration
from calc.errors import OutOfRangeError
from calc.oxygen import saturation_mg_l
from calc.reaeration import (
    FORMULAS,
    VALID,
    WEIR_QUALITY,
    WEIR_SHAPE,
    all_formulas,
    at_temperature,
    covar_choice,
    ka20,
    range_warnings,
    weir_deficit_ratio,
)
from calc.river import Thetas
from calc.units import FOOT_M
from tests.calc.rows import inputs, rows

KEY_OF_ROW = {
    "oconnor_dobbins_1958": "oconnor_dobbins",
    "churchill_1962_simplified_5.026": "churchill",
    "owens_gibbs_1964": "owens_gibbs",
    "tsivoglou_neal_1976": "tsivoglou_neal",
    "melching_flores_1999_pool_riffle": "melching_flores_pool_riffle",
    "melching_flores_1999_channel_control": "melching_flores_channel_control",
}
NAME_OF_SYMBOL = {"U": "velocity_m_s", "H": "depth_m", "S": "slope", "Q": "flow_m3_s", "W": "width_m"}
TABLE = rows("reaeration.csv", "formula", "inputs_si", "value", "tolerance")
VELOCITIES, DEPTHS = st.floats(0.01, 2), st.floats(0.05, 9)


def _named(text):
    return {NAME_OF_SYMBOL[symbol]: value for symbol, value in inputs(text).items() if symbol in NAME_OF_SYMBOL}


def _rows_of(*formulas):
    return [row for row in TABLE if row[0] in formulas]


@pytest.mark.parametrize(
    ("formula", "text", "expected", "tolerance"), [row for row in _rows_of(*KEY_OF_ROW) if "coef" not in row[1]]
)
def test_equation_agrees_with_published_value(formula, text, expected, tolerance):
    percent = float(tolerance.rstrip(" %"))
    assert ka20(KEY_OF_ROW[formula], **_named(text)) == pytest.approx(expected, rel=percent / 100)


def test_oconnor_with_a_textbook_coefficient_of_3_9_agrees_after_scaling():
    [(_, text, expected, tolerance)] = [row for row in TABLE if "coef=3.9" in row[1]]
    assert ka20("oconnor_dobbins", **_named(text)) * 3.9 / 3.93 == pytest.approx(expected, abs=tolerance)


@pytest.mark.parametrize(("formula", "text", "expected", "tolerance"), _rows_of("covar_1976_selection"))
def test_covar_chooses_as_published(formula, text, expected, tolerance):
    key, value = expected.split(":")
    named = _named(text)
    assert covar_choice(named["velocity_m_s"], named["depth_m"]) == key
    assert ka20("covar", **named) == pytest.approx(float(value), rel=1e-5)


@pytest.mark.parametrize(("formula", "text", "expected", "tolerance"), _rows_of("churchill_1962_full"))
def test_short_churchill_stays_near_the_full_equation(formula, text, expected, tolerance):
    # The full exponents are 0.969 and 1.673; at 0.1 m/s the short form is 7 % below, nowhere here more.
    assert ka20("churchill", **_named(text)) == pytest.approx(expected, rel=0.08)


@pytest.mark.parametrize(
    ("key", "coefficient", "power_of_u", "power_of_h"),
    [("oconnor_dobbins", 12.9, 0.5, -1.5), ("owens_gibbs", 21.6, 0.67, -1.85)],  # as printed for ft and ft/s
)
def test_equation_agrees_with_its_published_form_in_feet(key, coefficient, power_of_u, power_of_h):
    expected = coefficient * 1.2**power_of_u * 2.5**power_of_h
    assert ka20(key, velocity_m_s=1.2 * FOOT_M, depth_m=2.5 * FOOT_M) == pytest.approx(expected, rel=0.003)


def test_depth_in_feet_taken_as_metres_gives_a_sixth_of_oconnor():
    slip = ka20("oconnor_dobbins", velocity_m_s=0.3, depth_m=4.0)
    assert slip / ka20("oconnor_dobbins", velocity_m_s=0.3, depth_m=4.0 * FOOT_M) == pytest.approx(1 / 5.94, rel=0.001)


@given(VELOCITIES, DEPTHS)
def test_deeper_water_reaerates_more_slowly_and_faster_water_faster(velocity, depth):
    # Churchill multiplied by H^1.67 instead of divided would rise with depth.
    for key in ("oconnor_dobbins", "churchill", "owens_gibbs"):
        here = ka20(key, velocity_m_s=velocity, depth_m=depth)
        assert ka20(key, velocity_m_s=velocity, depth_m=depth * 1.1) < here
        assert ka20(key, velocity_m_s=velocity * 1.1, depth_m=depth) > here


@pytest.mark.parametrize(("velocity", "depth"), [(0.4, 0.61), (0.8, 3.45 * 0.8**2.5)])
def test_covar_jumps_at_its_limits(velocity, depth):
    above, below = (ka20("covar", velocity_m_s=velocity, depth_m=depth * share) for share in (1 - 1e-9, 1 + 1e-9))
    assert abs(above / below - 1) > 0.01


def test_covar_chooses_for_each_of_an_array():
    assert covar_choice([0.2, 0.1, 1.0], [0.45, 1.5, 1.0]).tolist() == ["owens_gibbs", "oconnor_dobbins", "churchill"]
    covar = reaeration.covar_per_day([0.2, 0.1, 1.0], [0.45, 1.5, 1.0])
    assert covar == pytest.approx([7.92791, 0.67648, 5.02600], rel=1e-5)  # published values of the three chosen


@pytest.mark.parametrize("key", FORMULAS)
def test_scalar_equals_array_and_missing_stays_missing(key):
    values = {"velocity_m_s": 0.4, "depth_m": 0.8, "slope": 0.001, "flow_m3_s": 0.5, "width_m": 9.0}
    arrays = {name: np.array([value, np.nan, value * 2]) for name, value in values.items()}
    doubled = {name: value * 2 for name, value in values.items()}
    assert ka20(key, **arrays) == pytest.approx([ka20(key, **values), np.nan, ka20(key, **doubled)], nan_ok=True)


@pytest.mark.parametrize("key", FORMULAS)
def test_each_argument_that_is_zero_or_negative_is_refused_by_name(key):
    values = {"velocity_m_s": 0.4, "depth_m": 0.8, "slope": 0.001, "flow_m3_s": 0.5, "width_m": 9.0}
    for name in FORMULAS[key].arguments:
        with pytest.raises(OutOfRangeError, match=f"{name} must be above 0"):
            ka20(key, **{**values, name: 0.0})
        with pytest.raises(OutOfRangeError, match=f"{name} must be between 0 and inf"):
            ka20(key, **{**values, name: -1.0})


def test_unknown_method_and_missing_argument_are_refused():
    with pytest.raises(OutOfRangeError, match="method must be one of oconnor_dobbins, .* got guess"):
        ka20("guess", velocity_m_s=0.3, depth_m=1.0)
    with pytest.raises(OutOfRangeError, match="slope must be given for Tsivoglou & Neal 1976"):
        ka20("tsivoglou_neal", velocity_m_s=0.3, flow_m3_s=1.0, slope=None)


@pytest.mark.parametrize("key", ["oconnor_dobbins", "churchill", "owens_gibbs"])
def test_inside_and_on_the_published_range_nothing_is_warned_of(key):
    low, high = ({name: bounds[end] for name, bounds in VALID[key].items()} for end in (0, 1))
    assert range_warnings(key, **low) == range_warnings(key, **high) == ()


def test_value_outside_the_published_range_comes_with_a_named_warning():
    [result] = [result for result in all_formulas(0.9, 0.65) if result.key == "oconnor_dobbins"]
    assert result.ka20_per_day == pytest.approx(7.11449, rel=1e-3)  # published value at U = 0.9, H = 0.65
    [warning] = result.warnings
    assert (warning.method, warning.argument, warning.value) == ("oconnor_dobbins", "velocity_m_s", 0.9)
    assert (warning.low, warning.high) == (0.15, 0.5)
    assert warning.message == "O'Connor & Dobbins 1958: velocity 0.9 m/s lies outside the published 0.15 to 0.5 m/s"


def test_covar_is_warned_of_by_the_equation_it_chooses():
    [warning] = range_warnings("covar", velocity_m_s=0.1, depth_m=1.5)
    assert warning.method == "oconnor_dobbins"
    assert range_warnings("covar", velocity_m_s=0.2) == ()


@pytest.mark.parametrize(
    ("flow", "said"),
    [
        (0.02, "outside the published"),
        (0.2, None),
        (0.4, "between the published small streams"),
        (5.0, None),
        (90.0, "outside the published 0.028 to 85 m³/s"),
    ],
)
def test_tsivoglou_neal_warns_below_between_and_above_its_ranges(flow, said):
    messages = [warning.message for warning in range_warnings("tsivoglou_neal", flow_m3_s=flow)]
    assert len(messages) == (said is not None)
    assert all(said in message for message in messages)


def test_tsivoglou_neal_changes_coefficient_at_ten_cubic_feet_a_second():
    below, above = (ka20("tsivoglou_neal", velocity_m_s=0.2, slope=0.001, flow_m3_s=flow) for flow in (0.283, 0.284))
    assert below / above == pytest.approx(0.11 / 0.054, rel=1e-3)  # the coefficients as printed, per foot


def test_every_equation_whose_arguments_are_known_is_listed():
    assert [result.key for result in all_formulas(0.3, 1.0)] == ["oconnor_dobbins", "churchill", "owens_gibbs", "covar"]
    assert [result.key for result in all_formulas(0.3, 1.0, 0.001, 4.0, 12.0)] == list(FORMULAS)
    assert all(result.label == FORMULAS[result.key].label for result in all_formulas(0.3, 1.0, 0.001, 4.0, 12.0))


WEIRS = rows(
    "weir.csv", "a_quality", "b_weir", "h_m", "t_c", "deficit_ratio_r", "deficit_below_mg_l", "do_below_mg_l_at_1atm"
)


@pytest.mark.parametrize(("quality", "shape", "drop", "temp_c", "expected", "deficit_below", "do_below"), WEIRS)
def test_weir_ratio_agrees_with_published_value(quality, shape, drop, temp_c, expected, deficit_below, do_below):
    ratio = weir_deficit_ratio(drop, temp_c, quality, shape)
    assert ratio == pytest.approx(expected, rel=1e-3)
    assert 3.0 / ratio == pytest.approx(deficit_below, rel=1e-3)
    assert saturation_mg_l(temp_c) - 3.0 / ratio == pytest.approx(do_below, rel=1e-3)


@given(st.floats(0, 4.4), st.sampled_from(sorted(WEIR_QUALITY)), st.sampled_from(sorted(WEIR_SHAPE)))
def test_higher_drop_of_cleaner_water_takes_away_more_of_the_deficit(drop, quality, shape):
    a, b = WEIR_QUALITY[quality], WEIR_SHAPE[shape]
    here = weir_deficit_ratio(drop, 15.0, a, b)
    assert 1 <= here < weir_deficit_ratio(drop + 0.1, 15.0, a, b)
    assert here <= weir_deficit_ratio(drop, 15.0, WEIR_QUALITY["clean"], b)


def test_weir_ratio_of_arrays_equals_that_of_scalars():
    ratios = weir_deficit_ratio([0.5, 1.0], [[10.0], [20.0]], 1.8, 0.8)
    assert ratios.shape == (2, 2)
    assert ratios[1, 1] == weir_deficit_ratio(1.0, 20.0, 1.8, 0.8)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((4.6, 20, 1, 0.8), "drop_m must be between 0 and 4.5 m, got 4.6 m"),
        ((-0.1, 20, 1, 0.8), "drop_m must be between 0 and 4.5 m"),
        ((1, 293, 1, 0.8), "water_temp_c must be between -1 and 45 °C"),
        ((1, 20, 0, 0.8), "quality must be above 0"),
        ((1, 20, 1, 1.6), "shape must be between 0 and 1.5"),
    ],
)
def test_weir_outside_its_range_is_refused(arguments, message):
    with pytest.raises(OutOfRangeError, match=message):
        weir_deficit_ratio(*arguments)


@pytest.mark.parametrize(("formula", "text", "expected", "tolerance"), _rows_of("theta_1.024"))
def test_temperature_factor_agrees_with_published_value(formula, text, expected, tolerance):
    assert at_temperature(1.0, inputs(text)["T"], Thetas().ka) == pytest.approx(expected, abs=tolerance)


def test_reaeration_does_not_take_the_factor_of_decay():
    assert Thetas().ka == 1.024
    slip, right = at_temperature(2.0, 28.0, 1.047), at_temperature(2.0, 28.0, Thetas().ka)
    assert slip / right == pytest.approx(1.195, abs=0.001)


def test_rate_at_20_degrees_is_unchanged_and_a_missing_temperature_is_missing():
    assert at_temperature([0.5, 3.0], [20.0, np.nan], 1.024) == pytest.approx([0.5, np.nan], nan_ok=True)


@pytest.mark.parametrize(("temp_c", "theta", "name"), [(293.15, 1.024, "water_temp_c"), (20, 1.5, "theta")])
def test_kelvin_and_an_impossible_factor_are_refused(temp_c, theta, name):
    with pytest.raises(OutOfRangeError, match=f"{name} must be between"):
        at_temperature(1.0, temp_c, theta)
