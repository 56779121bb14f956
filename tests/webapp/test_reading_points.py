import copy
from datetime import UTC, datetime, timedelta
from types import SimpleNamespace

import pytest

from calc.settings import Settings
from tests.webapp.plans import PLAN, put_plan
from webapp.models import Visit, VisitEntry
from webapp.plan.prediction import prediction_of
from webapp.readings.day import Day
from webapp.readings.judging import judgement_of
from webapp.readings.new import NewReading
from webapp.readings.points import Point, before_reading, section_reason
from webapp.readings.queries import get_reading
from webapp.readings.section_words import in_short, spreads
from webapp.readings.service import add_reading

AT = datetime(2026, 8, 12, 8, 0, tzinfo=UTC)
ACROSS = ("left", "centre", "right")


@pytest.fixture
def version(db, survey, people):
    return put_plan(db, survey, people["lead"])


@pytest.fixture
def read(db, survey, people, version):
    """A function that stores a reading at a station, in minutes after AT, more fields by name; it gives the reading."""

    def stored(code, minutes=0, do=6.0, by="crew", **more):
        taken_at = AT + timedelta(minutes=minutes)
        values = {"do_mg_l": do, "water_temp_c": 20.0, **more}
        new = NewReading(f"{code}-{minutes}", code, taken_at, **values)
        return add_reading(db, survey, new, people[by].id, version, taken_at)

    return stored


@pytest.fixture
def section(read):
    """A function that reads left, centre and right of a station, mixed or not."""

    def across(code, minutes, mixed=True):
        for number, position in enumerate(ACROSS):
            read(code, minutes + number, 6.0 if mixed else 5.0 + number, position=position)

    return across


@pytest.fixture
def why(db, survey, version):
    """A function from a station to why three points are wanted there."""
    prediction = prediction_of(survey, version)
    return lambda code: section_reason(version, prediction, judgement_of(db, survey).occasions, code)


def still(db, survey, reading):
    day = Day(db, survey)
    return day.still_to_read(get_reading(db, survey.id, reading.id))


@pytest.mark.parametrize("code", ["D1", "D2", "D4", "D5"])
def test_first_two_stations_below_the_outfall_and_an_inflow_are_read_across(why, code):
    assert "first 2 stations below" in why(code)


def test_station_above_the_outfall_needs_one_point(why):
    assert why("U1") == ""


def test_every_station_is_read_across_until_one_is_shown_mixed(why, section):
    assert "No station between the outfall and here was shown to be mixed yet" in why("D3")
    section("D2", 0, mixed=False)
    assert "shown to be mixed yet" in why("D3")
    section("D2", 240)
    assert why("D3") == ""


def test_station_nearest_to_the_predicted_low_point_is_read_across(survey, version, why, section):
    assert prediction_of(survey, version).critical.distance_km == pytest.approx(15.9, abs=0.2)  # D6 is at 17.5 km
    section("D4", 0)
    assert why("D6") == "The low point is predicted nearest to here."
    assert why("D7") == ""


def test_every_fifth_station_below_a_mixed_one_is_read_across(db, survey, people, section):
    tables = copy.deepcopy(PLAN)
    tables["waters"] = [row for row in tables["waters"] if row["kind"] != "tributary"]
    version = put_plan(db, survey, people["lead"], tables=tables, number=2)
    occasions = [SimpleNamespace(station_code="D1", section=SimpleNamespace(mixed=True))]
    wanted = [code for code in ("D3", "D4", "D5", "D6", "D7", "D8") if section_reason(version, None, occasions, code)]
    assert wanted == ["D6"]


def test_left_points_are_offered_until_all_three_are_read(db, survey, read):
    first = read("D1", position="centre")
    reason, points = still(db, survey, first)
    assert "first 2 stations" in reason
    assert points == (Point("left"), Point("right"))
    read("D1", 3, position="left")
    last = read("D1", 6, position="right")
    assert still(db, survey, last)[1] == ()


def test_water_from_076_m_on_is_read_at_two_depths_of_each_vertical(db, survey, read, section):
    section("D2", 0)
    shallow = read("D3", 60, depth_m=0.75)
    assert still(db, survey, shallow) == ("", ())
    deep = read("D3", 200, depth_m=0.76)
    assert [one.sensor_depth_m for one in still(db, survey, deep)[1]] == [0.15, 0.61]
    upper = read("D3", 203, depth_m=0.76, sensor_depth_m=0.15)
    assert [one.sensor_depth_m for one in still(db, survey, upper)[1]] == [0.61]


def test_any_number_of_verticals_may_be_told_by_their_distance(db, survey, read):
    for number, distance in enumerate((1.0, 3.0, 6.0, 9.0)):
        read("D1", number, 6.0 + 0.3 * number, distance_left_m=distance)
    occasion = judgement_of(db, survey).of_station("D1")[-1]
    assert (occasion.section.points, occasion.section.mixed) == (4, False)
    assert "oxygen 0.90 mg/L apart" in spreads(occasion.section)
    assert in_short([occasion]) == "Not mixed from bank to bank (0.90 mg/L across)"


def test_layered_water_is_said_in_short(db, survey, read):
    read("D1", 0, 7.0, sensor_depth_m=0.2, depth_m=1.0)
    read("D1", 3, 6.0, sensor_depth_m=0.8, depth_m=1.0)
    assert in_short(judgement_of(db, survey).of_station("D1")) == "Layered"
    assert in_short([]) == ""


def test_depths_follow_from_the_depth_read_here_before_else_from_the_plan(db, survey, version, read):
    prediction = prediction_of(survey, version)
    look = lambda: before_reading(  # noqa: E731
        version, prediction, judgement_of(db, survey).of_station("D1"), Settings(), "D1", AT + timedelta(hours=1)
    )
    assert (look().measured, look().depth_m, look().depths_m) == (False, 1.1, (0.22, 0.88))
    read("D1", depth_m=0.5)
    assert (look().measured, look().depth_m, look().depths_m) == (True, 0.5, (0.3,))


def test_depth_and_velocity_that_were_measured_here_warn_before_the_next_reading(db, survey, version, read):
    read("D1", depth_m=1.2, velocity_m_s=0.9)
    occasions = judgement_of(db, survey).of_station("D1")
    (hazard,) = before_reading(version, None, occasions, Settings(), "D1", AT + timedelta(hours=1)).hazards
    assert hazard.says.startswith("Do not wade.")
    assert before_reading(version, None, occasions, Settings(), "D1", AT + timedelta(hours=30)).hazards == ()


def test_planned_depth_and_velocity_warn_only_where_nobody_may_wade(db, survey, people):
    tables = copy.deepcopy(PLAN)
    tables["reaches"][1] |= {"velocity_m_s": 1.0}
    version = put_plan(db, survey, people["lead"], tables=tables)
    prediction = prediction_of(survey, version)
    (hazard,) = before_reading(version, prediction, [], Settings(), "D1", AT).hazards
    assert hazard.name == "do_not_wade"
    assert before_reading(version, prediction, [], Settings(), "D4", AT).hazards == ()


def test_replicate_is_due_from_the_first_reading_of_a_day_until_there_is_one(db, survey, read):
    first = read("D1")
    assert "A replicate is due" in Day(db, survey).replicate_due(first)
    again = read("D1", 4, replicate=True)
    assert Day(db, survey).replicate_due(again) == ""
    others = read("D2", 60, by="lead")
    assert "due" in Day(db, survey).replicate_due(others)
    for number in range(10):
        last = read("D3", 100 + number)
    assert "1 so far in 11 readings" in Day(db, survey).replicate_due(last)


def test_deep_water_is_read_as_a_profile_from_a_boat_and_where_it_is_layered(db, survey, people, read, section):
    section("D2", 0)
    bridge = read("D3", 60, depth_m=3.0)
    assert [one.sensor_depth_m for one in still(db, survey, bridge)[1]] == [0.6, 2.4]
    read("D3", 63, 7.0, depth_m=3.0, sensor_depth_m=0.6)
    layered = read("D3", 66, 5.0, depth_m=3.0, sensor_depth_m=2.4)
    profile = [0.3, 1.3, 2.3]
    assert [one.sensor_depth_m for one in still(db, survey, layered)[1]] == profile[:2]
    boat = read("D3", 400, depth_m=3.0)
    visit = Visit(survey_id=survey.id, station_id=boat.station_id, opened_by_id=people["crew"].id)
    facts = {"arrived_at": boat.taken_at.isoformat(), "platform": "boat"}
    visit.entries = [VisitEntry(author_id=people["crew"].id, made_at=boat.taken_at, facts=facts)]
    db.add(visit)
    db.commit()
    assert [one.sensor_depth_m for one in still(db, survey, boat)[1]] == profile
    occasions = judgement_of(db, survey).of_station("D3")
    assert before_reading(None, None, occasions, Settings(), "D3", boat.taken_at).depths_m == tuple(profile)
