import copy
from datetime import UTC, datetime, timedelta

import pytest

from tests.webapp.plans import PLAN, put_plan
from webapp.fieldsheet.service import sheet_of
from webapp.models import ReadingEvent
from webapp.plan.prediction import prediction_of
from webapp.readings import queries
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading

RELEASE = datetime(2026, 8, 12, 4, 0, tzinfo=UTC)  # 06:00 in Vienna, as the survey's form has it


@pytest.fixture
def version(db, survey, people):
    """The ready plan with one station added and one dropped."""
    tables = copy.deepcopy(PLAN)
    tables["stations"] += [
        {"code": "D4A", "distance_km": 11.4, "state": "added", "reason": "the sag may be deeper here"},
        {"code": "D9", "distance_km": 22.5, "access": "Below the weir", "state": "dropped", "reason": "no bank"},
    ]
    return put_plan(db, survey, people["lead"], tables=tables)


@pytest.fixture
def read(db, survey, people, version):
    """A function that stores a reading at a station so many hours after the release."""

    def stored(code, hours, do=6.0):
        new = NewReading(f"{code}-{hours}", code, RELEASE + timedelta(hours=hours), do_mg_l=do, water_temp_c=19.0)
        return add_reading(db, survey, new, people["crew"].id, version, new.taken_at)

    return stored


@pytest.fixture
def sheet(db, survey, version):
    """A function that returns the sheet as it now is."""
    return lambda: sheet_of(survey, version, queries.readings_of(db, survey.id))


def test_stations_come_downstream_and_dropped_ones_apart(sheet):
    assert [stop.code for stop in sheet().stops] == ["U1", "D1", "D2", "D3", "D4", "D4A", "D5", "D6", "D7", "D8"]
    assert [(stop.code, stop.reason) for stop in sheet().dropped] == [("D9", "no bank")]


def test_parcel_arrives_a_travel_time_after_the_release_and_its_edge_before(sheet, survey, version):
    stop = sheet().stops[4]
    travel = timedelta(hours=prediction_of(survey, version).at(10.5).travel_time_h)
    assert stop.arrives_at == RELEASE + travel
    assert stop.leads_at - RELEASE == pytest.approx(0.89 * travel, abs=timedelta(seconds=1))


def test_station_above_the_outfall_has_no_parcel_time(sheet):
    assert (sheet().stops[0].arrives_at, sheet().stops[0].above_outfall) == (None, True)


@pytest.mark.parametrize("change", [{"sampling": "snapshot"}, {"release_at": None}])
def test_snapshot_or_missing_release_has_no_parcel_times(survey, sheet, change):
    for name, value in change.items():
        setattr(survey, name, value)
    assert {stop.arrives_at for stop in sheet().stops} == {None}


def test_next_is_the_first_then_the_one_below_the_last_read_then_what_was_left_out(sheet, read):
    assert sheet().next.code == "U1"
    read("D2", 2)
    assert sheet().next.code == "D3"
    for hours, code in enumerate(("D3", "D4", "D4A", "D5", "D6", "D7", "D8"), 3):
        read(code, hours)
    assert sheet().next.code == "U1"
    read("U1", 20), read("D1", 21)
    assert sheet().next is None


def test_done_counts_used_readings_and_tells_the_last(db, sheet, read, people):
    read("D2", 2, 6.4), read("D2", 2.2, 6.2)
    event = ReadingEvent(reading_id="D2-2.2", kind="set_aside", reason="air", made_by_id=people["office"].id)
    db.add(event)
    db.commit()
    db.expire_all()
    stop = next(stop for stop in sheet().stops if stop.code == "D2")
    assert (len(stop.readings), stop.last.do_mg_l, stop.set_aside) == (1, 6.4, 1)


def test_driving_adds_up_over_the_access_points_between(sheet):
    drives = {stop.code: (stop.drive_min, stop.drive_from) for stop in sheet().stops}
    assert drives["D3"] == (13.0, "D2")  # Footbridge 5, Beck mouth 8
    assert drives["U1"] == (None, "") and drives["D4A"] == (None, "")


def test_page_says_what_the_crew_needs(survey, browser_as, read):
    read("D1", 2, 6.42)
    page = browser_as("crew").get(f"/surveys/{survey.id}/sheet").text
    for words in ("Next: D2", "Long meadow", "3.40 km below the outfall", "Track to the gauge", "Soft mud", "Parcel",
                  "of travel", "first water", "1 reading, last", "6.42 mg/L", "Read here", "D4A · added on site",
                  "the sag may be deeper here", "D9 · dropped", "Dropped: no bank", "Above the outfall",
                  "Ring the farm first", "about 7 min to drive from D1"):  # fmt: skip
        assert words in page
    assert page.index("Never alone") < page.index("Next: D2") < page.index("Stations in order")


def test_page_shows_the_safety_note_first_and_never_says_safe(db, survey, version, browser_as):
    db.merge(survey).safety_note = "Emergency 112"
    db.commit()
    page = browser_as("crew").get(f"/surveys/{survey.id}/sheet").text
    assert page.index("Emergency 112") < page.index("Never alone")
    assert " safe " not in page and "employer's safety plan" in page


@pytest.mark.parametrize(("role", "says"), [("crew", "The lead or the office adds them"), ("lead", "Open the plan")])
def test_empty_survey_says_who_makes_the_plan(survey, browser_as, role, says):
    page = browser_as(role).get(f"/surveys/{survey.id}/sheet").text
    assert "There is no plan yet" in page and says in page


def test_plan_without_stations_says_so(db, survey, people, browser_as):
    put_plan(db, survey, people["lead"], tables={**PLAN, "stations": []})
    assert "The plan has no stations yet" in browser_as("crew").get(f"/surveys/{survey.id}/sheet").text


@pytest.mark.parametrize(("role", "says"), [("crew", "The lead or the office sets it"), ("lead", "Set it at the end")])
def test_missing_release_time_says_who_sets_it(db, survey, version, browser_as, role, says):
    db.merge(survey).release_at = None
    db.commit()
    page = browser_as(role).get(f"/surveys/{survey.id}/sheet").text
    assert "No release time is set" in page and says in page


def test_incomplete_plan_still_lists_its_stations(db, survey, people, browser_as):
    put_plan(db, survey, people["lead"], tables={**PLAN, "reaches": []})
    page = browser_as("lead").get(f"/surveys/{survey.id}/sheet").text
    assert "the plan is not complete" in page and "Read at U1" in page


def test_sheet_of_another_crews_survey_is_not_found(survey, browser_as):
    assert browser_as("crew").get("/surveys/somewhere/sheet").status_code == 404


def test_stop_says_in_short_whether_the_section_is_mixed_and_layered(db, survey, people, version, browser_as):
    for number, (position, depth_m, do) in enumerate(
        (("left", 0.2, 6.0), ("centre", 0.2, 6.1), ("right", 0.2, 6.2), ("left", 0.8, 5.9))
    ):
        new = NewReading(f"s{number}", "D1", RELEASE + timedelta(minutes=number), do_mg_l=do, water_temp_c=19.0,
                         position=position, sensor_depth_m=depth_m, depth_m=1.0)  # fmt: skip
        add_reading(db, survey, new, people["crew"].id, version, new.taken_at)
    page = browser_as("crew").get(f"/surveys/{survey.id}/sheet").text
    assert "Mixed from bank to bank (0.25 mg/L across), not layered." in page


def test_sheet_offers_the_repeat_that_is_due_to_whoever_owes_it(db, survey, people, version, browser_as):
    now = datetime.now(UTC)
    new = NewReading("r1", "D1", now, do_mg_l=6.0, water_temp_c=19.0, position="left", meter="Meter A")
    add_reading(db, survey, new, people["crew"].id, version, now)
    page = browser_as("crew").get(f"/surveys/{survey.id}/sheet").text
    assert "A replicate is due" in page and "/D1/reading?position=left&amp;meter=Meter+A&amp;replicate=yes" in page
    assert "A replicate is due" not in browser_as("lead").get(f"/surveys/{survey.id}/sheet").text
    again = NewReading("r2", "D1", now, do_mg_l=6.0, water_temp_c=19.0, position="left", replicate=True)
    add_reading(db, survey, again, people["crew"].id, version, now)
    assert "A replicate is due" not in browser_as("crew").get(f"/surveys/{survey.id}/sheet").text
