"""Demand: first-order decay, depth, nitrogen, bottle fits and the two-slope line."""

from math import inf

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from calc.demand import (
    STANDARD_BOTTLE_DAYS,
    base_e_rate_per_day,
    exerted_mg_l,
    fit_bottle,
    fit_removal,
    hydroscience_kd_per_day,
    nbod_mg_l,
    remaining_mg_l,
    settling_rate_per_day,
    slope_least_squares,
    thomas_slope,
    ultimate_mg_l,
)
from calc.errors import FitError, OutOfRangeError
from calc.reaeration import at_temperature
from calc.river import Thetas
from calc.units import FOOT_M
from tests.calc.rows import inputs, rows

TABLE = rows("bod_kinetics.csv", "id", "inputs", "quantity", "value", "tolerance")
PUBLISHED = {(row_id, quantity): (value, tolerance) for row_id, _, quantity, value, tolerance in TABLE}
SERIES_DAYS, SERIES_BOD = zip(*rows("bottle_series.csv", "days", "bod_mg_l"), strict=True)
TIMES, RATES = st.floats(0.1, 30), st.floats(0.01, 5)


def _approx(row_id, quantity):
    value, tolerance = PUBLISHED[row_id, quantity]
    return pytest.approx(value, abs=tolerance)


def _rows_of(quantity):
    return [row for row in TABLE if row[2] == quantity]


@pytest.mark.parametrize(("row_id", "text", "quantity", "expected", "tolerance"), _rows_of("bod5_over_l0"))
def test_five_day_share_agrees_with_published_value(row_id, text, quantity, expected, tolerance):
    rate = float(text.removeprefix("k=").removesuffix(" base e"))
    assert exerted_mg_l(1.0, STANDARD_BOTTLE_DAYS, rate) == pytest.approx(expected, abs=tolerance)
    assert ultimate_mg_l(expected, STANDARD_BOTTLE_DAYS, rate) == pytest.approx(1.0, abs=2 * tolerance / expected)


@pytest.mark.parametrize(("row_id", "text", "quantity", "expected", "tolerance"), _rows_of("theta_factor"))
def test_decay_factor_agrees_with_published_value(row_id, text, quantity, expected, tolerance):
    assert at_temperature(1.0, inputs(text)["T"], Thetas().kd) == pytest.approx(expected, abs=tolerance)


@pytest.mark.parametrize(("row_id", "text", "quantity", "expected", "tolerance"), _rows_of("kd20_hydroscience_1971"))
def test_decay_by_depth_agrees_with_published_equation(row_id, text, quantity, expected, tolerance):
    feet = float(text.removeprefix("H=").removesuffix(" ft"))
    assert hydroscience_kd_per_day(feet * FOOT_M) == pytest.approx(expected, abs=tolerance)


def test_bed_demand_agrees_with_published_example():
    at_20 = 3.86 / at_temperature(1.0, 24.0, 1.047)  # the example uses 1.047
    assert at_20 == _approx("B45", "sod20")
    used_mg_l = 3.21 * 0.645 / (6.6 * FOOT_M)
    assert used_mg_l == _approx("B45", "do_used_mg_l")


def test_remaining_demand_downstream_agrees_with_published_example():
    [(value, tolerance)] = [
        row[1:] for row in rows("mixing_balance.csv", "quantity", "value", "tolerance") if row[0] == "l_at_x_mg_l"
    ]
    mixed_mg_l = (8.70 * 6.0 + 1.10 * 50.0) / 9.80
    assert remaining_mg_l(mixed_mg_l, 30000 / 0.30 / 86400, 0.20) == pytest.approx(value, abs=tolerance)


@given(st.floats(0, 1000), st.floats(0, 60), RATES)
def test_what_is_exerted_and_what_remains_make_up_the_whole(initial, days, rate):
    whole = exerted_mg_l(initial, days, rate) + remaining_mg_l(initial, days, rate)
    assert whole == pytest.approx(initial, rel=1e-12, abs=1e-12)


@given(st.floats(0, 1000), TIMES, RATES)
def test_ultimate_undoes_exerted(initial, days, rate):
    assert ultimate_mg_l(exerted_mg_l(initial, days, rate), days, rate) == pytest.approx(initial, rel=1e-9)


def test_scalar_equals_array_and_missing_stays_missing():
    left = remaining_mg_l([20.0, np.nan], [[1.0], [2.0]], 0.3)
    assert left.shape == (2, 2)
    assert left[1, 0] == remaining_mg_l(20.0, 2.0, 0.3)
    assert np.isnan(left[:, 1]).all()


def test_base_10_rate_read_as_base_e_overstates_what_remains():
    rate_base10 = 0.1
    right = remaining_mg_l(20.0, 5.0, base_e_rate_per_day(rate_base10))
    assert right == pytest.approx(20 * 10**-0.5)
    assert remaining_mg_l(20.0, 5.0, rate_base10) > 1.9 * right


def test_five_day_demand_used_as_ultimate_misses_a_third_at_common_rates():
    assert 20.0 / ultimate_mg_l(20.0, STANDARD_BOTTLE_DAYS, 0.23) == pytest.approx(0.683, abs=0.001)


def test_decay_by_depth_needs_feet_inside_but_takes_metres():
    assert hydroscience_kd_per_day(2.4384) == pytest.approx(0.3)
    assert hydroscience_kd_per_day([0.3, 1.0, 2.0, 5.0])[-1] == 0.3
    assert (np.diff(hydroscience_kd_per_day(np.linspace(0.1, 2.4, 50))) < 0).all()


def test_deeper_water_settles_more_slowly():
    assert settling_rate_per_day(0.3, [0.5, 1.0, 3.0]) == pytest.approx([0.6, 0.3, 0.1])


def test_nitrogen_takes_its_published_oxygen():
    assert nbod_mg_l(2.0) == pytest.approx(9.14)
    assert nbod_mg_l(2.0, with_synthesis=True) == pytest.approx(8.66)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: remaining_mg_l(-1, 1, 0.2), "initial_mg_l must be between 0"),
        (lambda: remaining_mg_l(1, -1, 0.2), "days must be between 0"),
        (lambda: exerted_mg_l(1, 1, -0.2), "rate_per_day must be between 0"),
        (lambda: ultimate_mg_l(-1, 5, 0.2), "bod_mg_l must be between 0"),
        (lambda: ultimate_mg_l(1, 0, 0.2), "days must be above 0 d"),
        (lambda: ultimate_mg_l(1, 5, 0), "rate_per_day must be above 0"),
        (lambda: base_e_rate_per_day(-0.1), "rate_base10_per_day must be between 0"),
        (lambda: nbod_mg_l(-1), "nitrogen_mg_l must be between 0"),
        (lambda: hydroscience_kd_per_day(0), "depth_m must be above 0 m"),
        (lambda: settling_rate_per_day(-0.1, 1), "velocity_m_per_day must be between 0"),
        (lambda: settling_rate_per_day(0.1, 0), "depth_m must be above 0 m"),
    ],
)
def test_impossible_value_is_refused_by_name(call, message):
    with pytest.raises(OutOfRangeError, match=message):
        call()


def test_thomas_line_agrees_with_published_example():
    line = thomas_slope([2, 4, 6], [10, 16, 20])
    assert line.intercept == _approx("B01", "thomas_intercept")
    assert line.slope == _approx("B01", "thomas_slope")
    assert line.rate_per_day / np.log(10) == _approx("B01", "k_base10_d")
    assert line.ultimate_mg_l == _approx("B01", "l0_mg_l")


def test_least_squares_on_the_slope_agrees_with_published_example():
    line = slope_least_squares([2, 4, 6, 8, 10], [11, 18, 22, 24, 26])
    assert line.intercept == _approx("B03", "a")
    assert line.rate_per_day == _approx("B03", "k_base_e_d")
    assert line.ultimate_mg_l == _approx("B03", "l0_mg_l")


def test_straight_rise_has_no_line_fit():
    with pytest.raises(FitError, match="bod_mg_l must curve as a first-order demand does"):
        thomas_slope([1, 2, 4], [8, 20, 70])
    with pytest.raises(FitError, match="bod_mg_l must level off"):
        slope_least_squares([1, 2, 3, 4], [1, 3, 7, 15])


def test_bottle_fit_agrees_with_certified_values():
    fit = fit_bottle(SERIES_DAYS, SERIES_BOD)
    assert fit.ultimate_mg_l == _approx("B05", "l0_mg_l")
    assert fit.rate_per_day == _approx("B05", "k_per_d")
    assert np.sqrt((fit.residuals**2).sum() / 4) == pytest.approx(2.549, abs=0.001)  # as the source prints it
    assert fit.converged and fit.reason == "" and fit.n == 6


def test_bottle_standard_errors_agree_with_certified_values():
    fit = fit_bottle(SERIES_DAYS, SERIES_BOD)
    # Printed for ln k in the documentation of R datasets::BOD: 19.143 ± 2.496 and -0.6328 ± 0.3824.
    assert fit.ultimate_se_mg_l == pytest.approx(2.496, abs=0.001)
    assert fit.rate_se_per_day / fit.rate_per_day == pytest.approx(0.3824, abs=0.0002)


@given(st.floats(2, 300), st.floats(0.05, 1.5))
def test_bottle_fit_finds_the_rates_that_made_the_readings(ultimate, rate):
    days = np.array([1.0, 2, 3, 5, 7, 10, 15])
    fit = fit_bottle(days, exerted_mg_l(ultimate, days, rate))
    assert fit.converged
    assert fit.rate_per_day == pytest.approx(rate, rel=1e-5)
    assert fit.ultimate_mg_l == pytest.approx(ultimate, rel=1e-5)


def test_bottle_intervals_hold_the_truth_about_nine_times_in_ten():
    days, draw = np.array([1.0, 2, 3, 5, 7, 10, 15, 20]), np.random.default_rng(11)
    held = np.zeros(2)
    for _ in range(100):
        fit = fit_bottle(days, exerted_mg_l(20.0, days, 0.3) + draw.normal(0, 0.8, 8))
        pairs = ((fit.rate_interval_per_day, 0.3), (fit.ultimate_interval_mg_l, 20.0))
        held += [low <= truth <= high for (low, high), truth in pairs]
    # 100 draws of a 90 % interval: within four standard deviations of 90.
    assert (abs(held - 90) <= 12).all()


@pytest.mark.parametrize(
    ("bod", "reason"),
    [
        ([1.0, 2.2, 3.5, 5.1], "do not level off"),
        ([9.0, 9.0, 9.0, 9.0], "all is exerted by the first reading"),
        ([-1.0, -2.0, -2.5, -2.8], "do not show a demand"),
    ],
)
def test_bottle_that_cannot_carry_a_rate_says_so_and_gives_none(bod, reason):
    fit = fit_bottle([1, 2, 3, 4], bod)
    assert not fit.converged
    assert reason in fit.reason
    assert np.isnan([fit.rate_per_day, fit.ultimate_mg_l, fit.rate_se_per_day]).all()


def test_bottle_read_too_early_leaves_its_ultimate_open():
    fit = fit_bottle([0.5, 1.0, 1.5, 2.0], [1.1, 2.3, 3.0, 4.1])
    assert fit.ultimate_interval_mg_l[1] == inf
    assert "bound the ultimate demand from above" in fit.reason


def test_bottle_without_enough_readings_is_refused():
    with pytest.raises(FitError, match="bod_mg_l must hold at least 3 readings at two or more times, got 2"):
        fit_bottle([1, 2, 3], [4, 6, np.nan])
    with pytest.raises(OutOfRangeError, match="bod_mg_l must have the shape of days"):
        fit_bottle([1, 2, 3], [4, 6])


RIVER_KM = np.array([0, 2, 4, 6, 8, 12, 16, 20.0])
RIVER_DAYS = RIVER_KM / 0.30 / 86.4
RIVER_BOD = [20.0000, 18.6582, 17.4065, 16.2387, 15.8060, 14.9750, 14.1876, 13.4416]  # as printed in B47


def test_two_slope_line_finds_the_break_and_rates_of_the_published_series():
    fit = fit_removal(RIVER_DAYS, RIVER_BOD)
    assert fit.break_days * 0.30 * 86.4 == _approx("B47", "break_km")
    assert fit.above_per_day == pytest.approx(0.9, abs=0.001)
    assert fit.below_per_day == pytest.approx(0.35, abs=0.001)
    assert fit.settling_per_day == pytest.approx(0.55, abs=0.001)
    assert fit.initial_mg_l == pytest.approx(20.0, abs=0.001)
    assert fit.two_slopes_supported and fit.converged


def test_intervals_of_the_two_slope_line_hold_the_truth_about_nine_times_in_ten():
    days, draw, held = np.linspace(0, 2, 11), np.random.default_rng(5), np.zeros(4)
    logs = np.log(20) - 0.3 * days - 0.9 * np.minimum(days, 0.8)
    for _ in range(100):
        fit = fit_removal(days, np.exp(logs + draw.normal(0, 0.05, 11)))
        pairs = (
            (fit.above_interval_per_day, 1.2),
            (fit.below_interval_per_day, 0.3),
            (fit.settling_interval_per_day, 0.9),
            (fit.break_interval_days, 0.8),
        )
        held += [low <= truth <= high for (low, high), truth in pairs]
    # 100 draws of a 90 % interval: within four standard deviations of 90.
    assert (abs(held - 90) <= 12).all()


def test_two_slopes_are_seldom_claimed_where_there_is_one():
    days, draw = np.linspace(0, 2, 9), np.random.default_rng(7)
    fits = [fit_removal(days, 20 * np.exp(-0.5 * days + draw.normal(0, 0.05, 9))) for _ in range(100)]
    # One in twenty by design; 14 is four standard deviations above.
    assert sum(fit.two_slopes_supported for fit in fits) <= 14


def test_one_slope_is_told_as_one():
    fit = fit_removal([0, 0.5, 1, 1.5, 2, 2.5], 20 * np.exp(-0.4 * np.arange(6) / 2))
    assert fit.single_per_day == pytest.approx(0.4)
    assert not fit.two_slopes_supported
    assert fit.reason == "the readings do not flatten downstream"


def test_order_of_the_stations_does_not_matter():
    shuffled = np.array([3, 0, 7, 1, 5, 2, 6, 4])
    fit = fit_removal(RIVER_DAYS[shuffled], np.array(RIVER_BOD)[shuffled])
    assert fit.break_days == pytest.approx(fit_removal(RIVER_DAYS, RIVER_BOD).break_days)


def test_four_stations_carry_one_slope_only_and_say_why():
    fit = fit_removal([0, 0.5, 1, 2], [20, 14, 12, 9])
    assert fit.single_per_day == pytest.approx(0.38, abs=0.03)
    assert np.isnan([fit.above_per_day, fit.below_per_day, fit.break_days]).all()
    assert fit.reason == "a break needs 5 stations, got 4"


def test_demand_that_rises_downstream_is_not_called_a_good_fit():
    fit = fit_removal([0, 1, 2, 3], [10, 12, 13, 15])
    assert not fit.converged
    assert "does not fall downstream" in fit.reason


def test_removal_refuses_what_it_cannot_take():
    with pytest.raises(FitError, match="bod_mg_l must hold readings at three or more travel_days, got 2"):
        fit_removal([0, 1, 2], [20, 15, np.nan])
    with pytest.raises(OutOfRangeError, match="bod_mg_l must be above 0 mg/L"):
        fit_removal([0, 1, 2], [20, 15, 0])
    with pytest.raises(OutOfRangeError, match="travel_days must be between 0"):
        fit_removal([-1, 1, 2], [20, 15, 10])
