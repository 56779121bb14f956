import math

import pytest

from calc import quality_meter
from calc.errors import CalcError
from calc.quality_meter import KINDS, STANDARDS, check_verdict, expected_value
from calc.settings import Settings
from tests.calc.rows import rows

SETTINGS = Settings()
NAN = math.nan


def do(kind, expected, reading, standard="air_saturated_water"):
    return check_verdict("do", kind, standard, expected, reading, SETTINGS)


@pytest.mark.parametrize(
    ("temp_c", "pressure_mmhg", "saturation"),
    rows("do_pressure_computed.csv", "t_c", "p_mmhg", "do_sat_mg_l")[::9],
)
@pytest.mark.parametrize("standard", ["air_saturated_water", "water_saturated_air"])
def test_standards_made_with_air_read_saturation(standard, temp_c, pressure_mmhg, saturation):
    expected = expected_value(standard, water_temp_c=temp_c, pressure_mmhg=pressure_mmhg, compared=1.0)
    assert expected == pytest.approx(saturation, abs=0.0005)


def test_air_saturated_water_of_25_degrees_at_sea_level_reads_8_26():
    assert expected_value("air_saturated_water", water_temp_c=25, pressure_mmhg=760) == pytest.approx(8.26, abs=0.005)


def test_salt_lowers_what_water_holds_but_not_what_air_over_it_shows():
    at = {"water_temp_c": 20, "pressure_mmhg": 760}
    fresh = expected_value("air_saturated_water", **at)
    # 5000 µS/cm lowers saturation by about 0.15 mg/L near 20 °C.
    salt = expected_value("air_saturated_water", **at, conductance_us_cm=5000)
    assert fresh - salt == pytest.approx(0.15, abs=0.01)
    assert expected_value("water_saturated_air", **at, conductance_us_cm=5000) == fresh


@pytest.mark.parametrize(
    "at",
    [
        {"water_temp_c": 20},
        {"pressure_mmhg": 760},
        {"water_temp_c": 41, "pressure_mmhg": 760},
        {"water_temp_c": 20, "pressure_mmhg": 300},
        {"water_temp_c": None, "pressure_mmhg": math.inf},
    ],
)
def test_saturation_that_can_not_be_told_is_missing(at):
    assert math.isnan(expected_value("air_saturated_water", **at))


def test_zero_solution_reads_zero_and_all_else_what_it_is_compared_with():
    for standard in STANDARDS[3:]:
        assert expected_value(standard, water_temp_c=20, pressure_mmhg=760, compared=7.1) == 7.1
        assert math.isnan(expected_value(standard))
    assert expected_value("zero_solution", compared=7.1) == 0.0


@pytest.mark.parametrize("kind", ["as_found", "adjusted", "read_back"])
@pytest.mark.parametrize(
    ("expected", "error", "passes"),
    [(8.0, 0.2, True), (8.0, -0.2, True), (8.0, 0.21, False), (12.0, 0.24, True), (12.0, -0.25, False), (8.0, 0, True)],
)
def test_before_the_first_station_oxygen_agrees_within_0_2_or_2_percent(kind, expected, error, passes):
    assert do(kind, expected, expected + error).passes is passes


@pytest.mark.parametrize(("error", "passes"), [(0.29, True), (0.3, True), (-0.3, True), (0.31, False), (-0.31, False)])
@pytest.mark.parametrize(
    ("kind", "standard"),
    [
        ("field", "air_saturated_water"),
        ("as_found", "winkler"),
        ("field", "second_meter"),
        ("end_of_day", "air_saturated_water"),
        ("after_cleaning", "water_saturated_air"),
    ],
)
def test_in_the_field_against_another_method_and_at_the_end_of_day_0_3_passes(kind, standard, error, passes):
    verdict = do(kind, 8.26, 8.26 + error, standard)
    assert verdict.limit == 0.3 and verdict.passes is passes


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize(("reading", "passes"), [(0, True), (0.2, True), (0.21, False), (-0.2, True), (-0.21, False)])
def test_in_zero_solution_up_to_0_2_passes_whatever_the_kind(kind, reading, passes):
    verdict = do(kind, 0.0, reading, "zero_solution")
    assert verdict.passes is passes
    assert math.isnan(verdict.error_percent) and verdict.grade == "" and not verdict.correctable
    assert verdict.closes is None


@pytest.mark.parametrize(
    ("parameter", "standard", "expected", "limit"),
    [
        ("temperature", "reference_thermometer", 20.0, 0.2),
        ("conductance", "conductance_standard", 100.0, 5.0),
        ("conductance", "conductance_standard", 500.0, 15.0),
        ("ph", "ph_buffer", 7.0, 0.2),
    ],
)
@pytest.mark.parametrize("kind", ["as_found", "end_of_day"])
@pytest.mark.parametrize(("part", "passes"), [(0.99, True), (1.0, True), (-1.0, True), (1.01, False), (-1.01, False)])
def test_the_other_parameters_have_limits_of_their_own(parameter, standard, expected, limit, kind, part, passes):
    verdict = check_verdict(parameter, kind, standard, expected, expected + part * limit, SETTINGS)
    assert verdict.limit == pytest.approx(limit) and verdict.passes is passes


def test_a_drift_of_0_46_at_the_end_of_a_day_fails_is_good_and_can_be_corrected():
    verdict = do("end_of_day", 8.26, 7.80)
    assert verdict.error == pytest.approx(-0.46) and verdict.error_percent == pytest.approx(-5.6, abs=0.05)
    assert (verdict.passes, verdict.grade, verdict.correctable, verdict.reportable) == (False, "good", True, True)
    assert (
        verdict.says
        == "7.80 mg/L where 8.26 mg/L is expected: 0.46 mg/L low (5.6 %), more than the 0.30 mg/L that passes."
    )


def test_an_error_of_2_3_is_not_reportable():
    verdict = do("end_of_day", 8.26, 5.96)
    assert (verdict.passes, verdict.grade, verdict.correctable) == (False, "do not report", False)
    assert verdict.reportable is False and verdict.closes is False


def test_only_checks_that_end_a_day_are_graded():
    graded = {kind for kind in KINDS if do(kind, 8.26, 7.80).grade}
    assert graded == {"end_of_day", "after_cleaning"}
    assert do("as_found", 8.26, 7.80).correctable is True


def test_a_check_as_found_may_ask_for_adjusting_and_yet_close_the_day_before():
    verdict = do("as_found", 8.26, 8.51)
    assert (verdict.passes, verdict.closes, verdict.correctable) == (False, True, False)


@pytest.mark.parametrize("missing", [NAN, None, math.inf])
@pytest.mark.parametrize("kind", KINDS)
def test_what_is_not_known_is_not_judged(kind, missing):
    for verdict in (do(kind, missing, 8.0), do(kind, 8.0, missing)):
        assert verdict.passes is None and verdict.closes is None
        assert verdict.grade == "" and not verdict.correctable and verdict.reportable
        assert math.isfinite(verdict.limit) and "can't be judged" in verdict.says


def test_a_temperature_is_told_warmer_or_colder_and_a_ph_without_a_unit():
    warm = check_verdict("temperature", "as_found", "reference_thermometer", 20.0, 20.3, SETTINGS)
    assert "20.30 °C where 20.00 °C is expected: 0.30 °C warmer" in warm.says
    assert "more than the 0.20 °C warmer or colder that passes" in warm.says
    acid = check_verdict("ph", "as_found", "ph_buffer", 7.0, 6.9, SETTINGS)
    assert acid.says == "6.90 where 7.00 is expected: 0.10 low, within the 0.20 that passes."


def test_a_meter_that_shows_what_it_should_is_said_to_be_exactly_right():
    for shown in (9.08, 9.082, 9.078):
        verdict = check_verdict("do", "read_back", "air_saturated_water", 9.08, shown, SETTINGS)
        assert "9.08 mg/L is expected: exactly right, within the 0.20 mg/L that passes." in verdict.says


@pytest.mark.parametrize(
    ("given", "match"),
    [
        (("oxygen", "zero", "winkler"), "parameter must be one of do, temperature"),
        (("do", "found", "winkler"), "kind must be one of as_found, adjusted"),
        (("do", "zero", "titration"), "standard must be one of air_saturated_water"),
    ],
)
def test_another_word_is_refused(given, match):
    with pytest.raises(CalcError, match=match):
        check_verdict(*given, 8.0, 8.0, SETTINGS)


def test_another_standard_has_no_expected_value():
    with pytest.raises(CalcError, match="standard must be one of"):
        expected_value("tap_water")


def test_every_name_on_meters_can_be_had_from_one_place():
    assert all(hasattr(quality_meter, name) for name in quality_meter.__all__)
