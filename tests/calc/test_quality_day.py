import math

import pytest

from calc.quality_day import (
    anchor_moved,
    completeness,
    edited_clock,
    effluent_changed,
    flow_changed,
    mass_balance,
    ph_unlikely,
    position_poor,
    probe_against_titration,
    rained,
    replicate_due,
    snapshot_daylight,
    stage_changed,
)
from calc.settings import Settings

SETTINGS = Settings()
NAN = math.nan


def names(found):
    return [finding.name for finding in found]


@pytest.mark.parametrize(
    ("readings", "replicates", "due"),
    [
        (0, 0, False),
        (1, 0, True),
        (9, 0, True),
        (9, 1, False),
        (10, 1, False),
        (11, 1, True),
        (11, 2, False),
        (20, 2, False),
        (21, 2, True),
        (5, 3, False),
    ],
)
def test_a_replicate_is_due_for_each_ten_readings_begun(readings, replicates, due):
    assert bool(replicate_due(readings, replicates, SETTINGS)) is due


def test_the_sentence_on_replicates_tells_how_many_there_are():
    says = replicate_due(12, 1, SETTINGS)
    assert says.startswith("A replicate is due: 1 so far in 12 readings today. One in 10 is wanted")
    assert replicate_due(1, 0, SETTINGS).startswith("A replicate is due: 0 so far in 1 reading today.")


def test_a_survey_may_want_more_replicates():
    wants = Settings.from_dict({"replicate_per_day": 2, "replicate_every": 0})
    assert replicate_due(1, 1, wants) and replicate_due(3, 2, wants) and not replicate_due(2, 2, wants)


@pytest.mark.parametrize(("again", "found"), [(6.3, False), (6.31, True), (5.7, False), (5.69, True)])
def test_an_anchor_that_moved_by_more_than_0_3_is_a_daily_swing(again, found):
    assert names(anchor_moved(6.0, again, SETTINGS)) == ["diel"] * found


@pytest.mark.parametrize(
    ("first", "last", "found"),
    [
        (4.0, 6.9, False),
        (4.0, 7.0, False),
        (4.0, 7.1, True),
        (7.0, 9.0, False),
        (6.9, 9.0, True),
        (17.0, 20.0, False),
        (17.0, 20.1, True),
        (20.0, 22.0, False),
        (5.0, 21.0, True),
        (-3.0, 5.0, False),
    ],
)
def test_a_run_across_the_edge_of_daylight_is_asked_about(first, last, found):
    # Sunrise at 6, sunset at 20: daylight counts from 7 to 20.
    assert names(snapshot_daylight(first, last, 6.0, 20.0, SETTINGS)) == ["snapshot_daylight"] * found


def test_a_run_that_spans_the_whole_day_says_so():
    assert "1 h past sunrise and sunset" in snapshot_daylight(5.0, 21.0, 6.0, 20.0, SETTINGS)[0].says


@pytest.mark.parametrize(("again", "found"), [(0.53, False), (0.531, True), (0.47, False), (0.469, True)])
def test_a_stage_that_changed_by_more_than_0_03_m_is_told(again, found):
    assert names(stage_changed(0.5, again, SETTINGS)) == ["flow_changing"] * found


@pytest.mark.parametrize(
    ("now", "said"),
    [
        (2.2, None),
        (2.21, "Ask the plant"),
        (1.8, None),
        (1.79, "Ask the plant"),
        (2.4, "Ask the plant"),
        (2.41, "Stop and think"),
        (1.6, "Ask the plant"),
        (1.59, "Stop and think"),
    ],
)
def test_a_flow_that_changed_by_a_tenth_is_told_and_by_a_fifth_stops(now, said):
    found = flow_changed(2.0, now, SETTINGS)
    assert [finding.do.startswith(said or "") for finding in found] == [True] * bool(said)


def test_which_way_level_and_flow_went_is_told():
    assert "rose by 0.10 m" in stage_changed(0.5, 0.6, SETTINGS)[0].says
    assert "fell by 25 %, to 1.5 m³/s. The survey is no longer steady." in flow_changed(2.0, 1.5, SETTINGS)[0].says


@pytest.mark.parametrize(("rain", "found"), [(0, False), (2.5, False), (2.51, True)])
def test_more_than_2_5_mm_of_rain_is_told(rain, found):
    assert bool(rained(rain, SETTINGS)) is found


@pytest.mark.parametrize(("now", "found"), [(0.12, False), (0.121, True), (0.08, False), (0.079, True)])
def test_an_effluent_that_changed_by_more_than_a_fifth_is_told(now, found):
    assert names(effluent_changed(0.1, now, SETTINGS)) == ["effluent_changed"] * found


@pytest.mark.parametrize(
    ("numbers", "complete"),
    [
        ((100, 91, 10, 10), True),
        ((100, 90, 10, 10), True),
        ((100, 89, 10, 10), False),
        ((100, 100, 10, 9), False),
        ((100, 90, 0, 0), True),
        ((100, 90, NAN, NAN), True),
        ((100, 90, 10, NAN), None),
        ((0, 0, 0, 0), None),
        ((NAN, 90, 10, 10), None),
    ],
)
def test_nine_in_ten_values_and_every_critical_station_are_wanted(numbers, complete):
    assert completeness(*numbers, SETTINGS).complete is complete


def test_completeness_is_told_in_numbers():
    found = completeness(40, 38, 6, 5, SETTINGS)
    assert found.percent == pytest.approx(95) and found.critical_percent == pytest.approx(100 * 5 / 6)
    assert found.says == (
        "38 of 40 planned values are valid: 95 %, 90 % are wanted. At critical stations 5 of 6; 100 % are wanted."
    )


@pytest.mark.parametrize(("found", "asked"), [(1.1, False), (1.101, True), (0.9, False), (0.899, True)])
def test_a_mass_balance_holds_within_a_tenth(found, asked):
    assert names(mass_balance(found, 1.0, SETTINGS)) == ["mass_balance"] * asked
    assert mass_balance(2.0, 1.0, SETTINGS, field="conductance_us_cm")[0].field == "conductance_us_cm"


@pytest.mark.parametrize(("probe", "found"), [(6.3, False), (6.31, True), (5.7, False), (5.69, True)])
def test_a_probe_and_a_titration_agree_within_0_3(probe, found):
    assert names(probe_against_titration(probe, 6.0, SETTINGS)) == ["probe_against_titration"] * found


@pytest.mark.parametrize(("ph", "found"), [(5.99, True), (6.0, False), (9.0, False), (9.01, True)])
def test_ph_below_6_or_above_9_is_asked_about(ph, found):
    assert names(ph_unlikely(ph, SETTINGS)) == ["ph_unlikely"] * found


def test_ph_names_the_cause_of_its_side():
    assert "photosynthesis" in ph_unlikely(9.4, SETTINGS)[0].cause
    assert "Peat" in ph_unlikely(5.4, SETTINGS)[0].cause


@pytest.mark.parametrize(
    ("radius", "do"),
    [(20, None), (20.1, "Step into the open"), (100, "Step into the open"), (100.1, "Do not take it")],
)
def test_a_position_known_within_more_than_20_m_is_asked_about_and_beyond_100_m_not_taken(radius, do):
    found = position_poor(radius, SETTINGS)
    assert [finding.do.startswith(do or "") for finding in found] == [True] * bool(do)


@pytest.mark.parametrize(
    ("edited", "off", "expected"),
    [
        (60, 60, []),
        (61, 0, ["time_edited"]),
        (-61, 0, ["time_edited"]),
        (0, 61, ["clock_off"]),
        (NAN, -61, ["clock_off"]),
        (7200, 120, ["time_edited", "clock_off"]),
    ],
)
def test_a_time_changed_by_hand_and_a_wrong_clock_are_told(edited, off, expected):
    assert names(edited_clock(edited, off, SETTINGS)) == expected


def test_how_far_a_clock_is_off_is_told_in_a_fitting_unit():
    edited, off = edited_clock(7200, 120, SETTINGS)
    assert "2.0 hours" in edited.says and "2 minutes" in off.says


@pytest.mark.parametrize("missing", [NAN, None, math.inf, -math.inf])
def test_missing_values_give_no_finding(missing):
    assert replicate_due(missing, 0, SETTINGS) == "" == replicate_due(5, missing, SETTINGS)
    for check in (anchor_moved, stage_changed, flow_changed, effluent_changed, mass_balance, probe_against_titration):
        assert check(missing, 6.0, SETTINGS) == () == check(6.0, missing, SETTINGS)
    for check in (rained, ph_unlikely, position_poor):
        assert check(missing, SETTINGS) == ()
    assert edited_clock(missing, missing, SETTINGS) == ()
    for place in range(4):
        times = [5.0, 21.0, 6.0, 20.0]
        times[place] = missing
        assert all("sun" in finding.says for finding in snapshot_daylight(*times, SETTINGS))
    assert snapshot_daylight(5.0, 21.0, missing, missing, SETTINGS) == ()


@pytest.mark.parametrize("before", [0.0, -1.0])
def test_a_change_from_nothing_has_no_share(before):
    assert flow_changed(before, 1.0, SETTINGS) == () == effluent_changed(before, 1.0, SETTINGS)
    assert mass_balance(1.0, before, SETTINGS) == ()
