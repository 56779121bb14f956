from datetime import UTC, datetime

import pytest

from calc.settings import Settings
from webapp.display import Show
from webapp.readings.new import NewReading
from webapp.readings.settling import settle, stability_of
from webapp.readings.values import BadValues, read_values

AT = datetime(2026, 8, 12, 8, 15, tzinfo=UTC)


def settled(text, **more):
    new = NewReading("id", "D1", AT, do_mg_l=9.9, series=read_values(text, Show()), **more)
    return settle(new, Settings())


@pytest.mark.parametrize("text", ["6.1 6.3 6.2", "6,1 6,3 6,2", "6.1; 6.3;6.2", " 6.1\n6.3\r\n6.2 ", "6.1, 6.3, 6.2"])
def test_values_are_separated_by_blanks_semicolons_or_lines_with_either_decimal_sign(text):
    assert [one["do_mg_l"] for one in read_values(text, Show())] == [6.1, 6.3, 6.2]


def test_a_value_may_carry_its_seconds_and_its_temperature_in_the_units_shown():
    (first, second) = read_values("6,1@75/20,3 6,2@90", Show())
    assert first == {"after_s": 75.0, "do_mg_l": 6.1, "water_temp_c": 20.3}
    assert second == {"after_s": 90.0, "do_mg_l": 6.2, "water_temp_c": None}
    (fahrenheit,) = read_values("6.1@75/68", Show(unit_system="us"))
    assert fahrenheit["water_temp_c"] == pytest.approx(20.0)


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("six", "“six” is none"),
        (" ; ", "Enter numbers with blanks between them"),
        ("6.1 1,234", "Say which you mean"),
        ("6.1,6.3", "“6.1,6.3” is none"),
        ("61 6.2", "must lie between -0.5 and 30 mg/L; check “61”"),
        ("6.1@-5", "soaks for up to 4 hours"),
        ("6.1@99999", "soaks for up to 4 hours"),
        ("6.1@75/68", "No river has that temperature"),
        ("6.1@@75", "“6.1@@75” is none"),
        ("6.1 " * 61, "61 values; 60 are the most"),
    ],
)
def test_what_can_be_no_series_says_which_entry(text, says):
    with pytest.raises(BadValues, match=says):
        read_values(text, Show())


def test_oxygen_is_the_median_and_the_soak_lasts_to_the_last_value():
    new = settled("6.1@65 6.3@100 6.2@135 6.2@170 6.2@205")
    assert (new.do_mg_l, new.stable, new.soak_s) == (6.2, True, 205.0)
    assert settle(new, Settings()) == new


def test_soak_that_was_typed_stands():
    assert settled("6.1 6.3 6.2", soak_s=240.0).soak_s == 240.0


def test_too_few_values_are_neither_stable_nor_unstable():
    assert settled("6.1 6.3").stable is None


def test_values_that_were_taken_too_soon_are_not_stable():
    assert settled("6.2@10 6.2@40 6.2@80 6.2@110 6.2@140").stable is False


def test_temperature_that_still_moves_makes_a_reading_unstable():
    text = "6.2@65/20.0 6.2@100/20.4 6.2@135/20.9 6.2@170/21.3 6.2@205/21.8"
    assert settled(text).stable is False
    assert "°C" in stability_of(read_values(text, Show()), Settings()).why


def test_a_reading_without_raw_values_stays_as_it_is():
    new = NewReading("id", "D1", AT, do_mg_l=6.1)
    assert settle(new, Settings()) is new
    assert stability_of((), Settings()) is None
