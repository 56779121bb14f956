from datetime import UTC, datetime, timedelta
from types import SimpleNamespace

import pytest

from calc.settings import Settings
from tests.webapp.planning import set_survey
from tests.webapp.plans import put_plan
from webapp.fieldsheet.snapshot import window_of
from webapp.models import Reading, ReadingEvent, Station
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading

NOON = datetime(2026, 8, 12, 10, 0, tzinfo=UTC)  # in Vienna
VIENNA = [{"name": "weir", "latitude": 48.2, "longitude": 16.4}]
SURVEY = SimpleNamespace(
    sampling="snapshot", unit_system="si", distance_rule="downstream", outfall_mark=None, time_zone="Europe/Vienna"
)


def taken(start, *minutes, aside=()):
    return [
        Reading(
            id=str(at),
            station=Station(code="D1"),
            taken_at=start + timedelta(minutes=at),
            events=[ReadingEvent(kind="set_aside", reason="air")] if at in aside else [],
        )
        for at in minutes
    ]


def window(readings, access=(), survey=SURVEY, **settings):
    return window_of(survey, SimpleNamespace(tables={"access": list(access)}), Settings(**settings), readings)


def test_run_goes_from_its_first_to_its_last_reading_and_may_take_three_hours():
    found = window(taken(NOON, 0, 40, 95))
    assert (found.first_at, found.last_at) == (NOON, NOON + timedelta(minutes=95))
    assert found.span_h == pytest.approx(95 / 60) and found.until == NOON + timedelta(hours=3)
    assert found.warnings == ()


def test_break_of_more_than_two_hours_begins_another_run():
    assert window(taken(NOON, 0, 40, 161, 200)).first_at == NOON + timedelta(minutes=161)
    assert window(taken(NOON, 0, 40, 160, 200)).first_at == NOON


def test_reading_set_aside_does_not_count():
    assert window(taken(NOON, 0, 40, 90, aside=(0, 90))).span_h == 0
    assert window(taken(NOON, 0, aside=(0,))) is None


@pytest.mark.parametrize(("minutes", "warns"), [(180, False), (181, True)])
def test_run_longer_than_the_setting_warns(minutes, warns):
    assert bool(window(taken(NOON, 0, 90, minutes)).warnings) == warns


def test_longest_run_is_a_setting():
    found = window(taken(NOON, 0, 70), snapshot_h=1.0)
    assert found.until == NOON + timedelta(hours=1) and "beyond 1 h 00 min" in found.warnings[0]


@pytest.mark.parametrize(
    ("start", "says"),
    [
        (datetime(2026, 8, 12, 3, 0, tzinfo=UTC), ""),  # 05:00 to 06:30, sunrise about 05:45
        (datetime(2026, 8, 12, 4, 0, tzinfo=UTC), "an hour after sunrise"),  # 06:00 to 07:30
        (datetime(2026, 8, 12, 10, 0, tzinfo=UTC), ""),
        (datetime(2026, 8, 12, 17, 30, tzinfo=UTC), "sunset"),  # 19:30 to 21:00, sunset about 20:10
        (datetime(2026, 8, 12, 21, 0, tzinfo=UTC), ""),  # over midnight
    ],
)
def test_run_over_a_turn_of_the_day_warns_of_mixed_times(start, says):
    warnings = window(taken(start, 0, 50, 90), VIENNA).warnings
    assert bool(warnings) == bool(says) and all(says in one and "mix times of day" in one for one in warnings)


def test_without_a_position_or_a_sunrise_no_turn_is_made_up():
    start = datetime(2026, 8, 12, 4, 0, tzinfo=UTC)
    assert window(taken(start, 0, 90)).warnings == ()
    north = [{"latitude": 78.0, "longitude": 15.0}]
    assert window(taken(datetime(2026, 6, 21, 4, tzinfo=UTC), 0, 90), north).warnings == ()


def test_same_parcel_survey_has_no_window():
    survey = SimpleNamespace(**vars(SURVEY) | {"sampling": "same_parcel"})
    assert window(taken(NOON, 0), survey=survey) is None


def test_sheet_of_a_snapshot_says_until_when_and_warns(app, db, survey, people, browser_as):
    set_survey(app, survey, sampling="snapshot")
    version = put_plan(db, survey, people["lead"])
    crew = browser_as("crew")
    assert "The first reading begins the run" in crew.get(f"/surveys/{survey.id}/sheet").text
    now = datetime.now(UTC)
    for number, hours in enumerate((3.5, 1.8, 0.2)):
        new = NewReading(
            f"8e7f2d3c-0000-4000-8000-00000000000{number}", "D1", now - timedelta(hours=hours), do_mg_l=6.0
        )
        add_reading(db, survey, new, people["crew"].id, version, now)
    page = crew.get(f"/surveys/{survey.id}/sheet").text
    assert "3 h 18 min so far" in page and "stations hardly compare" in page
    assert "Parcel" not in page and "Read the last station by" not in page
    assert "stations hardly compare" in browser_as("lead").get(f"/surveys/{survey.id}/sag").text
