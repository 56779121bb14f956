import math

import pytest

from calc.quality_visit import cold_water, parcel_timing, snapshot_long, taken_at, wading
from calc.settings import Settings
from calc.units import FOOT_M

SETTINGS = Settings()
NAN = math.nan


def names(findings):
    return [finding.name for finding in findings]


@pytest.mark.parametrize(
    ("depth_m", "velocity_m_s", "expected"),
    [
        (0.8, 0.74, []),
        (0.8, 0.75, ["wading_caution"]),
        (0.8, 1.16, ["wading_caution"]),
        (0.93, 1.0, ["do_not_wade"]),
        (0.62, 1.5, ["do_not_wade"]),
        (0.62, -1.5, ["do_not_wade"]),
        (0.9, 0.1, []),
        (0.91, 0.1, ["wading_caution"]),
        (0.91, NAN, ["wading_caution"]),
        (NAN, 3.0, []),
        (0.5, 0.5, []),
    ],
)
def test_wading_limits(depth_m, velocity_m_s, expected):
    assert names(wading(depth_m, velocity_m_s, SETTINGS)) == expected


def test_ten_square_feet_per_second_is_at_the_limit():
    (finding,) = wading(4 * FOOT_M, 2.5 * FOOT_M, SETTINGS)
    assert finding.name == "do_not_wade"
    assert finding.says.startswith("Do not wade.")
    assert "0.93 m²/s (10.0 ft²/s)" in finding.says
    assert names(wading(4 * FOOT_M, 2.49 * FOOT_M, SETTINGS)) == ["wading_caution"]


def test_wading_defers_to_rules_plan_and_judgement():
    (finding,) = wading(0.8, 0.9, SETTINGS)
    assert finding.hazard
    for word in ("Local rules", "employer's plan", "judgement"):
        assert word in finding.do


@pytest.mark.parametrize(
    ("water_temp_c", "words"),
    [(14.9, "dangerously cold"), (15, "cold enough to weaken"), (20.9, "cold enough to weaken"), (21, None)],
)
def test_cold_water_is_told_below_21_and_more_strongly_below_15(water_temp_c, words):
    findings = cold_water(water_temp_c, SETTINGS)
    assert [words in finding.says for finding in findings] == ([True] if words else [])
    assert all(finding.hazard for finding in findings)


@pytest.mark.parametrize(
    ("hours_late", "travel_time_h", "expected"),
    [
        (1.0, 5.0, []),
        (1.01, 5.0, ["late_for_parcel"]),
        (-1.0, 5.0, []),
        (-1.01, 5.0, ["early_for_parcel"]),
        (3.3, 33.0, []),
        (3.31, 33.0, ["late_for_parcel"]),
        (-3.31, 33.0, ["early_for_parcel"]),
        (1.01, NAN, ["late_for_parcel"]),
        (NAN, 5.0, []),
    ],
)
def test_parcel_is_met_within_a_tenth_of_its_travel_time_or_an_hour(hours_late, travel_time_h, expected):
    assert names(parcel_timing(hours_late, travel_time_h, SETTINGS)) == expected


def test_an_early_crew_is_told_how_long_to_wait():
    (finding,) = parcel_timing(-2.5, 5.0, SETTINGS)
    assert "2.5 h early" in finding.says
    assert "Wait 2.5 h" in finding.do


@pytest.mark.parametrize(("span_h", "found"), [(3, False), (3.1, True), (NAN, False)])
def test_a_snapshot_of_more_than_3_hours_is_asked_about(span_h, found):
    assert bool(snapshot_long(span_h, SETTINGS)) is found


@pytest.mark.parametrize(
    ("after_now_h", "before_survey_h", "expected"),
    [
        (5 / 60, NAN, []),
        (5.1 / 60, NAN, ["time_in_future"]),
        (-3, 24, []),
        (-3, 24.1, ["time_before_survey"]),
        (NAN, NAN, []),
        (None, None, []),
    ],
)
def test_a_time_ahead_of_the_clock_or_long_before_the_survey_is_asked_about(after_now_h, before_survey_h, expected):
    assert names(taken_at(after_now_h, before_survey_h, SETTINGS)) == expected


@pytest.mark.parametrize(("hours", "text"), [(0.5, "30 minutes"), (12, "12.0 hours"), (72, "3 days")])
def test_how_far_a_time_is_off_is_told_in_a_fitting_unit(hours, text):
    assert text in taken_at(hours, NAN, SETTINGS)[0].says
