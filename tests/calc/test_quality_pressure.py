import math

import pytest

from calc.quality_pressure import pressure_against_elevation, pressure_unit, sea_level_pressure
from calc.settings import Settings

SETTINGS = Settings()
NAN = math.nan


def test_sea_level_pressure_at_500_m_tells_the_effect_and_offers_the_pressure_here():
    (finding,) = sea_level_pressure(762, 500, 20, SETTINGS)
    assert finding.field == "pressure_value"
    # 762 x 716.0 / 760 = 717.9 mmHg, and the trade's figure of 0.54 mg/L at 500 m.
    assert "762 mmHg" in finding.says and "0.54 mg/L too high at 20.0 °C" in finding.says
    assert "718 mmHg" in finding.do
    assert finding.suggestion == {"pressure_source": "weather"}


@pytest.mark.parametrize(("elevation_m", "effect"), [(150.1, "0.16"), (300, "0.33"), (500, "0.54"), (1000, "1.05")])
def test_effect_of_standard_sea_level_pressure_is_that_of_the_trade(elevation_m, effect):
    (finding,) = sea_level_pressure(760, elevation_m, 20, SETTINGS)
    assert f"saturation {effect} mg/L" in finding.says


@pytest.mark.parametrize(("elevation_m", "found"), [(150, False), (150.1, True), (0, False), (-100, False)])
def test_sea_level_pressure_is_looked_for_above_150_m(elevation_m, found):
    assert bool(sea_level_pressure(760, elevation_m, 20, SETTINGS)) is found


@pytest.mark.parametrize(("pressure_mmhg", "found"), [(744.9, False), (745, True), (790, True), (790.1, False)])
def test_sea_level_pressure_lies_between_745_and_790(pressure_mmhg, found):
    assert bool(sea_level_pressure(pressure_mmhg, 1000, 20, SETTINGS)) is found


@pytest.mark.parametrize(("pressure_mmhg", "found"), [(752.1, False), (752.2, True)])
def test_sea_level_pressure_is_10_above_standard(pressure_mmhg, found):
    # Standard at 200 m is 742.15 mmHg (US Standard Atmosphere 1976).
    assert bool(sea_level_pressure(pressure_mmhg, 200, 20, SETTINGS)) is found


def test_below_300_m_the_check_asks_and_from_there_it_is_firm():
    (asks,) = sea_level_pressure(762, 299, 20, SETTINGS)
    (firm,) = sea_level_pressure(762, 300, 20, SETTINGS)
    assert "may be a sea-level pressure" in asks.says and asks.do.startswith("If so")
    assert "is a sea-level pressure" in firm.says and firm.do.startswith("Mark it")


def test_a_weather_value_is_meant_to_be_at_sea_level():
    assert sea_level_pressure(762, 500, 20, SETTINGS, source="weather") == ()


def test_a_meter_at_sea_level_pressure_is_said_to_be_miscalibrated():
    (finding,) = sea_level_pressure(762, 500, 20, SETTINGS, source="meter")
    assert "calibration" in finding.cause


def test_sea_level_pressure_is_told_in_the_unit_entered():
    (finding,) = sea_level_pressure(762, 500, 20, SETTINGS, unit="[in_i'Hg]")
    assert "30.00 inHg" in finding.says and "28.26 inHg" in finding.do


@pytest.mark.parametrize("water_temp_c", [NAN, None, 68.0])
def test_without_a_usable_temperature_the_effect_is_told_for_20_degrees(water_temp_c):
    (finding,) = sea_level_pressure(762, 500, water_temp_c, SETTINGS)
    assert "0.54 mg/L too high at 20.0 °C" in finding.says


@pytest.mark.parametrize(
    ("value", "claimed", "other", "mmhg"),
    [
        (29.5, "mm[Hg]", "[in_i'Hg]", "749 mmHg"),
        (25.0, "mm[Hg]", "[in_i'Hg]", "635 mmHg"),
        (31.0, "hPa", "[in_i'Hg]", "787 mmHg"),
        (850, "mm[Hg]", "hPa", "638 mmHg"),
        (1100, "mm[Hg]", "hPa", "825 mmHg"),
        (500, "hPa", "mm[Hg]", "500 mmHg"),
        (825, "[in_i'Hg]", "mm[Hg]", "825 mmHg"),
        (101.3, "mm[Hg]", "kPa", "760 mmHg"),
    ],
)
def test_pressure_in_another_units_range_is_offered_in_that_unit(value, claimed, other, mmhg):
    (finding,) = pressure_unit(value, claimed, NAN, SETTINGS)
    assert finding.suggestion == {"pressure_value": value, "pressure_unit": other}
    assert mmhg in finding.do


@pytest.mark.parametrize(
    ("value", "claimed"),
    [
        (24.9, "mm[Hg]"),
        (31.1, "mm[Hg]"),
        (499.9, "hPa"),
        (825.1, "hPa"),
        (849.9, "mm[Hg]"),
        (1100.1, "mm[Hg]"),
        (760, "mm[Hg]"),
        (1013, "hPa"),
        (1013, "mbar"),
        (29.92, "[in_i'Hg]"),
        (1.0, "atm"),
        (29.92, "no unit"),
        (NAN, "mm[Hg]"),
        (None, "mm[Hg]"),
        (1e308, "mm[Hg]"),
    ],
)
def test_pressure_in_the_claimed_units_range_or_in_none_is_left_alone(value, claimed):
    assert pressure_unit(value, claimed, NAN, SETTINGS) == ()


@pytest.mark.parametrize(("value", "other"), [(795, "hPa"), (23.5, "[in_i'Hg]")])
def test_high_up_the_elevation_shows_the_unit(value, other):
    # At 2000 m the standard pressure is 596 mmHg, 795 hPa, 23.5 inHg, outside the usual ranges of each.
    (finding,) = pressure_unit(value, "mm[Hg]", 2000, SETTINGS)
    assert finding.suggestion == {"pressure_value": value, "pressure_unit": other}
    assert pressure_unit(value, other, 2000, SETTINGS) == ()


@pytest.mark.parametrize(
    ("departure", "found"), [(15.2, True), (14.8, False), (-14.8, False), (-15.2, True), (0, False)]
)
def test_station_pressure_more_than_15_from_standard_is_asked_about(departure, found):
    # Standard at 500 m is 716.02 mmHg (US Standard Atmosphere 1976, to 0.3 in this form of the equation).
    assert bool(pressure_against_elevation(716.02 + departure, 500, SETTINGS)) is found


def test_a_station_pressure_entered_as_weather_value_is_told_from_standard():
    # 674 mmHg at 1000 m is the station's own; un-reduced once more it is 598.
    (finding,) = pressure_against_elevation(598, 1000, SETTINGS)
    assert "76 mmHg below the 674 mmHg" in finding.says
    assert "weather value" in finding.do


@pytest.mark.parametrize(("pressure_mmhg", "elevation_m"), [(NAN, 500), (598, NAN), (None, None), (598, 1e9)])
def test_pressure_without_a_standard_to_compare_gives_no_finding(pressure_mmhg, elevation_m):
    assert pressure_against_elevation(pressure_mmhg, elevation_m, SETTINGS) == ()
    assert sea_level_pressure(pressure_mmhg, elevation_m, 20, SETTINGS) == ()
