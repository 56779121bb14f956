"""Units: exact published factors, and conversions that undo themselves."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from calc.errors import OutOfRangeError
from calc.units import UNITS, convert, convert_difference, from_si, load_kg_per_day, to_si
from tests.calc.rows import rows

VALUES = st.floats(-1e6, 1e6)


@pytest.mark.parametrize(
    ("value", "from_unit", "to_unit", "expected", "tolerance"),
    rows("unit_factors.csv", "value", "from_unit", "to_unit", "expected", "tolerance"),
)
def test_conversion_agrees_with_published_factor(value, from_unit, to_unit, expected, tolerance):
    assert convert(value, from_unit, to_unit) == pytest.approx(expected, abs=tolerance)


@given(value=VALUES, unit=st.sampled_from(sorted(UNITS)))
def test_from_si_undoes_to_si(value, unit):
    assert from_si(to_si(value, unit), unit) == pytest.approx(value, rel=1e-12, abs=1e-6)


@given(
    value=VALUES, pair=st.sampled_from([(a, b) for a in UNITS for b in UNITS if UNITS[a].quantity == UNITS[b].quantity])
)
def test_converting_there_and_back_returns_the_value(value, pair):
    there, back = pair
    assert convert(convert(value, there, back), back, there) == pytest.approx(value, rel=1e-12, abs=1e-6)


def test_same_unit_returns_the_value_unchanged():
    assert convert(29.92, "[in_i'Hg]", "[in_i'Hg]") == 29.92


def test_array_equals_scalars_and_missing_stays_missing():
    converted = convert([32.0, np.nan, 68.0], "[degF]", "Cel")
    assert converted == pytest.approx([convert(32.0, "[degF]", "Cel"), np.nan, 20.0], nan_ok=True)


def test_one_atmosphere_is_760_mmhg_and_1013_25_hpa_exactly():
    assert convert(1, "atm", "mm[Hg]") == 760.0
    assert convert(1013.25, "hPa", "mm[Hg]") == pytest.approx(760.0, rel=1e-15)


def test_temperature_difference_has_no_offset():
    assert convert_difference(0.3, "Cel", "[degF]") == pytest.approx(0.54)


def test_percent_becomes_a_ratio():
    assert to_si(95, "%") == pytest.approx(0.95)


def test_load_agrees_in_metric_and_us_units():
    load = load_kg_per_day(convert(2, "10*6.[gal_us]/d", "m3/s"), 30)
    assert convert(load, "kg/d", "[lb_av]/d") == pytest.approx(8.34 * 2 * 30, rel=1e-3)  # 8.34 lb/d per Mgal/d and mg/L


def test_feet_as_metres_and_fahrenheit_as_celsius_are_told_apart():
    assert to_si(3.0, "[ft_i]") == pytest.approx(0.9144)
    assert to_si(68.0, "[degF]") == pytest.approx(20.0)


def test_different_quantities_are_refused():
    with pytest.raises(OutOfRangeError, match="to_unit must measure length as m does, got Cel"):
        convert(1.0, "m", "Cel")


@pytest.mark.parametrize("function", [to_si, from_si])
def test_unknown_unit_is_refused(function):
    with pytest.raises(OutOfRangeError, match="unit must be one of Cel, .* got furlong"):
        function(1.0, "furlong")


def test_every_unit_is_listed_under_its_own_code():
    assert all(code == unit.code for code, unit in UNITS.items())
