import dataclasses
import math

import pytest

from calc.errors import CalcError
from calc.quality_series import stability, unstable
from calc.settings import Settings

SETTINGS = Settings()
NAN = math.nan
IN_TIME = (60, 90, 120, 150, 180)


def test_five_values_that_agree_are_stable_and_give_their_median():
    found = stability((6.1, 6.3, 6.2, 6.2, 6.2), (), SETTINGS)
    assert (found.stable, found.n, found.median, found.low, found.high) == (True, 5, 6.2, 6.1, 6.3)
    assert found.spread == pytest.approx(0.2)
    assert math.isnan(found.span_s) and found.why == ""


def test_five_values_that_climb_are_not_stable_and_say_which():
    found = stability((5.8, 6.0, 6.2, 6.3, 6.4), (), SETTINGS)
    assert found.stable is False
    assert found.why == "5.80 mg/L is further than 0.2 mg/L from the median of the last 5, 6.20 mg/L."


@pytest.mark.parametrize(
    ("parameter", "middle", "limit"),
    [
        ("do", 6.2, 0.2),
        ("temperature", 20.0, 0.2),
        ("conductance", 100.0, 5.0),
        ("conductance", 101.0, 3.03),
        ("conductance", 500.0, 15.0),
        ("ph", 7.4, 0.1),
    ],
)
@pytest.mark.parametrize(("part", "stable"), [(0.99, True), (1.0, True), (1.01, False), (-1.0, True), (-1.01, False)])
def test_each_parameter_is_stable_up_to_its_limit(parameter, middle, limit, part, stable):
    values = (middle, middle, middle + part * limit, middle, middle)
    assert stability(values, None, SETTINGS, parameter=parameter).stable is stable


@pytest.mark.parametrize("n", [1, 2, 3, 4])
def test_fewer_values_than_needed_can_not_be_told_but_have_a_median(n):
    found = stability((6.0, 9.0, 6.0, 6.0)[:n], (), SETTINGS)
    assert found.stable is None and found.n == n
    assert found.median == {1: 6.0, 2: 7.5, 3: 6.0, 4: 6.0}[n]
    assert f"{n} value" in found.why
    assert unstable(found, SETTINGS) == ()


def test_only_the_last_values_are_judged():
    found = stability((2.0, 4.0, 6.2, 6.2, 6.2, 6.1, 6.3), (), SETTINGS)
    assert (found.stable, found.n, found.low, found.median) == (True, 7, 6.1, 6.2)


@pytest.mark.parametrize(
    ("after_s", "stable"),
    [
        (IN_TIME, True),
        ((61, 91, 121, 151, 181), True),
        ((59, 89, 119, 149, 179), False),
        ((60, 90, 120, 150, 179), False),
        ((60, 90, 120, 150, 181), True),
        ((10, 20, NAN, 40, 50), True),
        ((10, 20, None, 40, 50), True),
        ((NAN,) * 5, True),
        ((), True),
        (None, True),
    ],
)
def test_known_times_must_leave_the_soak_and_span_two_minutes(after_s, stable):
    assert stability((6.2,) * 5, after_s, SETTINGS).stable is stable


def test_the_time_that_is_short_is_told():
    assert "59 s after the probe went in; 60 s" in stability((6.2,) * 5, (59, 90, 120, 150, 180), SETTINGS).why
    assert "span 119 s; 120 s" in stability((6.2,) * 5, (60, 90, 120, 150, 179), SETTINGS).why
    assert stability((6.2,) * 5, IN_TIME, SETTINGS).span_s == 120


def test_times_of_values_before_the_last_five_do_not_count():
    assert stability((5.0, *(6.2,) * 5), (5, *IN_TIME), SETTINGS).stable is True


def test_missing_values_are_left_out_with_their_times():
    found = stability((6.1, NAN, None, 6.3, math.inf, 6.2, 6.2, 6.2), (60, 1, 1, 90, 1, 120, 150, 180), SETTINGS)
    assert (found.stable, found.n, found.median, found.span_s) == (True, 5, 6.2, 120)


def test_without_any_value_nothing_is_known():
    found = stability((None, NAN), (), SETTINGS)
    assert found.stable is None and found.n == 0 and math.isnan(found.median)
    assert stability((), (), SETTINGS).stable is None


def test_the_surveys_own_settings_decide():
    eased = Settings.from_dict({"stable_mg_l": 0.3, "stable_values": 3})
    found = stability((5.0, 6.2, 6.5, 5.9), (), eased)
    assert (found.stable, found.median) == (True, 6.2)
    assert stability((6.2,), (), Settings.from_dict({"stable_values": 0})).stable is True


def test_values_still_moving_are_a_finding_that_can_be_answered_with_a_reason():
    (finding,) = unstable(stability((5.8, 6.0, 6.2, 6.3, 6.4), (), SETTINGS), SETTINGS)
    assert (finding.name, finding.field) == ("unstable", "do_mg_l")
    assert finding.says.startswith("Not stable: 5.80 mg/L") and "say why" in finding.do


def test_stable_and_missing_values_are_no_finding():
    assert unstable(stability((6.2,) * 5, IN_TIME, SETTINGS), SETTINGS) == ()
    assert unstable(None, SETTINGS) == ()


def test_conductance_and_temperature_tell_their_limits_in_their_own_way():
    (conductance, temperature) = (
        stability((500, 500, 520, 500, 500), (), SETTINGS, parameter="conductance"),
        stability((20, 20, 20.3, 20, 20), (), SETTINGS, parameter="temperature"),
    )
    assert "520 µS/cm is further than 3 %" in conductance.why
    assert "20.30 °C is further than 0.2 °C warmer or colder" in temperature.why


def test_another_parameter_is_refused():
    with pytest.raises(CalcError, match="parameter must be one of do, temperature, conductance, ph, got 'turbidity'"):
        stability((1.0,), (), SETTINGS, parameter="turbidity")


def test_times_that_do_not_belong_to_the_values_are_refused():
    with pytest.raises(CalcError, match="one time for each value, got 1 for 2"):
        stability((1.0, 2.0), (60,), SETTINGS)


def test_a_verdict_can_not_be_changed():
    with pytest.raises(dataclasses.FrozenInstanceError, match="stable"):
        stability((6.2,), (), SETTINGS).stable = True
