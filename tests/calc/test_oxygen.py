"""Oxygen saturation against printed tables, an independent library, and what must hold anywhere."""

import gsw
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from calc.errors import OutOfRangeError
from calc.oxygen import (
    concentration_mg_l,
    deficit_mg_l,
    percent_saturation,
    salinity_psu,
    saturation_mg_l,
    standard_pressure_mmhg,
    station_pressure_mmhg,
)
from calc.units import convert
from tests.calc.rows import rows

TABLES = ("do_fresh_1atm.csv", "do_pressure_computed.csv", "do_salinity.csv")
COLUMNS = ("t_c", "p_mmhg", "salinity_psu", "do_sat_mg_l", "tolerance_mg_l")
PUBLISHED = [row for table in TABLES for row in rows(table, *COLUMNS)]

TEMPS = st.floats(0, 40)
PRESSURES = st.floats(380, 836)
SALINITIES = st.floats(0, 40)


@pytest.mark.parametrize(
    ("temp_c", "pressure", "salinity", "expected", "tolerance"),
    [row for row in PUBLISHED if row[2] <= 40],
)
def test_saturation_agrees_with_published_value(temp_c, pressure, salinity, expected, tolerance):
    assert saturation_mg_l(temp_c, pressure, salinity) == pytest.approx(expected, abs=tolerance)


@pytest.mark.parametrize(
    ("temp_c", "pressure_factor", "salinity_factor"),
    rows("do_intermediates.csv", "t_c", "fp_at_0_9_atm", "fs_at_s10"),
)
def test_pressure_and_salinity_factors_agree_with_published_terms(temp_c, pressure_factor, salinity_factor):
    fresh = saturation_mg_l(temp_c)
    assert saturation_mg_l(temp_c, 0.9 * 760) / fresh == pytest.approx(pressure_factor, abs=1e-6)
    assert saturation_mg_l(temp_c, 760, 10) / fresh == pytest.approx(salinity_factor, abs=1e-6)


@pytest.mark.parametrize("salinity", [0, 5, 20, 35])
def test_saturation_agrees_with_teos_10_library(salinity):
    temps = np.linspace(0, 40, 81)
    absolute_salinity = gsw.SA_from_SP(salinity, 0, 0, 45)
    potential = gsw.pt0_from_t(absolute_salinity, temps, 0)
    density = gsw.rho(absolute_salinity, gsw.CT_from_t(absolute_salinity, temps, 0), 0)
    independent = gsw.O2sol_SP_pt(salinity, potential) * density * 31.9988e-6
    assert saturation_mg_l(temps, 760, salinity) == pytest.approx(independent, abs=0.003)


@pytest.mark.parametrize(
    ("elevation", "expected", "tolerance"),
    rows("elevation_pressure.csv", "altitude", "pressure_mmhg", "tolerance_mmhg"),
)
def test_standard_pressure_agrees_with_published_atmosphere(elevation, expected, tolerance):
    assert standard_pressure_mmhg(elevation) == pytest.approx(expected, abs=tolerance)


@pytest.mark.parametrize(
    ("conductance", "expected", "tolerance", "saturation"),
    rows("sc_to_salinity.csv", "sc25_us_cm", "salinity_usgs_psu", "tolerance_psu", "do_sat_20c_760_mg_l"),
)
def test_salinity_from_conductance_agrees_with_published_value(conductance, expected, tolerance, saturation):
    assert salinity_psu(conductance) == pytest.approx(expected, abs=tolerance)
    assert saturation_mg_l(20, 760, salinity_psu(conductance)) == pytest.approx(saturation, abs=0.0005)


@given(TEMPS, PRESSURES, SALINITIES)
def test_saturation_falls_with_temperature_and_salinity_and_rises_with_pressure(temp_c, pressure, salinity):
    here = saturation_mg_l(temp_c, pressure, salinity)
    assert saturation_mg_l(min(temp_c + 0.1, 40), pressure, salinity) <= here
    assert saturation_mg_l(temp_c, pressure, min(salinity + 0.1, 40)) <= here
    assert saturation_mg_l(temp_c, min(pressure + 0.1, 836), salinity) >= here


@given(st.floats(-1, 40), TEMPS, PRESSURES, SALINITIES)
def test_percent_and_deficit_describe_the_same_concentration(do, temp_c, pressure, salinity):
    percent = percent_saturation(do, temp_c, pressure, salinity)
    assert concentration_mg_l(percent, temp_c, pressure, salinity) == pytest.approx(do, abs=1e-9)
    deficit = deficit_mg_l(do, temp_c, pressure, salinity)
    assert saturation_mg_l(temp_c, pressure, salinity) - deficit == pytest.approx(do, abs=1e-9)


def test_scalar_equals_array_and_arguments_broadcast():
    temps, pressures = np.linspace(0, 40, 5)[:, None], np.array([500.0, 760.0, 800.0])
    table = saturation_mg_l(temps, pressures, 3.0)
    singles = [[saturation_mg_l(temp, pressure, 3.0) for pressure in pressures] for temp in temps[:, 0]]
    assert table.shape == (5, 3)
    assert table == pytest.approx(np.array(singles), rel=1e-14)


def test_missing_value_stays_missing_and_leaves_the_others():
    saturation = saturation_mg_l([10.0, np.nan, 20.0], [760.0, 760.0, np.nan])
    assert np.isnan(saturation).tolist() == [False, True, True]
    assert np.isnan(deficit_mg_l(np.nan, 10.0))


def test_arguments_are_not_changed():
    temps = np.array([5.0, 15.0])
    saturation_mg_l(temps, 700.0, 2.0)
    assert temps.tolist() == [5.0, 15.0]


def test_supersaturation_is_not_clipped():
    assert percent_saturation(12.0, 20.0) == pytest.approx(131.98, abs=0.05)  # printed saturation 9.092 mg/L
    assert deficit_mg_l(12.0, 20.0) == pytest.approx(-2.908, abs=0.003)


def test_sea_level_pressure_at_500_m_reads_saturation_half_a_milligram_too_high():
    station = station_pressure_mmhg(762.0, 500.0)
    assert station == pytest.approx(718, abs=0.5)
    assert saturation_mg_l(20.0, 762.0) - saturation_mg_l(20.0, station) == pytest.approx(0.54, abs=0.01)


@pytest.mark.parametrize(("elevation", "too_high"), [(300, 0.33), (500, 0.54), (1000, 1.05)])
def test_standard_pressure_taken_as_sea_level_misses_by_the_published_amount(elevation, too_high):
    error = saturation_mg_l(20.0) - saturation_mg_l(20.0, standard_pressure_mmhg(elevation))
    assert error == pytest.approx(too_high, abs=0.01)


def test_sea_level_reading_is_reduced_as_the_wisconsin_laboratory_rule_prints_it():
    # 29.65 inHg at 600 ft: factor 0.9795 (Wisconsin DNR laboratory certification).
    sea_level = convert(29.65, "[in_i'Hg]", "mm[Hg]")
    station = station_pressure_mmhg(sea_level, convert(600, "[ft_i]", "m"))
    assert station / sea_level == pytest.approx(0.9795, abs=0.001)


def test_fahrenheit_typed_as_celsius_is_refused():
    with pytest.raises(OutOfRangeError, match="water_temp_c must be between 0 and 40 °C, got 68 °C"):
        saturation_mg_l(68.0)


@pytest.mark.parametrize("temp_c", [-0.1, 40.1, np.inf, 293.15])
def test_temperature_out_of_range_is_refused(temp_c):
    with pytest.raises(OutOfRangeError, match="water_temp_c must be between 0 and 40 °C"):
        saturation_mg_l([10.0, temp_c])


@pytest.mark.parametrize("pressure", [29.92, 379.9, 1013.0])
def test_pressure_in_another_unit_is_refused(pressure):
    with pytest.raises(OutOfRangeError, match="pressure_mmhg must be between 380 and 836 mmHg"):
        saturation_mg_l(20.0, pressure)


@pytest.mark.parametrize(("temp_c", "salinity"), [(row[0], row[2]) for row in PUBLISHED if row[2] > 40] + [(20, 41)])
def test_salinity_beyond_the_published_range_is_refused(temp_c, salinity):
    with pytest.raises(OutOfRangeError, match=f"salinity_psu must be between 0 and 40, got {salinity:g}"):
        saturation_mg_l(temp_c, 760.0, salinity)


@pytest.mark.parametrize("do", [np.inf, -np.inf])
@pytest.mark.parametrize("function", [percent_saturation, deficit_mg_l])
def test_infinite_concentration_is_refused(function, do):
    with pytest.raises(OutOfRangeError, match="do_mg_l must be between"):
        function(do, 20.0)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: standard_pressure_mmhg(11001), "elevation_m must be between -500 and 11000 m"),
        (lambda: station_pressure_mmhg(29.9, 100), "sea_level_mmhg must be between 600 and 850 mmHg"),
        (lambda: station_pressure_mmhg(760, -600), "elevation_m must be between -500 and 11000 m"),
        (lambda: salinity_psu(-1), "conductance_us_cm must be between 0 and 59000 µS/cm"),
        (lambda: concentration_mg_l(np.inf, 10), "percent must be between"),
    ],
)
def test_other_arguments_out_of_range_are_refused(call, message):
    with pytest.raises(OutOfRangeError, match=message):
        call()
