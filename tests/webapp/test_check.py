from dataclasses import replace
from datetime import UTC, datetime, timedelta

import pytest

from calc.settings import Settings
from tests.webapp.plans import put_plan
from webapp.models import ReadingEvent, Visit, VisitEntry
from webapp.plan.prediction import prediction_of
from webapp.readings import queries
from webapp.readings.check import on_site_check
from webapp.readings.day import Day
from webapp.readings.meaning import ABOVE, FALLING, LOWEST, RISING, Facts, afterwards, sentence
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading

RELEASE = datetime(2026, 8, 12, 4, 0, tzinfo=UTC)  # 06:00 in Vienna, as the survey's form has it
HERE = Facts("D5", 5.0, percent=55.0, predicted_mg_l=5.2, low_mg_l=4.6, high_mg_l=5.8, limb=LOWEST)


def test_as_near_as_a_careful_reading_can_tell_is_as_predicted():
    assert sentence(HERE) == "As predicted: the plan has 5.2 mg/L (4.6 to 5.8) here."
    assert afterwards(HERE) == ()
    narrow = replace(HERE, low_mg_l=5.1, high_mg_l=5.3, limb=ABOVE)
    assert sentence(narrow).startswith("As predicted")


def test_a_wide_band_does_not_hide_a_difference():
    facts = replace(HERE, do_mg_l=4.3, low_mg_l=1.9, high_mg_l=7.0)
    assert sentence(facts).startswith("0.9 mg/L lower than predicted: the sag is deeper than planned")
    assert afterwards(facts) == ("The plan's own doubts allow it: 1.9 to 7.0 mg/L.",)


@pytest.mark.parametrize(
    ("limb", "do", "says"),
    [
        (FALLING, 4.0, "1.2 mg/L lower than predicted: oxygen falls faster than planned"),
        (RISING, 4.0, "1.2 mg/L lower than predicted: the sag is deeper or further along than planned"),
        (LOWEST, 4.0, "1.2 mg/L lower than predicted: the sag is deeper than planned"),
        (FALLING, 6.4, "1.2 mg/L higher than predicted: oxygen falls more slowly than planned"),
        (RISING, 6.4, "1.2 mg/L higher than predicted: the river has recovered further than planned"),
        (LOWEST, 6.4, "1.2 mg/L higher than predicted: the sag is shallower than planned"),
        (ABOVE, 4.0, "1.2 mg/L lower than predicted: the river brings less oxygen than planned"),
        (ABOVE, 6.4, "1.2 mg/L higher than predicted: the river brings more oxygen than planned"),
    ],
)
def test_outside_the_band_says_what_the_sag_then_does(limb, do, says):
    assert sentence(replace(HERE, limb=limb, do_mg_l=do)).startswith(says)


def test_low_and_still_falling_puts_the_low_point_downstream():
    facts = replace(HERE, do_mg_l=4.0, upstream_code="D4", upstream_do_mg_l=4.6)
    assert "still falls from D4 to here: the low point may lie downstream of D5" in sentence(facts)


def test_low_but_rising_puts_the_low_point_upstream():
    facts = replace(HERE, do_mg_l=4.0, limb=RISING, upstream_code="D4", upstream_do_mg_l=3.6)
    assert "rises from D4 to here: the low point lies upstream of D5" in sentence(facts)


@pytest.mark.parametrize("upstream", [3.96, 4.04])
def test_low_and_level_leaves_open_where_the_low_point_lies(upstream):
    facts = replace(HERE, do_mg_l=4.0, upstream_code="D4", upstream_do_mg_l=upstream)
    assert "level from D4 to here: the low point may lie downstream of D5" in sentence(facts)


def test_neighbour_that_differs_the_same_way_confirms_the_river():
    facts = replace(HERE, do_mg_l=4.0, upstream_code="D4", upstream_difference=-0.9)
    assert "D4 differs the same way: it is the river." in afterwards(facts)


def test_neighbours_that_fit_the_plan_cast_doubt_on_the_reading():
    facts = replace(HERE, do_mg_l=4.0, upstream_code="D4", upstream_difference=-0.1, downstream_code="D6",
                    downstream_difference=0.2)  # fmt: skip
    assert "D4 and D6 fit the plan: read here once more to be sure." in afterwards(facts)


def test_no_oxygen_is_said_and_set_against_the_plan():
    assert sentence(replace(HERE, do_mg_l=0.0)).endswith("tell from zero, where the plan has 5.2 mg/L (4.6 to 5.8).")
    predicted = replace(HERE, do_mg_l=-0.05, predicted_mg_l=0.0, low_mg_l=0.0, high_mg_l=0.4)
    assert sentence(predicted).endswith("tell from zero, as predicted.")
    alone = replace(HERE, do_mg_l=0.1, predicted_mg_l=None, low_mg_l=None, high_mg_l=None)
    assert sentence(alone) == "No oxygen that a meter could tell from zero."


def test_without_a_prediction_it_says_why():
    facts = replace(HERE, predicted_mg_l=None, limb=None, missing="Add the river above the outfall.")
    assert sentence(facts) == "Nothing to compare with: Add the river above the outfall."
    assert sentence(replace(facts, missing="")).endswith("the plan does not reach this station.")
    assert sentence(replace(facts, limb=ABOVE)) == "Background, above the outfall: what the river brings."


def test_supersaturation_warns_of_the_night():
    assert any("before dawn" in line for line in afterwards(replace(HERE, percent=112.0)))


def test_criterion_is_named_only_when_oxygen_is_below_it():
    assert "Below the criterion of 6 mg/L." in afterwards(replace(HERE, criterion_mg_l=6.0))
    assert afterwards(replace(HERE, criterion_mg_l=5.0)) == ()


@pytest.fixture
def version(db, survey, people):
    return put_plan(db, survey, people["lead"])


@pytest.fixture
def store(db, survey, people, version):
    """A function that stores a reading of so much oxygen at a station, more fields by name."""

    def stored(code, do, hours=2.0, **more):
        entered = {"do_mg_l": {"text": str(do), "unit": "mg/L"}}
        values = {"do_mg_l": do, "water_temp_c": 20.0, "entered": entered, **more}
        new = NewReading(f"{code}-{hours}-{do}", code, RELEASE + timedelta(hours=hours), **values)
        return add_reading(db, survey, new, people["crew"].id, version, new.taken_at)

    return stored


@pytest.fixture
def check(db, survey, version):
    """A function from a stored reading to its check among all readings."""
    return lambda reading: on_site_check(survey, version, Settings(), reading, queries.readings_of(db, survey.id))


def test_deficit_and_percent_rest_on_the_station_pressure(store, check):
    seen = check(store("D1", 7.0, pressure_mmhg=740.0, pressure_source="barometer"))
    assert seen.saturation_mg_l == pytest.approx(8.85, abs=0.005)  # field table: 20 °C, 740 mmHg
    assert seen.percent == pytest.approx(100 * 7 / 8.85, abs=0.1)
    assert seen.deficit_mg_l == pytest.approx(1.85, abs=0.005)
    assert (seen.pressure_from, seen.salinity_from) == ("read on a barometer", "fresh water assumed")


def test_supersaturation_is_a_negative_deficit(store, check):
    seen = check(store("D1", 11.0))
    assert seen.deficit_mg_l < 0 and seen.percent > 100


def test_salinity_lowers_saturation(store, check):
    fresh, salty = check(store("D1", 7.0)), check(store("D2", 7.0, conductance_us_cm=5000.0))
    assert fresh.saturation_mg_l - salty.saturation_mg_l == pytest.approx(0.15, abs=0.01)  # field practice, section 0


def test_prediction_is_told_at_the_measured_temperature(survey, version, store, check):
    expected = prediction_of(survey, version).at(3.4)
    cold = check(store("D2", 6.0, water_temp_c=12.0))
    assert cold.predicted_mg_l == pytest.approx(cold.saturation_mg_l - expected.deficit_mg_l)
    assert cold.low_mg_l - cold.predicted_mg_l == pytest.approx(expected.low_mg_l - expected.do_mg_l)
    assert cold.difference_mg_l == pytest.approx(6.0 - cold.predicted_mg_l)


def test_reading_at_the_arrival_is_on_time_and_others_early_or_late(survey, version, store, check):
    travel_h = prediction_of(survey, version).at(10.5).travel_time_h
    for hours, timing in ((travel_h, "on time"), (travel_h + 3, "late"), (travel_h - 3, "early")):
        seen = check(store("D4", 5.0, hours))
        assert seen.timing == timing
        assert seen.around.hours_late == pytest.approx(hours - travel_h)


def test_snapshot_has_no_early_or_late(survey, store, check):
    survey.sampling = "snapshot"
    seen = check(store("D4", 5.0))
    assert (seen.timing, seen.around.arrives_at) == ("", None)


def test_station_above_the_outfall_has_no_travel_time(store, check):
    seen = check(store("U1", 8.2))
    assert seen.around.travel_time_h is None and seen.around.above_outfall


def test_temperature_beyond_the_equation_leaves_saturation_untold(store, check):
    seen = check(store("D1", 7.0, water_temp_c=-0.5))
    assert (seen.saturation_mg_l, seen.percent, seen.predicted_mg_l) == (None, None, None)


def test_lowest_reading_at_the_last_station_is_an_open_end(store, check):
    store("D2", 6.0), store("D3", 5.0)
    assert any("the last station downstream" in line for line in check(store("D4", 4.0)).afterwards)
    store("D5", 4.5)
    assert not any("lowest so far" in line for line in check(store("D4", 3.9)).afterwards)


def test_lowest_reading_at_the_first_station_is_an_open_end(store, check):
    store("U1", 3.0), store("D2", 6.0)
    assert any("the first station" in line for line in check(store("D1", 5.0)).afterwards)


def test_survey_without_plan_still_checks_saturation(db, survey, store):
    reading = store("D1", 7.0)
    seen = on_site_check(survey, None, Settings(), reading, [reading])
    assert seen.percent is not None
    assert seen.sentence == "Nothing to compare with: There is no plan yet."


def test_cold_water_is_told_only_where_it_needs_immersion_clothing(store, check):
    assert check(store("D1", 9.0, water_temp_c=18.0)).hazards == ()
    assert [one.name for one in check(store("D2", 9.0, water_temp_c=9.0)).hazards] == ["cold_water"]


def test_finding_that_nobody_was_asked_about_is_told_and_a_kept_one_is_not_told_again(store, check):
    odd = check(store("D1", 11.5))
    assert "supersaturation" in {one.name for one in odd.unasked}
    kept = check(store("D2", 11.5, kept_findings=({"name": "supersaturation", "says": "127 % saturation"},)))
    assert "supersaturation" not in {one.name for one in kept.unasked}
    assert kept.kept == ({"name": "supersaturation", "says": "127 % saturation"},)


def test_reading_without_oxygen_has_no_deficit_and_says_so(store, check):
    seen = check(store("D1", None, entered={}))
    assert (seen.deficit_mg_l, seen.sentence) == (None, "No oxygen was read here.")


def test_set_aside_neighbour_does_not_count(db, people, store, check):
    store("D1", 2.0)
    event = ReadingEvent(reading_id="D1-2.0-2.0", kind="set_aside", reason="air", made_by_id=people["office"].id)
    db.add(event)
    db.commit()
    db.expire_all()
    assert check(store("D2", 6.0)).around.upstream is None


def test_corrected_reading_is_checked_as_it_stands(db, people, store, check):
    reading = store("D1", 7.0)
    event = ReadingEvent(
        reading_id=reading.id,
        kind="corrected",
        field="do_mg_l",
        new_value=6.0,
        reason="typo",
        made_by_id=people["office"].id,
    )
    db.add(event)
    db.commit()
    db.expire_all()
    seen = check(reading)
    assert (seen.reading.do_mg_l, seen.reading.raw["do_mg_l"]) == (6.0, 7.0)
    assert seen.deficit_mg_l == pytest.approx(seen.saturation_mg_l - 6.0)


def names(findings):
    return {one.name for one in findings}


def test_station_that_moved_since_it_was_read_first_that_day_tells_of_the_time_of_day(store, check):
    store("U1", 8.0, hours=1.0)
    seen = check(store("U1", 8.31, hours=2.0))
    (finding,) = [one for one in seen.unasked if one.name == "diel"]
    assert "moved from 8.00 to 8.31 mg/L" in finding.says and "before dawn" in finding.do


@pytest.mark.parametrize(
    ("do", "first_hours", "hours"),
    [(8.30, 1.0, 2.0), (8.6, 1.1, 2.0), (8.6, 1.0, 30.0)],
    ids=["as much as is usual", "within the hour", "another day"],
)
def test_anchor_needs_a_large_step_after_an_hour_of_the_same_day(store, check, do, first_hours, hours):
    store("U1", 8.0, hours=first_hours)
    assert "diel" not in names(check(store("U1", do, hours=hours)).findings)


def test_anchor_is_compared_at_the_same_point_of_the_section(store, check):
    store("U1", 8.0, hours=1.0, position="left")
    assert "diel" not in names(check(store("U1", 8.9, hours=3.0, position="right")).findings)
    assert "diel" in names(check(store("U1", 8.9, hours=4.0, position="left")).findings)


def test_repeat_is_held_against_the_last_reading_at_its_own_point(store, check):
    store("D1", 6.0, hours=2.0, position="left", sensor_depth_m=0.2)
    store("D1", 5.0, hours=2.1, position="left", sensor_depth_m=0.8)
    store("D1", 7.0, hours=2.2, position="right", sensor_depth_m=0.2)
    seen = check(store("D1", 6.1, hours=2.3, position="left", sensor_depth_m=0.25, replicate=True))
    assert seen.repeat.first.do_mg_l == 6.0
    assert (seen.repeat.difference_mg_l, seen.repeat.agrees) == (pytest.approx(0.1), True)
    differs = check(store("D1", 6.3, hours=2.4, distance_left_m=4.0, sensor_depth_m=0.2, replicate=True))
    assert differs.repeat.first.do_mg_l == 6.1 and differs.repeat.agrees
    assert check(store("D2", 6.0, hours=3.0, replicate=True)).repeat is None


def test_raw_values_are_told_with_their_median_and_ends(store, check):
    series = tuple({"after_s": None, "do_mg_l": do, "water_temp_c": None} for do in (9.9, 6.1, 6.3, 6.2, 6.2, 6.2))
    seen = check(store("D1", 6.2, series=series))
    assert (seen.spread.n, seen.spread.low, seen.spread.high, seen.spread.median) == (6, 6.1, 6.3, 6.2)
    assert check(store("D2", 6.2)).spread is None


def test_crew_on_a_bridge_is_told_nothing_of_wading(db, survey, people, version, store):
    reading = store("D1", 7.0, depth_m=1.4, velocity_m_s=0.8)
    assert names(Day(db, survey).check(reading).hazards) == {"do_not_wade"}
    visit = Visit(survey_id=survey.id, station_id=reading.station_id, opened_by_id=people["crew"].id)
    arrived = (reading.taken_at - timedelta(minutes=5)).isoformat()
    facts = {"arrived_at": arrived, "platform": "bridge"}
    visit.entries = [VisitEntry(author_id=people["crew"].id, made_at=reading.taken_at, facts=facts)]
    db.add(visit)
    db.commit()
    assert Day(db, survey).check(reading).hazards == ()
