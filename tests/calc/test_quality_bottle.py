import math

import pytest

from calc.errors import CalcError
from calc.quality_bottle import (
    ANALYSES,
    blank,
    bottle_counts,
    bottle_replicate,
    bottle_without_reading,
    depletion,
    gga,
    hold,
    incubation,
    not_on_ice,
    past_hold_time,
    receipt_warm,
)
from calc.settings import Settings

SETTINGS = Settings()
NAN = math.nan


def names(found):
    return [finding.name for finding in found]


def test_a_bottle_of_06_10_set_up_at_07_00_two_days_later_waited_48_8_h():
    found = hold(6 + 10 / 60, 48 + 7, "bod5", SETTINGS)
    assert round(found.hours, 1) == 48.8
    assert (found.state, found.limit_h) == ("past", 48.0)
    (finding,) = past_hold_time(found)
    assert finding.name == "past_hold_time" and "48.8 h of 48 h" in finding.says and "kept" in finding.do


@pytest.mark.parametrize("analysis", ["bod5", "cbod5", "ubod"])
@pytest.mark.parametrize(
    ("hours", "state"),
    [(0, "ok"), (23.9, "ok"), (24, "ok"), (24.1, "soon"), (47.9, "soon"), (48, "soon"), (48.1, "past")],
)
def test_bod_is_set_up_within_48_h_and_told_from_24_h_on(analysis, hours, state):
    assert hold(10.0, 10.0 + hours, analysis, SETTINGS).state == state


@pytest.mark.parametrize(
    ("analysis", "limit"), [("nh3_n", 672), ("chlorophyll_a", 24), ("winkler_do", 8), ("conductance_lab", 672)]
)
@pytest.mark.parametrize(
    ("part", "state"), [(0.74, "ok"), (0.75, "soon"), (0.76, "soon"), (1.0, "soon"), (1.01, "past")]
)
def test_each_analysis_has_its_own_hold_time_told_from_three_quarters_on(analysis, limit, part, state):
    found = hold(0.0, part * limit, analysis, SETTINGS)
    assert (found.limit_h, found.state) == (limit, state)


def test_where_three_quarters_come_before_the_projects_own_limit_they_are_told():
    assert hold(0.0, 36.0, "bod5", Settings.from_dict({"bod_caution_h": 40})).state == "soon"


@pytest.mark.parametrize("analysis", ANALYSES)
@pytest.mark.parametrize("missing", [NAN, None, math.inf])
def test_a_missing_time_is_not_judged(analysis, missing):
    for found in (hold(missing, 50.0, analysis, SETTINGS), hold(0.0, missing, analysis, SETTINGS)):
        assert found.state == "" and math.isnan(found.hours) and past_hold_time(found) == ()


def test_an_analysis_before_the_bottle_was_filled_is_a_slip():
    found = hold(5.0, 4.0, "bod5", SETTINGS)
    assert found.state == "" and "one of the times is wrong" in found.says


def test_only_a_bottle_past_its_time_is_a_finding():
    assert past_hold_time(hold(0.0, 30.0, "bod5", SETTINGS)) == () == past_hold_time(None)


def test_another_analysis_is_refused():
    with pytest.raises(CalcError, match="analysis must be one of bod5, .*, got 'turbidity'"):
        hold(0.0, 1.0, "turbidity", SETTINGS)


@pytest.mark.parametrize(
    ("receipt", "expected"),
    [
        (6.0, []),
        (6.1, ["warm_on_receipt"]),
        (3.0, []),
        (0.0, []),
        (-0.1, ["frozen_on_receipt"]),
        (NAN, []),
        (None, []),
    ],
)
def test_bottles_arrive_no_warmer_than_6_degrees_and_not_frozen(receipt, expected):
    assert names(receipt_warm(receipt, SETTINGS)) == expected


@pytest.mark.parametrize(("minutes", "found"), [(14, False), (15, False), (15.1, True), (NAN, False), (None, False)])
def test_bottles_are_on_ice_within_15_minutes(minutes, found):
    assert bool(not_on_ice(minutes, SETTINGS)) is found


@pytest.mark.parametrize(
    ("minutes", "found"), [(9, False), (10, False), (10.1, True), (-10.1, True), (NAN, False), (None, False)]
)
def test_oxygen_is_read_within_10_minutes_of_a_bottle(minutes, found):
    assert bool(bottle_without_reading(minutes, SETTINGS)) is found


@pytest.mark.parametrize(
    ("first", "second", "limit", "found"),
    [
        # 20 % of the mean of 18 and 22 is 4.
        (18.0, 22.0, NAN, False),
        (22.0, 18.0, 2.0, False),
        (17.9, 22.0, NAN, True),
        (17.9, 22.0, 2.0, True),
        # Low: below 5 times the reporting limit of 2, differences up to 4 pass.
        (3.0, 6.9, 2.0, False),
        (3.0, 7.0, 2.0, False),
        (3.0, 7.1, 2.0, True),
        (8.0, 11.9, 2.0, False),
        (8.0, 12.0, 2.0, True),
        (0.0, 0.0, 2.0, False),
        (NAN, 5.0, 2.0, False),
        (5.0, None, 2.0, False),
    ],
)
def test_bottle_replicates_agree_within_20_percent_or_twice_the_limit_when_low(first, second, limit, found):
    assert names(bottle_replicate(first, second, limit, SETTINGS)) == ["bottle_replicate"] * found


@pytest.mark.parametrize(
    ("counts", "expected"),
    [
        ((20, 2, 1), []),
        ((20, 1, 1), ["too_few_replicates"]),
        ((20, 2, 0), ["too_few_blanks"]),
        ((21, 2, 1), ["too_few_replicates", "too_few_blanks"]),
        ((0, 0, 0), []),
        ((NAN, 0, 0), []),
        ((20, None, NAN), []),
    ],
)
def test_a_tenth_of_the_bottles_are_replicates_and_a_twentieth_blanks(counts, expected):
    assert names(bottle_counts(*counts, SETTINGS)) == expected


@pytest.mark.parametrize(("used", "found"), [(0.19, False), (0.2, False), (0.21, True), (-0.1, False), (NAN, False)])
def test_a_blank_uses_up_no_more_than_0_2(used, found):
    assert names(blank(used, SETTINGS)) == ["lab_control_failed"] * found


@pytest.mark.parametrize(
    ("result", "found"), [(198, False), (167.5, False), (167.4, True), (228.5, False), (228.6, True), (None, False)]
)
def test_the_glucose_glutamic_acid_check_lies_within_198_and_30_5(result, found):
    assert names(gga(result, SETTINGS)) == ["lab_control_failed"] * found


@pytest.mark.parametrize(
    ("initial", "final", "expected"),
    [
        (8.5, 6.5, []),
        (8.5, 6.51, ["depletion_low"]),
        (8.5, 1.0, []),
        (8.5, 0.99, ["residual_low"]),
        (2.5, 0.9, ["depletion_low", "residual_low"]),
        (NAN, 6.5, []),
        (None, 0.5, ["residual_low"]),
        (8.5, NAN, []),
    ],
)
def test_a_dilution_uses_up_at_least_2_and_leaves_at_least_1(initial, final, expected):
    assert names(depletion(initial, final, SETTINGS)) == expected


@pytest.mark.parametrize(
    ("days", "temp", "expected"),
    [
        (5.0, 20.0, []),
        (4.75, 19.0, []),
        (5.25, 21.0, []),
        (4.74, 20.0, ["incubation_time"]),
        (5.26, 20.0, ["incubation_time"]),
        (5.0, 18.9, ["incubation_temperature"]),
        (5.0, 21.1, ["incubation_temperature"]),
        (6.0, 25.0, ["incubation_time", "incubation_temperature"]),
        (NAN, None, []),
    ],
)
def test_incubation_lasts_5_days_give_or_take_6_h_at_20_degrees_give_or_take_1(days, temp, expected):
    assert names(incubation(days, temp, SETTINGS)) == expected
