"""Bottles judged: hold times, the way to the laboratory, its controls, replicates, and what is never a number."""

from datetime import UTC, datetime, timedelta

import pytest

from calc import quality_bottle
from calc.settings import Settings
from webapp.bottles.judged import judged_bottles
from webapp.bottles.words import ANALYSES, REASON_OF, REASONS, UNITS
from webapp.models import Bottle, LabResult

FILLED = datetime(2026, 8, 12, 4, 10, tzinfo=UTC)
HOUR = timedelta(hours=1)
SETTINGS = Settings()


def bottle(code="B1", analysis="bod5", **more):
    return Bottle(
        id=code,
        code=code,
        analysis=analysis,
        collected_at=FILLED,
        **{"kind": "sample", "replicate_of": "", "full": None, "filtered": False, "on_ice_at": None, **more},
    )


def result(of="B1", value=4.0, hours=20.0, **more):
    started = None if hours is None else FILLED + hours * HOUR
    told = {"censor": "none", "limit_value": None, "quality": {}, "arrival_temp_c": None, "finished_at": None, **more}
    return LabResult(id=f"{of}-{value}", bottle_id=of, value=value, started_at=started, **told)


def judged(bottles, results, settings=SETTINGS, now=None):
    return judged_bottles(bottles, results, settings, now)


def test_a_bottle_set_up_48_8_hours_later_is_past_its_hold_time_and_keeps_its_result():
    collected = datetime(2026, 8, 12, 6, 10, tzinfo=UTC)
    set_up = datetime(2026, 8, 14, 7, 0, tzinfo=UTC)
    late = bottle()
    late.collected_at = collected
    found = result(value=3.4)
    found.started_at = set_up
    (one,) = judged([late], [found])
    assert one.hold.hours == pytest.approx(48 + 50 / 60)
    assert one.hold.state == "past"
    assert "48.8 h of 48 h" in one.hold.says
    assert (one.reasons, one.quality) == (("past_hold_time",), "questionable")
    assert one.reported == "3.4"


@pytest.mark.parametrize(
    ("hours", "state"), [(1, "ok"), (23.9, "ok"), (24.1, "soon"), (36.1, "soon"), (48, "soon"), (48.1, "past")]
)
def test_the_clock_of_a_bottle_without_result_runs_until_now(hours, state):
    (one,) = judged([bottle()], [], now=FILLED + hours * HOUR)
    assert one.hold.state == state
    assert one.quality == "missing"
    assert ("past_hold_time" in one.reasons) == (state == "past")


def test_without_a_clock_a_bottle_that_nobody_began_has_no_time():
    (one,) = judged([bottle()], [])
    assert (one.hold.state, one.reasons) == ("", ())


def test_a_result_without_the_time_its_analysis_began_does_not_show_that_it_was_in_time():
    (one,) = judged([bottle()], [result(hours=None)], now=FILLED + HOUR)
    assert (one.hold.state, one.reasons, one.quality) == ("", ("hold_time_unknown",), "questionable")


def test_chlorophyll_filtered_on_site_no_longer_waits():
    filtered, not_yet = bottle(analysis="chlorophyll_a", filtered=True), bottle("B2", "chlorophyll_a")
    states = [one.hold.state for one in judged([filtered, not_yet], [], now=FILLED + 30 * HOUR)]
    assert states == ["ok", "past"]


def test_the_last_result_holds_and_the_earlier_ones_stay():
    (one,) = judged([bottle()], [result(value=4.0), result(value=4.4)])
    assert [found.value for found in one.results] == [4.0, 4.4]
    assert one.reported == "4.4"


def test_a_result_below_a_limit_is_reported_as_such_and_never_as_a_number():
    (one,) = judged([bottle()], [result(value=None, censor="less_than", limit_value=2.0)])
    assert (one.reported, one.result.value) == ("<2", None)
    assert (one.reasons, one.quality) == (("below_limit",), "not_checked")


@pytest.mark.parametrize(
    ("celsius", "reason"), [(6.0, ()), (6.1, ("warm_on_receipt",)), (-0.5, ("frozen_on_receipt",))]
)
def test_the_temperature_on_arrival_is_judged(celsius, reason):
    (one,) = judged([bottle()], [result(arrival_temp_c=celsius)])
    assert one.reasons == reason


@pytest.mark.parametrize(("minutes", "reason"), [(15, ()), (16, ("not_on_ice",))])
def test_a_bottle_late_on_ice_is_told(minutes, reason):
    (one,) = judged([bottle(on_ice_at=FILLED + timedelta(minutes=minutes))], [])
    assert one.reasons == reason
    (one,) = judged([bottle(analysis="winkler_do", on_ice_at=FILLED + timedelta(minutes=minutes))], [])
    assert one.reasons == ()


def test_air_under_the_stopper_matters_where_oxygen_does():
    assert judged([bottle(full=False)], [])[0].reasons == ("headspace",)
    assert judged([bottle(full=True)], [])[0].reasons == ()
    assert judged([bottle(analysis="nh3_n", full=False)], [])[0].reasons == ()


@pytest.mark.parametrize(
    ("controls", "fails"),
    [
        (
            {"blank_mg_l": 0.2, "gga_mg_l": 198.0, "depletion_mg_l": 2.0, "residual_mg_l": 1.0, "incubation_c": 20},
            False,
        ),
        ({"blank_mg_l": 0.21}, True),
        ({"gga_mg_l": 167.4}, True),
        ({"gga_mg_l": 228.5}, False),
        ({"depletion_mg_l": 1.9}, True),
        ({"depletion_mg_l": 2.0}, False),
        ({"residual_mg_l": 0.9}, True),
        ({"residual_mg_l": 1.0}, False),
        ({"incubation_c": 21.5}, True),
    ],
)
def test_the_controls_of_the_run_are_judged(controls, fails):
    (one,) = judged([bottle()], [result(quality=controls)])
    assert ("lab_control_failed" in one.reasons) == fails


def test_an_incubation_read_too_late_is_told():
    begun = FILLED + 20 * HOUR
    for days, fails in ((5.0, False), (5.25, False), (5.3, True)):
        (one,) = judged([bottle()], [result(finished_at=begun + timedelta(days=days))])
        assert ("lab_control_failed" in one.reasons) == fails


def test_a_replicate_that_differs_is_told_at_both_bottles():
    two = [bottle("B1"), bottle("B2", kind="replicate", replicate_of="b1")]
    assert [one.reasons for one in judged(two, [result("B1", 4.0), result("B2", 4.8)])] == [(), ()]  # 18 % of the mean
    apart = judged(two, [result("B1", 4.0), result("B2", 5.0)])
    assert [one.reasons for one in apart] == [("replicate_differs",)] * 2


def test_a_low_replicate_may_differ_by_twice_the_reporting_limit():
    two = [bottle("B1"), bottle("B2", kind="replicate", replicate_of="B1")]
    below = result("B1", None, censor="less_than", limit_value=2.0)
    assert [one.reasons for one in judged(two, [below, result("B2", 5.0)])] == [("below_limit",), ()]
    assert "replicate_differs" in judged(two, [below, result("B2", 40.0)])[1].reasons


def test_every_reason_of_a_check_has_words():
    assert set(REASON_OF.values()) <= set(REASONS)
    assert set(ANALYSES) == set(UNITS) == set(quality_bottle.ANALYSES)
