from datetime import UTC, datetime, timedelta

import pytest
from hypothesis import given
from hypothesis import strategies as st

from webapp.display import QUANTITIES, Show, from_now, hours, signed

SHOWS = [
    Show(),
    Show(unit_system="us"),
    Show(distance_rule="river_km", outfall_mark=66.3),
    Show(unit_system="us", distance_rule="river_mile", outfall_mark=41.2),
]


@pytest.mark.parametrize("show", SHOWS)
@given(value=st.floats(-400, 400))
def test_what_is_shown_reads_back_as_what_is_stored(show, value):
    for quantity in QUANTITIES:
        assert show.to_si(quantity, show.shown(quantity, value)) == pytest.approx(value, abs=1e-9)


def test_river_miles_count_down_from_the_outfall():
    show = SHOWS[3]
    assert show.number("place", 16.09344) == "31.20"
    assert show.place(16.09344) == "river mile 31.20"


def test_place_says_which_side_of_the_outfall():
    assert Show().place(3.2) == "3.20 km below the outfall"
    assert Show().place(-0.4) == "0.40 km above the outfall"


def test_missing_number_is_a_dash_and_no_zero_has_a_sign():
    assert Show().text("oxygen", None) == "–"
    assert Show().number("oxygen", -0.001) == "0.00"


@pytest.mark.parametrize(("value", "words"), [(0.5, "30 min"), (3.1666667, "3 h 10 min"), (50, "2 d 2 h"), (None, "–")])
def test_hours_in_words(value, words):
    assert hours(value) == words


def test_from_now_counts_both_ways():
    now = datetime(2026, 8, 12, 6, 0, tzinfo=UTC)
    assert from_now(now + timedelta(minutes=25), now) == "in 25 min"
    assert from_now(now - timedelta(minutes=40), now) == "40 min ago"


def test_signed_uses_a_true_minus():
    assert signed(-1.24) == "\u22121.2"
    assert signed(0.42) == "+0.4"


def test_time_is_shown_in_the_survey_zone_across_a_clock_change():
    show = Show(time_zone="Europe/Vienna")
    before = datetime(2026, 10, 25, 0, 30, tzinfo=UTC)
    assert show.iso(before) == "2026-10-25T02:30:00+02:00"
    assert show.iso(before + timedelta(hours=1)) == "2026-10-25T02:30:00+01:00"


def test_when_names_the_day_only_where_it_is_another_one_in_the_survey_zone():
    show, now = Show(time_zone="Europe/Vienna"), datetime(2026, 8, 12, 20, 0, tzinfo=UTC)
    assert show.when(datetime(2026, 8, 12, 21, 59, tzinfo=UTC), now) == "23:59"
    assert show.when(datetime(2026, 8, 12, 22, 1, tzinfo=UTC), now) == "Thu 13 Aug 00:01"
