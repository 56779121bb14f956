import itertools
import math
from types import MappingProxyType

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from calc.errors import CalcError
from calc.findings import known
from calc.quality_bracket import KINDS, Bracket, MeterCheckTime, bracket, bracket_finding, brackets
from calc.quality_meter import check_verdict
from calc.settings import Settings

NAN = math.nan
MORNING = (
    MeterCheckTime(7.0, "as_found", False),
    MeterCheckTime(7.1, "adjusted", True),
    MeterCheckTime(7.2, "read_back", True),
)
EVENING = MeterCheckTime(17.0, "end_of_day", True)


def test_a_reading_between_two_passing_checks_is_bracketed():
    assert bracket(9.0, (*MORNING, EVENING)) == Bracket("bracketed", 2, 3)


def test_the_order_in_which_checks_are_given_does_not_matter():
    checks = (*MORNING, EVENING)
    for order in itertools.permutations(range(4)):
        found = bracket(9.0, [checks[place] for place in order])
        assert (found.state, order[found.before], order[found.after]) == ("bracketed", 2, 3)


def test_checks_typed_with_the_same_minute_count_in_the_order_they_are_made():
    checks = [MeterCheckTime(7.0, check.kind, check.passes) for check in MORNING]
    for order in itertools.permutations(checks):
        found = bracket(9.0, [*order, EVENING])
        assert found.state == "bracketed" and order[found.before].kind == "read_back"
        before = bracket(6.0, [MeterCheckTime(5.0, "read_back", True), *order])
        assert before.state == "check_after_failed" and order[before.after - 1].kind == "as_found"


def test_a_day_without_an_end_check_leaves_every_reading_unbracketed():
    assert bracket(9.0, MORNING) == Bracket("no_check_after", 2, None)


def test_the_next_morning_as_found_closes_the_day_before():
    found = bracket(9.0, (*MORNING, MeterCheckTime(31.0, "as_found", True)))
    assert found == Bracket("bracketed", 2, 3)


def test_a_meter_found_wrong_and_put_right_speaks_against_the_readings_before_and_not_those_after():
    yesterday = MeterCheckTime(-10.0, "read_back", True)
    checks = (yesterday, *MORNING, EVENING)
    assert bracket(-5.0, checks) == Bracket("check_after_failed", 0, 1)
    assert bracket(9.0, checks) == Bracket("bracketed", 3, 4)


def test_a_meter_found_wrong_and_left_so_is_no_start():
    assert bracket(9.0, (MORNING[0], EVENING)) == Bracket("check_before_failed", 0, 1)


def test_a_meter_adjusted_before_it_was_checked_can_not_vouch_for_the_readings_before():
    noon = (MeterCheckTime(12.0, "adjusted", True), MeterCheckTime(12.1, "read_back", True))
    assert bracket(9.0, (*MORNING, *noon, EVENING)) == Bracket("no_check_after", 2, None)
    assert bracket(13.0, (*MORNING, *noon, EVENING)) == Bracket("bracketed", 4, 5)


def test_a_meter_cleaned_before_it_was_checked_can_not_vouch_for_the_readings_before():
    cleaned = MeterCheckTime(16.0, "after_cleaning", True)
    assert bracket(9.0, (*MORNING, cleaned, EVENING)).state == "no_check_after"
    assert bracket(16.5, (*MORNING, cleaned, EVENING)) == Bracket("bracketed", 3, 4)


def test_adjusting_never_closes():
    assert bracket(9.0, (*MORNING, MeterCheckTime(17.0, "adjusted", True))).state == "no_check_after"


@pytest.mark.parametrize("kind", ["as_found", "field", "end_of_day", "read_back"])
def test_each_kind_of_later_check_closes(kind):
    assert bracket(9.0, (*MORNING, MeterCheckTime(12.0, kind, True), EVENING)) == Bracket("bracketed", 2, 3)


@pytest.mark.parametrize("kind", ["as_found", "adjusted", "read_back", "field", "after_cleaning", "end_of_day"])
def test_each_kind_of_earlier_check_but_zero_opens(kind):
    assert bracket(9.0, (MeterCheckTime(8.0, kind, True), EVENING)) == Bracket("bracketed", 0, 1)


def test_a_zero_check_opens_and_closes_nothing():
    assert bracket(9.0, (MeterCheckTime(8.0, "zero", True), EVENING)) == Bracket("no_check_before", None, 1)
    assert bracket(9.0, (*MORNING, MeterCheckTime(12.0, "zero", False), EVENING)).state == "bracketed"
    assert bracket(9.0, (*MORNING, MeterCheckTime(12.0, "zero", True))).state == "no_check_after"


@pytest.mark.parametrize(
    ("correctable", "reportable", "state"),
    [(True, True, "drift"), (False, True, "check_after_failed"), (False, False, "not_reportable")],
)
def test_a_failed_check_after_says_whether_it_can_be_corrected(correctable, reportable, state):
    after = MeterCheckTime(17.0, "end_of_day", False, correctable, reportable)
    assert bracket(9.0, (*MORNING, after)) == Bracket(state, 2, 3)


def test_a_check_that_can_not_be_judged_neither_opens_nor_closes():
    unknown = MeterCheckTime(8.0, "field", None)
    assert bracket(9.0, (unknown, EVENING)).state == "check_before_failed"
    assert bracket(7.5, (*MORNING, unknown)).state == "check_after_failed"


@pytest.mark.parametrize(
    ("time_h", "kind", "state"),
    [
        (7.2, "end_of_day", "bracketed"),
        (7.19, "end_of_day", "check_after_failed"),
        (17.0, "end_of_day", "bracketed"),
        (17.01, "end_of_day", "no_check_after"),
        (17.0, "field", "bracketed"),
        (17.0, "read_back", "no_check_after"),
    ],
)
def test_a_reading_in_the_minute_of_a_check_lies_on_the_side_where_it_is_made(time_h, kind, state):
    # A reading just before 7.2 has the adjusted check before it and a failed read back after it.
    checks = (*MORNING[:2], MeterCheckTime(7.2, "read_back", time_h > 7.195), MeterCheckTime(17.0, kind, True))
    assert bracket(time_h, checks).state == state


def test_an_evening_typed_with_the_minute_of_the_last_reading_closes_it():
    evening = [MeterCheckTime(17.0, kind, kind != "end_of_day", True) for kind in ("end_of_day", "after_cleaning")]
    assert bracket(17.0, (*MORNING, *evening)) == Bracket("drift", 2, 3)
    assert bracket(17.0, (*MORNING, evening[1])) == Bracket("no_check_after", 2, None)


TIMES = st.one_of(st.none(), st.just(NAN), st.integers(0, 60).map(float))
CHECKS = st.lists(st.builds(MeterCheckTime, TIMES, st.sampled_from(KINDS), st.sampled_from([True, False, None])))


@settings(max_examples=200, deadline=None)
@given(st.lists(TIMES), CHECKS)
def test_what_brackets_a_reading_passed_and_lies_around_it_however_the_checks_fall(times, checks):
    for time, found in zip(times, brackets(times, checks), strict=True):
        assert found == bracket(time, checks)
        if found.before is not None:
            assert checks[found.before].at_h <= time
        if found.after is not None:
            assert checks[found.after].at_h >= time
        if found.state == "bracketed":
            assert checks[found.before].passes and checks[found.after].passes
            between = [one.kind for one in checks if known(one.at_h)[0] > time and one.at_h < checks[found.after].at_h]
            assert set(between) <= {"zero"}


@pytest.mark.parametrize(
    ("after_h", "state"), [(42.99, "bracketed"), (43.2, "bracketed"), (43.21, "no_check_after"), (60, "no_check_after")]
)
def test_a_bracket_of_more_than_36_hours_does_not_count(after_h, state):
    assert bracket(9.0, (*MORNING, MeterCheckTime(after_h, "as_found", True))).state == state


@pytest.mark.parametrize(("time_h", "state"), [(43.2, "no_check_after"), (43.3, "no_check_before")])
def test_a_check_more_than_36_hours_before_does_not_count(time_h, state):
    assert bracket(time_h, (*MORNING, MeterCheckTime(44.0, "end_of_day", True))).state == state


def test_the_surveys_own_longest_time_counts():
    assert bracket(9.0, (*MORNING, EVENING), Settings.from_dict({"bracket_longest_h": 8.0})).state == "no_check_after"


@pytest.mark.parametrize("missing", [NAN, None, math.inf])
def test_without_a_time_nothing_lies_between(missing):
    assert bracket(missing, (*MORNING, EVENING)) == Bracket("no_check_before", None, None)
    assert bracket(9.0, (MeterCheckTime(missing, "read_back", True), EVENING)) == Bracket("no_check_before", None, 1)
    assert bracket(9.0, ()) == Bracket("no_check_before", None, None)


def test_a_verdict_carries_over_and_0_25_as_found_closes_the_day_before():
    verdict = check_verdict("do", "as_found", "air_saturated_water", 8.26, 8.51, Settings())
    after = MeterCheckTime.of(31.0, "as_found", verdict)
    assert after.passes is False
    assert bracket(9.0, (*MORNING, after)).state == "bracketed"
    assert bracket(32.0, (after, MeterCheckTime(40.0, "end_of_day", True))).state == "check_before_failed"


@pytest.mark.parametrize(
    ("reading", "state"),
    [(7.96, "bracketed"), (7.95, "drift"), (7.80, "drift"), (5.96, "not_reportable"), (NAN, "check_after_failed")],
)
def test_an_end_check_of_8_26_decides_by_what_it_reads(reading, state):
    verdict = check_verdict("do", "end_of_day", "air_saturated_water", 8.26, reading, Settings())
    assert bracket(9.0, (*MORNING, MeterCheckTime.of(16.0, "end_of_day", verdict))).state == state


NAMES = MappingProxyType(
    {
        "no_check_before": "not_bracketed",
        "check_before_failed": "not_bracketed",
        "no_check_after": "not_bracketed",
        "check_after_failed": "not_bracketed",
        "drift": "drift_uncorrected",
        "not_reportable": "not_reportable",
    }
)


@pytest.mark.parametrize("state", NAMES)
def test_each_state_but_bracketed_is_a_finding(state):
    (finding,) = bracket_finding(Bracket(state, 0, 1))
    assert (finding.name, finding.field) == (NAMES[state], "do_mg_l")
    assert finding.says and finding.cause and finding.do


def test_bracketed_and_unknown_are_no_finding():
    assert bracket_finding(Bracket("bracketed", 0, 1)) == () == bracket_finding(None)


def test_another_kind_of_check_is_refused():
    with pytest.raises(CalcError, match="kind must be one of as_found, .*, got 'found'"):
        MeterCheckTime(1.0, "found", True)
