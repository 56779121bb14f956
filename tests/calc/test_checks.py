"""Range and shape checks: what passes, what is refused and how it is said."""

import numpy as np
import pytest

from calc.checks import require_positive, require_range, require_same_shape
from calc.errors import OutOfRangeError


def test_values_inside_and_on_the_bounds_pass_as_floats():
    assert require_range("depth_m", [0, 1, 10], 0, 10, "m").tolist() == [0.0, 1.0, 10.0]


def test_missing_values_pass_among_others_and_alone():
    assert np.isnan(require_range("depth_m", [np.nan, 1.0], 0, 10, "m")).tolist() == [True, False]
    assert np.isnan(require_range("depth_m", np.nan, 0, 10, "m"))


def test_nothing_to_check_passes():
    assert require_range("depth_m", [], 0, 10, "m").size == 0


@pytest.mark.parametrize("value", [-0.1, 10.1, np.inf, -np.inf])
def test_first_offending_value_is_named_with_the_range_even_beside_a_missing_one(value):
    with pytest.raises(OutOfRangeError, match=f"depth_m must be between 0 and 10 m, got {value:g} m"):
        require_range("depth_m", [1.0, np.nan, value, 99.0], 0, 10, "m")


@pytest.mark.parametrize("value", [np.inf, -np.inf])
def test_infinity_is_refused_even_where_the_side_is_open(value):
    with pytest.raises(OutOfRangeError, match="do_mg_l must be between -inf and inf mg/L"):
        require_range("do_mg_l", value, -np.inf, np.inf, "mg/L")


def test_arrays_of_different_shape_are_named():
    with pytest.raises(OutOfRangeError, match="do_mg_l must have the shape of stations_km"):
        require_same_shape(stations_km=[1.0, 2.0], do_mg_l=[8.0])


@pytest.mark.parametrize(
    ("value", "message"), [(0.0, "must be above 0 m, got 0 m"), (-1.0, "must be between 0 and inf m")]
)
def test_zero_and_less_are_not_positive(value, message):
    with pytest.raises(OutOfRangeError, match=f"depth_m {message}"):
        require_positive("depth_m", [1.0, value], "m")


def test_positive_values_and_missing_ones_pass():
    assert require_positive("slope", 0.001, "") == 0.001
    assert np.isnan(require_positive("depth_m", np.nan, "m"))
