"""Mixing: mass is conserved, published balances, and the distance to complete mixing."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from calc.errors import OutOfRangeError
from calc.mixing import complete_mix_km, mix_waters, mixed
from calc.oxygen import deficit_mg_l
from calc.river import Water
from tests.calc.rows import rows

PUBLISHED = {
    (row_id, quantity): (value, tolerance)
    for row_id, quantity, value, tolerance in rows("mixing_balance.csv", "id", "quantity", "value", "tolerance")
}
LENGTHS = rows(
    "mixing_length.csv", "velocity_m_s", "width_m", "depth_m", "slope", "centre_m", "bank_m", "tolerance_percent"
)
WATERS = st.lists(st.tuples(st.floats(0.01, 500), st.floats(0, 500)), min_size=1, max_size=5)


@pytest.mark.parametrize(
    ("row", "flows", "values"),
    [
        (("M03", "l_mix_mg_l"), [8.70, 1.10], [6.0, 50.0]),
        (("M05", "t_mix_c"), [2.4, 0.35, 0.12], [18.2, 23.5, 20.0]),
        (("M07", "c_mix"), [0.8, 0.0], [7.0, 99.0]),
    ],
)
def test_mixture_agrees_with_published_balance(row, flows, values):
    expected, tolerance = PUBLISHED[row]
    assert mixed(flows, values) == pytest.approx(expected, abs=tolerance)


def test_deficit_after_mixing_agrees_with_published_example():
    expected, tolerance = PUBLISHED["M03", "d0_mg_l"]
    assert deficit_mg_l(mixed([8.70, 1.10], [8.3, 2.0]), 20.0) == pytest.approx(expected, abs=tolerance)


@given(WATERS)
def test_mass_is_conserved(waters):
    flows, values = np.array(waters).T
    assert mixed(flows, values) * flows.sum() == pytest.approx((flows * values).sum(), rel=1e-12, abs=1e-9)


@given(WATERS)
def test_mixture_lies_between_its_waters(waters):
    flows, values = np.array(waters).T
    assert values.min() - 1e-9 <= mixed(flows, values) <= values.max() + 1e-9


def test_one_flow_each_mixes_values_of_many_draws():
    values = np.array([[8.0, 9.0, np.nan], [2.0, 3.0, 4.0]])
    draws = mixed([3.0, 1.0], values)
    assert draws == pytest.approx([mixed([3.0, 1.0], values[:, n]) for n in range(3)], nan_ok=True)
    assert draws[:2] == pytest.approx([6.5, 7.5])


def test_many_flows_mix_one_value_each():
    assert mixed([[3.0, 1.0], [1.0, 1.0]], [8.0, 2.0]) == pytest.approx([6.5, 5.0])


def test_water_without_flow_adds_nothing_even_when_its_value_is_missing():
    assert mixed([2.0, 0.0], [7.0, np.nan]) == 7.0


@pytest.mark.parametrize(
    ("flows", "values", "message"),
    [
        ([2.0, -0.1], [7.0, 7.0], "flows_m3_s must be between 0 and inf m³/s, got -0.1"),
        ([0.0, 0.0], [7.0, 7.0], "flows must add up to more than 0 m³/s"),
        ([1.0, 2.0], [7.0], "values must hold one for each of the 2 flows_m3_s, got 1"),
    ],
)
def test_impossible_mixture_is_refused(flows, values, message):
    with pytest.raises(OutOfRangeError, match=message):
        mixed(flows, values)


def test_every_field_of_two_waters_is_mixed_by_flow():
    river, outfall = Water(8.70, 8.3, 18.0, 6.0, 1.0, 300.0), Water(1.10, 2.0, 24.0, 50.0, 30.0, 1200.0)
    both = mix_waters((river, outfall))
    assert both.flow_m3_s == pytest.approx(9.8)
    for name in ("do_mg_l", "water_temp_c", "cbod_mg_l", "nbod_mg_l", "conductance_us_cm"):
        expected = (8.70 * getattr(river, name) + 1.10 * getattr(outfall, name)) / 9.8
        assert getattr(both, name) == pytest.approx(expected)


def test_water_of_unknown_conductance_counts_as_fresh_and_only_unknown_stays_unknown():
    fresh, salty = Water(3.0, 8.0, 18.0), Water(1.0, 8.0, 18.0, conductance_us_cm=2000.0)
    assert mix_waters([fresh, salty]).conductance_us_cm == 500.0
    assert np.isnan(mix_waters([fresh, fresh]).conductance_us_cm)


def test_waters_of_many_draws_mix_draw_by_draw():
    river, outfall = Water(np.array([3.0, 1.0]), 8.0, 18.0), Water(1.0, np.array([4.0, 2.0]), 20.0, cbod_mg_l=40.0)
    both = mix_waters([river, outfall])
    assert both.flow_m3_s.tolist() == [4.0, 2.0]
    assert both.do_mg_l == pytest.approx([7.0, 5.0])
    assert both.cbod_mg_l == pytest.approx([10.0, 20.0])


def test_no_water_cannot_be_mixed():
    with pytest.raises(OutOfRangeError, match="waters must hold at least one water, got none"):
        mix_waters([])


@pytest.mark.parametrize(("velocity", "width", "depth", "slope", "centre_m", "bank_m", "percent"), LENGTHS)
def test_mixing_distance_agrees_with_published_equation(velocity, width, depth, slope, centre_m, bank_m, percent):
    for at_bank, expected_m in ((False, centre_m), (True, bank_m)):
        distance = complete_mix_km(velocity, depth, width, slope, at_bank=at_bank)
        assert distance.best_km == pytest.approx(expected_m / 1000, rel=percent / 100)
        assert distance.low_km == pytest.approx(distance.best_km / 2)
        assert distance.high_km == pytest.approx(distance.best_km * 1.5)


def test_straight_channel_needs_four_times_the_distance():
    natural, straight = (complete_mix_km(0.5, 1.0, 30.0, 0.0005, at_bank=True, straight=way) for way in (False, True))
    assert straight.best_km == pytest.approx(4 * natural.best_km)


def test_mixing_distance_of_arrays_equals_that_of_scalars():
    distances = complete_mix_km([0.5, 0.8], [1.0, 2.0], [30.0, 60.0], [0.0005, 0.0003], at_bank=False)
    assert distances.best_km[1] == complete_mix_km(0.8, 2.0, 60.0, 0.0003, at_bank=False).best_km


@pytest.mark.parametrize("name", ["velocity_m_s", "depth_m", "width_m", "slope"])
def test_zero_of_any_dimension_is_refused_by_name(name):
    arguments = {"velocity_m_s": 0.5, "depth_m": 1.0, "width_m": 30.0, "slope": 0.0005, name: 0.0}
    with pytest.raises(OutOfRangeError, match=f"{name} must be above 0"):
        complete_mix_km(**arguments, at_bank=True)
