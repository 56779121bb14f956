import contextlib
import math
from datetime import UTC, datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st

from webapp.display import Show
from webapp.forms import Fields, NotANumber, read_number, whole_number


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("8.1", 8.1),
        ("8,1", 8.1),
        (" 8,10 ", 8.1),
        ("-0.05", -0.05),
        ("\u22120,05", -0.05),
        (",5", 0.5),
        ("12", 12.0),
        ("0,123", 0.123),
    ],
)
def test_dot_and_comma_are_both_decimal_marks(text, value):
    assert read_number(text) == value


@pytest.mark.parametrize(
    "text", ["1_000", "\uff11\uff12", "\u0663", "nan", "inf", "1e5", "8.1.2", "8 1", "", "--1", "0x10"]
)
def test_what_is_no_plain_number_is_refused(text):
    with pytest.raises(NotANumber, match="not a number"):
        read_number(text)


def test_a_number_that_can_be_read_in_two_ways_is_asked_about():
    with pytest.raises(NotANumber, match="write 1.234 or 1234"):
        read_number("1,234")


def test_in_a_file_with_decimal_commas_the_same_text_is_no_riddle():
    assert read_number("1,234", decimal_comma=True) == 1.234
    assert read_number("1,234", decimal_comma=False) == 1234.0


@given(st.text(max_size=30))
def test_any_text_gives_a_finite_number_or_a_refusal(text):
    with contextlib.suppress(NotANumber):
        assert math.isfinite(read_number(text))


def test_range_is_told_in_the_unit_on_screen():
    fields = Fields({"t": "130"}, Show(unit_system="us"))
    assert fields.number("t", "water temperature", -1, 45, "temperature") is None
    assert fields.errors["t"] == "The water temperature must lie between 30.2 and 113 °F; check it."


def test_number_in_the_unit_on_screen_is_stored_in_si_with_what_was_typed():
    fields = Fields({"t": "68"}, Show(unit_system="us"))
    assert fields.number("t", "water temperature", -1, 45, "temperature") == pytest.approx(20.0)
    assert fields.entered["t"] == {"text": "68", "unit": "[degF]"}


def test_time_still_to_come_is_refused_but_a_clock_ten_minutes_ahead_is_not():
    now = datetime(2026, 8, 12, 4, 0, tzinfo=UTC)
    fields = Fields({"soon": "2026-08-12T04:10Z", "later": "2026-08-12T04:11Z"})
    assert fields.past_time("soon", "time", now) == datetime(2026, 8, 12, 4, 10, tzinfo=UTC)
    assert fields.past_time("later", "time", now) is None
    assert fields.errors["later"].startswith("That time is still to come")


def test_local_time_is_read_in_the_survey_zone():
    fields = Fields({"at": "2026-08-12T06:00"}, Show(time_zone="Europe/Vienna"))
    assert fields.local_time("at", "time") == datetime(2026, 8, 12, 4, 0, tzinfo=UTC)


@pytest.mark.parametrize(
    "text", ["2026-08-12", "12.08.2026 06:00", "0001-01-01T00:00", "9999-12-31T23:59", "T", "\x00"]
)
def test_strange_times_are_refused_or_read_but_never_crash(text):
    fields = Fields({"at": text}, Show(time_zone="Pacific/Kiritimati"))
    value = fields.local_time("at", "time")
    assert (value is None) == bool(fields.errors)


@pytest.mark.parametrize(("text", "number"), [("0", 0), ("12", 12), ("999999", 999999)])
def test_whole_number_is_read_from_plain_digits(text, number):
    assert whole_number(text) == number


@pytest.mark.parametrize("text", [None, "", "-1", "1.0", "1_0", "\u0661", "\u00b2", "1000000", " 1"])
def test_what_is_no_plain_whole_number_counts_as_not_said(text):
    assert whole_number(text, -1) == -1
