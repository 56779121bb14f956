from datetime import UTC, date, datetime, timedelta
from math import asin, atan2, cos, degrees, radians, sin
from types import SimpleNamespace
from zoneinfo import ZoneInfo

import pytest
from astral import Observer
from astral.sun import sunrise

from webapp.sag.budget import fits, position_of, time_budget

NOW = datetime(2026, 8, 12, 12, 0, tzinfo=UTC)  # 14:00 in Vienna
VIENNA = {"latitude": 48.2, "longitude": 16.4}


def survey(zone="Europe/Vienna", units="si"):
    return SimpleNamespace(unit_system=units, distance_rule="downstream", outfall_mark=None, time_zone=zone)


def budget(now=NOW, zone="Europe/Vienna", access=(), **day):
    day = {key: value.isoformat() if isinstance(value, datetime) else value for key, value in day.items()}
    return time_budget(survey(zone), SimpleNamespace(tables={"day": [day], "access": list(access)}), now)


def sun_altitude_deg(instant, latitude, longitude):
    """Altitude of the sun's middle without refraction, by the low-precision formulas of the Astronomical Almanac."""
    days = (instant - datetime(2000, 1, 1, 12, tzinfo=UTC)).total_seconds() / 86400
    anomaly = radians(357.529 + 0.98560028 * days)
    ecliptic = radians(280.459 + 0.98564736 * days + 1.915 * sin(anomaly) + 0.020 * sin(2 * anomaly))
    obliquity = radians(23.439 - 0.00000036 * days)
    ascension = atan2(cos(obliquity) * sin(ecliptic), cos(ecliptic))
    declination = asin(sin(obliquity) * sin(ecliptic))
    hour_angle = radians(15 * (18.697374558 + 24.06570982441908 * days) + longitude) - ascension
    phi = radians(latitude)
    return degrees(asin(sin(phi) * sin(declination) + cos(phi) * cos(declination) * cos(hour_angle)))


@pytest.mark.parametrize("longitude", [-175.0, -105.0, 0.0, 16.4, 120.0, 178.0])
@pytest.mark.parametrize("latitude", [-45.0, 0.0, 48.2, 62.0])
def test_sun_stands_on_the_horizon_at_the_sunset_that_is_told(latitude, longitude):
    sun = budget(latitude=latitude, longitude=longitude).sun
    assert sun_altitude_deg(sun, latitude, longitude) == pytest.approx(-0.833, abs=0.05)


@pytest.mark.parametrize("latitude", [0.0, 30.0, 48.2, 60.0])
def test_day_of_the_equinox_is_twelve_hours_and_the_edge_of_the_sun_with_refraction(latitude):
    sun = budget(datetime(2026, 3, 20, 12, tzinfo=UTC), "UTC", latitude=latitude, longitude=0.0).sun
    length = sun - sunrise(Observer(latitude, 0.0), date(2026, 3, 20))
    edges_min = 2 * 4 * 0.833 / cos(radians(latitude))
    assert length.total_seconds() / 60 == pytest.approx(12 * 60 + edges_min, abs=3)


@pytest.mark.parametrize(
    ("zone", "latitude", "longitude"),
    [("America/Denver", 39.7, -105.0), ("Pacific/Auckland", -36.8, 174.8), ("Pacific/Honolulu", 21.3, -157.9)],
)
@pytest.mark.parametrize("hour", [1, 9, 17, 23])
def test_sunset_is_that_of_the_local_day(zone, latitude, longitude, hour):
    now = datetime(2026, 8, 12, hour, tzinfo=ZoneInfo(zone))
    sun = budget(now, zone, latitude=latitude, longitude=longitude).sun
    assert sun.astimezone(ZoneInfo(zone)).date() == date(2026, 8, 12)


def test_daylight_leaves_half_an_hour_on_shore_and_closing_out():
    found = budget(**VIENNA)
    assert found.until == found.sun - timedelta(minutes=30 + 45)
    assert found.remaining_min == pytest.approx((found.until - NOW).total_seconds() / 60)
    local = found.sun.astimezone(ZoneInfo("Europe/Vienna"))
    assert f"sunset is at {local:%H:%M}, off the water 30 min before" in found.because


def test_own_minutes_stand_in_place_of_the_usual_ones():
    found = budget(**VIENNA, off_water_before_sunset_min=0.0, closeout_min=10.0)
    assert found.until == found.sun - timedelta(minutes=10)


@pytest.mark.parametrize(
    ("day", "until", "says"),
    [
        ({"crew_until": NOW + timedelta(hours=3)}, timedelta(hours=2, minutes=15),
         "the crew works until Wed 12 Aug 17:00"),
        ({"bottles_until": NOW + timedelta(hours=4), "drive_to_lab_min": 50.0}, timedelta(minutes=240 - 50 - 30 - 45),
         "bottles are due at the laboratory at Wed 12 Aug 18:00, 50 min to drive, 30 min to hand over"),
        ({"bottles_until": NOW + timedelta(hours=4), "lab_margin_min": 0.0}, timedelta(minutes=240 - 45),
         "the drive there is not entered"),
        ({"crew_until": NOW + timedelta(hours=3), "bottles_until": NOW + timedelta(hours=9)},
         timedelta(hours=2, minutes=15), "the crew works until"),
    ],
)  # fmt: skip
def test_earliest_limit_counts_and_says_why(day, until, says):
    found = budget(**VIENNA, **day)
    assert found.until == NOW + until and says in found.because


def test_overrun_budget_is_negative():
    assert budget(crew_until=NOW - timedelta(hours=1)).remaining_min == -105


def test_without_any_limit_none_is_made_up():
    found = budget()
    assert (found.remaining_min, found.until, found.sun) == (None, None, None)
    assert "No time limit is known" in found.because
    assert time_budget(survey(), None, NOW).until is None


def test_midnight_sun_sets_no_limit():
    found = budget(datetime(2026, 6, 21, 12, tzinfo=UTC), latitude=70.0, longitude=20.0)
    assert (found.until, found.sun) == (None, None)


@pytest.mark.parametrize("latitude", [70.0, 89.99, 90.0])
def test_polar_night_leaves_no_time(latitude):
    found = budget(datetime(2026, 12, 21, 12, tzinfo=UTC), latitude=latitude, longitude=20.0)
    assert found.remaining_min == -45 and "does not rise" in found.because


def test_position_is_the_typed_one_then_that_of_an_access_point():
    access = [{"name": "no position"}, {"name": "half", "latitude": 47.0}, {"latitude": 48.0, "longitude": 16.0}]
    assert position_of({"access": access}) == (48.0, 16.0)
    assert position_of({"access": access, "day": [{"latitude": 1.0, "longitude": 2.0}]}) == (1.0, 2.0)
    assert position_of({}) is None


def test_station_fits_up_to_the_minute_closing_out_begins():
    left = budget(crew_until=NOW + timedelta(hours=3))  # closing out begins at 16:15
    assert fits(left, NOW, 60.0, None, 75.0) == (True, "done by 16:15, 0 min before closing out must begin")
    assert fits(left, NOW, 60.0, None, 76.0) == (
        False,
        "done by 16:16, 1 min after closing out must begin, at 16:15",
    )


def test_crew_waits_for_the_parcel_and_does_not_wait_for_one_that_passed():
    left = budget(crew_until=NOW + timedelta(hours=3))
    assert not fits(left, NOW, 10.0, NOW + timedelta(hours=2, minutes=10), 15.0)[0]
    assert fits(left, NOW, 10.0, NOW + timedelta(hours=2), 15.0)[0]
    assert fits(left, NOW, 10.0, NOW - timedelta(hours=2), 15.0)[1].startswith("done by 14:25")


def test_unknown_drive_and_unknown_limits_are_said():
    assert fits(budget(), NOW, None, None, 15.0) == (
        True,
        "done by 14:15, without the drive, which is not known; no time limit is known",
    )


def test_station_of_the_next_day_names_the_day():
    left = budget(crew_until=NOW + timedelta(hours=30))
    assert "done by Thu 13 Aug 04:15" in fits(left, NOW, 10.0, NOW + timedelta(hours=14), 15.0)[1]
