import math

import pytest

from calc.quality_due import (
    calibration_missing,
    meter_in_two_places,
    outside_standards,
    recheck_due,
    standard_expired,
    thermometer_differs,
    thermometer_due,
    winkler_pair,
    zero_check_due,
)
from calc.settings import Settings

SETTINGS = Settings()
NAN = math.nan


@pytest.mark.parametrize(
    ("made", "passed", "says"), [(0, 0, "has no oxygen check"), (2, 0, "No oxygen check"), (2, 1, ""), (1, 1, "")]
)
def test_a_day_starts_with_a_check_that_passes(made, passed, says):
    found = calibration_missing(made, passed, SETTINGS)
    assert [says in finding.says for finding in found] == [True] * bool(says)


@pytest.mark.parametrize(("days", "says"), [(-1, ""), (0, ""), (0.5, "1 day ago"), (1, "1 day ago"), (3, "3 days ago")])
def test_a_standard_past_its_date_is_told(days, says):
    found = standard_expired(days)
    assert [says in finding.says for finding in found] == [True] * bool(says)


@pytest.mark.parametrize(
    ("moved", "reason"),
    [
        ((4.0, 0, 0, 0), ""),
        ((4.1, 0, 0, 0), "4.1 h have passed"),
        ((0, 100, 0, 0), ""),
        ((0, 101, 0, 0), "elevation differs by 101 m"),
        ((0, -101, 0, 0), "elevation differs by 101 m"),
        ((0, 0, 7, 0), ""),
        ((0, 0, -7.5, 0), "pressure differs by 8 mmHg"),
        ((0, 0, 0, 10), ""),
        ((0, 0, 0, 10.1), "10.1 °C warmer"),
        ((0, 0, 0, -10.1), "10.1 °C colder"),
    ],
)
def test_the_meter_is_checked_again_when_conditions_have_moved(moved, reason):
    found = recheck_due(*moved, SETTINGS)
    assert [reason in finding.says for finding in found] == [True] * bool(reason)


def test_every_reason_to_check_again_is_told_in_one_finding():
    (finding,) = recheck_due(5, 150, 8, 12, SETTINGS, disturbed=True)
    assert finding.says == (
        "Since the last meter check something was changed or knocked, 5.0 h have passed, the elevation differs by "
        "150 m, the pressure differs by 8 mmHg, the water is 12.0 °C warmer."
    )
    assert recheck_due(NAN, NAN, NAN, NAN, SETTINGS, disturbed=True)


@pytest.mark.parametrize(
    ("days", "lowest", "found"),
    [
        (31, 4.0, False),
        (31.1, 4.0, True),
        (31.1, NAN, True),
        (1, 1.9, False),
        (1.1, 1.99, True),
        (1.1, 2.0, False),
        (math.inf, NAN, True),
        (math.inf, 1.0, True),
        (NAN, 1.0, False),
        (None, 1.0, False),
    ],
)
def test_a_zero_check_is_due_monthly_and_before_little_oxygen_is_expected(days, lowest, found):
    assert bool(zero_check_due(days, lowest, SETTINGS)) is found


def test_why_a_zero_check_is_due_is_told():
    assert "there never was one. This survey expects 1.5 mg/L" in zero_check_due(math.inf, 1.5, SETTINGS)[0].says
    assert "last was one 40 days ago." in zero_check_due(40, 5.0, SETTINGS)[0].says


@pytest.mark.parametrize(
    ("lowest", "highest", "found"),
    [(0.0, 9.6, False), (-0.1, 8, True), (0, 9.61, True), (NAN, 9.7, True), (NAN, NAN, False)],
)
def test_standards_span_the_values_seen(lowest, highest, found):
    # 9.6 is 20 % above the saturated check of 8.0.
    assert bool(outside_standards(lowest, highest, 0.0, 8.0, SETTINGS)) is found


def test_a_low_reading_without_a_zero_check_lies_outside_the_standards():
    (finding,) = outside_standards(1.4, 7.9, 8.0, 8.0, SETTINGS)
    assert "1.4 was read, but the lowest standard that passed is 8." in finding.says


@pytest.mark.parametrize(("meter", "found"), [(20.2, False), (19.8, False), (20.21, True), (19.79, True)])
def test_a_thermometer_agrees_within_0_2(meter, found):
    assert bool(thermometer_differs(meter, 20.0, SETTINGS)) is found


def test_a_thermometer_off_by_more_than_0_5_is_not_to_be_used():
    assert "another meter" not in thermometer_differs(20.5, 20.0, SETTINGS)[0].do
    (finding,) = thermometer_differs(19.4, 20.0, SETTINGS)
    assert "another meter" in finding.do and "0.6 °C colder" in finding.says


@pytest.mark.parametrize(("days", "found"), [(364, False), (365, False), (366, True)])
def test_a_thermometer_is_compared_every_year(days, found):
    assert bool(thermometer_due(days, SETTINGS)) is found


@pytest.mark.parametrize(("second", "found"), [(6.09, False), (6.1, False), (6.11, True), (5.9, False), (5.89, True)])
def test_two_titrations_agree_within_0_1(second, found):
    assert bool(winkler_pair(6.0, second, SETTINGS)) is found


@pytest.mark.parametrize(
    ("km", "hours", "found"),
    [
        (110, 1.0, False),
        (110.1, 1.0, True),
        (110.1, -1.0, True),
        (0.5, 0.0, False),
        (0.51, 0.0, True),
        (0.51, 0.01, False),
        (20, 1.0, False),
    ],
)
def test_one_meter_is_not_at_two_places_at_once(km, hours, found):
    assert bool(meter_in_two_places(km, hours, SETTINGS)) is found


@pytest.mark.parametrize("missing", [NAN, None, -math.inf])
def test_missing_values_give_no_finding(missing):
    assert calibration_missing(missing, missing, SETTINGS) == ()
    assert standard_expired(missing) == ()
    assert recheck_due(missing, missing, missing, missing, SETTINGS) == ()
    assert zero_check_due(missing, missing, SETTINGS) == ()
    assert outside_standards(missing, missing, missing, missing, SETTINGS) == ()
    assert outside_standards(1.0, 9.0, missing, missing, SETTINGS) == ()
    assert thermometer_differs(missing, 20, SETTINGS) == () == thermometer_differs(20, missing, SETTINGS)
    assert thermometer_due(missing, SETTINGS) == ()
    assert winkler_pair(missing, 6, SETTINGS) == () == winkler_pair(6, missing, SETTINGS)
    assert meter_in_two_places(missing, 1, SETTINGS) == () == meter_in_two_places(100, missing, SETTINGS)
