import math

import pytest

from calc.errors import CalcError
from calc.quality_drift import GRADES, drift_correction, drift_limit, grade
from calc.settings import Settings

SETTINGS = Settings()
LARGER = Settings.from_dict({"grade_both_limits": 0.0})
NAN = math.nan


@pytest.mark.parametrize(
    ("error", "expected"),
    [
        (0.0, "excellent"),
        (0.3, "excellent"),
        (0.31, "good"),
        (0.5, "good"),
        (0.51, "fair"),
        (0.8, "fair"),
        (0.81, "poor"),
        (2.0, "poor"),
        (2.01, "do not report"),
    ],
)
@pytest.mark.parametrize("sign", [1, -1])
def test_where_percent_is_the_lax_limit_the_grade_follows_mg_l(error, expected, sign):
    # At 12 mg/L the percent limits stand for 0.6, 1.2, 1.8 and 2.4 mg/L.
    assert grade(sign * error, 12.0, SETTINGS) == expected


@pytest.mark.parametrize(
    ("error", "expected"),
    [
        (0.15, "excellent"),
        (0.16, "good"),
        (0.3, "good"),
        (0.31, "fair"),
        (0.45, "fair"),
        (0.46, "poor"),
        (0.6, "poor"),
        (0.61, "do not report"),
    ],
)
def test_where_mg_l_is_the_lax_limit_the_grade_follows_percent(error, expected):
    # At 3 mg/L the percent limits stand for 0.15, 0.30, 0.45 and 0.60 mg/L.
    assert grade(error, 3.0, SETTINGS) == expected


@pytest.mark.parametrize(
    ("error", "at", "expected"),
    [
        (0.6, 12.0, "excellent"),
        (0.61, 12.0, "good"),
        (2.4, 12.0, "poor"),
        (2.41, 12.0, "do not report"),
        (0.3, 3.0, "excellent"),
        (0.31, 3.0, "good"),
        (2.0, 3.0, "poor"),
        (2.01, 3.0, "do not report"),
    ],
)
def test_the_larger_allowance_counts_where_the_survey_says_so(error, at, expected):
    assert grade(error, at, LARGER) == expected


@pytest.mark.parametrize("settings", [SETTINGS, LARGER])
def test_a_drift_of_0_46_is_good_and_one_of_2_3_is_not_reported(settings):
    assert grade(7.80 - 8.26, 8.26, settings) == "good"
    assert grade(-2.3, 8.26, settings) == "do not report"


@pytest.mark.parametrize(
    ("parameter", "at", "limits"),
    [
        ("temperature", 20.0, (0.2, 0.5, 0.8, 2.0)),
        ("conductance", 500.0, (15.0, 50.0, 75.0, 150.0)),
        ("ph", 7.0, (0.2, 0.5, 0.8, 2.0)),
    ],
)
def test_other_parameters_have_grades_of_their_own(parameter, at, limits):
    for place, limit in enumerate(limits):
        assert grade(0.99 * limit, at, SETTINGS, parameter) == GRADES[place]
        assert grade(-limit, at, SETTINGS, parameter) == GRADES[place]
        assert grade(1.01 * limit, at, SETTINGS, parameter) == GRADES[place + 1]


@pytest.mark.parametrize("parameter", ["do", "temperature", "conductance", "ph"])
@pytest.mark.parametrize("missing", [NAN, None, math.inf])
def test_an_unknown_error_has_no_grade(parameter, missing):
    assert grade(missing, 8.26, SETTINGS, parameter) == ""


def test_a_share_of_an_unknown_value_has_no_grade():
    assert grade(0.1, NAN, SETTINGS) == grade(0.1, None, LARGER) == ""
    assert grade(5.0, NAN, SETTINGS, "conductance") == grade(5.0, 0.0, SETTINGS, "conductance") == ""
    assert grade(0.1, NAN, SETTINGS, "temperature") == "excellent"


def test_at_zero_only_the_limits_in_mg_l_count():
    assert grade(0.4, 0.0, SETTINGS) == grade(0.4, 0.0, LARGER) == "good"


def test_another_parameter_is_refused():
    with pytest.raises(CalcError, match="parameter must be one of do, temperature, conductance, ph, got 'x'"):
        grade(0.1, 8.0, SETTINGS, "x")


@pytest.mark.parametrize(
    ("parameter", "expected", "limit"),
    [
        ("do", 8.26, 0.3),
        ("temperature", 20.0, 0.2),
        ("conductance", 100.0, 5.0),
        ("conductance", 500.0, 15.0),
        ("conductance", NAN, 5.0),
        ("ph", 7.0, 0.2),
    ],
)
def test_each_parameter_is_corrected_above_its_limit(parameter, expected, limit):
    assert drift_limit(expected, SETTINGS, parameter) == pytest.approx(limit)


def test_a_drift_of_0_46_over_8_h_is_corrected_by_a_ratio_that_grows_to_1_059():
    correction = drift_correction(8.0, 16.0, 8.26, 7.80, 0.05, SETTINGS)
    assert correction.method == "ratio"
    # 8.26 / 7.80
    assert correction.scale_end == pytest.approx(1.0590, abs=5e-5)
    assert correction.at(8.0) == (1.0, 0.0)
    assert correction.at(12.0) == (pytest.approx(1.0295, abs=5e-5), 0.0)
    assert correction.at(16.0) == (pytest.approx(8.26 / 7.80), 0.0)
    assert "×1.059" in correction.says and "zero check passed at 0.05 mg/L" in correction.says


def test_there_is_no_correction_outside_the_two_checks():
    correction = drift_correction(8.0, 16.0, 8.26, 7.80, NAN, SETTINGS)
    assert correction.at(7.99) is None and correction.at(16.01) is None
    assert correction.at(NAN) is None and correction.at(None) is None


def test_without_a_zero_check_the_correction_says_so():
    correction = drift_correction(8.0, 16.0, 8.26, 7.80, NAN, SETTINGS)
    assert correction.method == "ratio" and "No zero check was made" in correction.says


@pytest.mark.parametrize(
    ("zero", "method"), [(0.2, "ratio"), (0.21, "two_point"), (-0.2, "ratio"), (-0.21, "two_point")]
)
def test_two_points_are_used_where_zero_moved_too(zero, method):
    assert drift_correction(8.0, 16.0, 8.26, 7.80, zero, SETTINGS).method == method


def test_two_points_bring_both_checks_back_to_what_was_expected():
    correction = drift_correction(8.0, 16.0, 8.26, 7.80, 0.40, SETTINGS)
    scale, shift = correction.at(16.0)
    assert scale * 7.80 + shift == pytest.approx(8.26)
    assert scale * 0.40 + shift == pytest.approx(0.0)
    assert correction.at(8.0) == (1.0, 0.0)


@pytest.mark.parametrize(
    ("reading", "corrected"), [(7.96, False), (7.95, True), (8.56, False), (8.57, True), (7.01, True), (5.96, False)]
)
def test_only_drift_above_its_limit_and_within_what_is_reported_is_corrected(reading, corrected):
    assert (drift_correction(0.0, 8.0, 8.26, reading, NAN, SETTINGS) is not None) is corrected


@pytest.mark.parametrize("place", range(4))
@pytest.mark.parametrize("missing", [NAN, None, math.inf])
def test_what_is_not_known_is_not_corrected(place, missing):
    numbers = [0.0, 8.0, 8.26, 7.80]
    numbers[place] = missing
    assert drift_correction(*numbers, NAN, SETTINGS) is None


def test_checks_in_the_wrong_order_or_at_one_time_correct_nothing():
    assert drift_correction(8.0, 8.0, 8.26, 7.80, NAN, SETTINGS) is None
    assert drift_correction(9.0, 8.0, 8.26, 7.80, NAN, SETTINGS) is None


def test_readings_that_make_no_line_correct_nothing():
    assert drift_correction(0.0, 8.0, 0.0, 0.5, NAN, SETTINGS) is None
    assert drift_correction(0.0, 8.0, 8.26, 7.80, 7.80, SETTINGS) is None


@pytest.mark.parametrize(("parameter", "unit"), [("temperature", 20.0), ("ph", 7.0)])
def test_temperature_and_ph_are_shifted(parameter, unit):
    correction = drift_correction(0.0, 10.0, unit, unit + 0.4, NAN, SETTINGS, parameter)
    assert correction.method == "offset"
    assert correction.at(5.0) == (1.0, pytest.approx(-0.2))
    assert drift_correction(0.0, 10.0, unit, unit + 0.2, NAN, SETTINGS, parameter) is None


def test_conductance_is_corrected_by_a_ratio():
    correction = drift_correction(0.0, 10.0, 500.0, 484.0, NAN, SETTINGS, "conductance")
    assert (correction.method, correction.scale_end) == ("ratio", pytest.approx(500 / 484))
    assert "ero" not in correction.says
    assert drift_correction(0.0, 10.0, 500.0, 485.0, NAN, SETTINGS, "conductance") is None
