import math

import numpy as np
import pytest

from calc.findings import Finding, exceeds, known, or_nan, reaches, shown, within
from calc.oxygen import saturation_mg_l


def test_missing_and_infinite_values_become_nan():
    values = known(None, math.nan, math.inf, -math.inf, 3, np.float64(2.5))
    assert [math.isnan(value) for value in values] == [True] * 4 + [False] * 2
    assert values[4:] == (3.0, 2.5)
    assert all(type(value) is float for value in values)


def test_a_step_of_one_in_decimals_is_not_above_one():
    assert 8.3 - 7.3 > 1
    assert not exceeds(8.3 - 7.3, 1)
    assert exceeds(1.01, 1)


def test_a_limit_met_in_decimals_is_reached():
    assert 0.3 - 0.2 < 0.1
    assert reaches(0.3 - 0.2, 0.1)
    assert not reaches(0.099, 0.1)


def test_both_limits_lie_within():
    assert [within(value, 1, 2) for value in (0.99, 1, 2, 2.01)] == [False, True, True, False]


def test_nan_meets_no_limit():
    assert not exceeds(math.nan, 1)
    assert not reaches(math.nan, 1)
    assert not within(math.nan, 0, 1)


def test_outside_an_equation_there_is_no_value():
    assert math.isnan(or_nan(saturation_mg_l, 68.0))
    assert or_nan(saturation_mg_l, 20.0) == pytest.approx(9.09, abs=0.005)


def test_a_tiny_negative_is_not_shown_as_minus_zero():
    assert shown(-0.004, 2) == "0.00"
    assert shown(-0.05, 2) == "-0.05"


def test_the_name_of_a_finding_reads_as_plain_words():
    finding = Finding("late_for_parcel", "taken_at", "says", "cause", "do", {"a": 1})
    assert finding.label == "Late for parcel"
    assert hash(finding) == hash(Finding("late_for_parcel", "taken_at", "says", "cause", "do"))
