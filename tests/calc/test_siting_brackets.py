"""The trade's bracket rule, clause by clause."""

from dataclasses import replace

import numpy as np
import pytest

from calc.brackets import bracket_check
from calc.river import Inflow, Reach, River, Water, Weir

PLAN = River(
    Water(4.0, 8.4, 20.0, 2.0),
    (Reach(-5, 60, velocity_m_s=0.25, depth_m=1.2, kd20_per_day=0.5, ka20_per_day=1.6),),
    (Inflow(0.0, Water(0.8, 5.0, 21.0, 90.0), "works", "outfall"),),
)
KM = np.array([4.0, 8.0, 10.0, 12.0, 16.0])
DO = np.array([6.3, 5.4, 5.0, 5.4, 6.2])


def holds(check):
    return {clause.key: clause.holds for clause in check.clauses}


def test_a_bracketed_low_point_meets_every_clause():
    check = bracket_check(PLAN, KM, DO, section_checked=True, replicated=True)
    assert set(holds(check).values()) == {True}
    assert check.bracketed
    assert (check.lowest_km, check.lowest_mg_l) == (10.0, 5.0)
    assert check.between_km == (10.0, 10.0)
    assert check.add == ()


def test_what_is_not_known_of_the_lowest_station_does_not_count_against_it():
    check = bracket_check(PLAN, KM, DO)
    assert holds(check)["f"] is None
    assert check.bracketed
    assert holds(bracket_check(PLAN, KM, DO, replicated=False))["f"] is False


@pytest.mark.parametrize(
    ("km", "do", "key"),
    [
        (KM[2:], DO[2:], "a"),
        (KM[:4], DO[:4], "a"),
        (KM, [5.1, 5.1, 5.0, 5.4, 6.2], "b"),
        (KM, [6.5, 5.4, 5.0, 6.2, 6.1], "c"),
        ([2.0, 5.0, 10.0, 12.0, 16.0], DO, "d"),
    ],
    ids=["none upstream", "one downstream", "not clearly higher", "falling again", "wide gap"],
)
def test_each_clause_can_fail_alone(km, do, key):
    check = bracket_check(PLAN, km, do)
    assert holds(check)[key] is False
    assert not check.bracketed


def test_the_gap_is_measured_in_travel_time():
    slow = replace(
        PLAN, reaches=(replace(PLAN.reaches[0], to_km=8.5), replace(PLAN.reaches[0], from_km=8.5, velocity_m_s=0.05))
    )
    assert holds(bracket_check(PLAN, KM, DO))["d"] is True
    assert holds(bracket_check(slow, KM, DO))["d"] is False


def test_a_weir_or_inflow_before_the_rise_leaves_recovery_unproven():
    weir = replace(PLAN, weirs=(Weir(11.0, 1.0, name="mill weir"),))
    check = bracket_check(weir, KM, DO)
    assert holds(check)["e"] is False
    assert "mill weir" in check.clauses[4].said
    taken = replace(PLAN, inflows=(*PLAN.inflows, Inflow(11.0, Water(0.5, 0, 0), kind="withdrawal")))
    assert holds(bracket_check(taken, KM, DO))["e"] is True


def test_stations_that_hardly_differ_are_flat():
    flat = bracket_check(PLAN, KM, [6.5, 5.2, 5.0, 5.1, 6.2])
    assert flat.flat
    assert flat.between_km == (8.0, 12.0)
    assert not bracket_check(PLAN, KM, DO).flat


def test_a_larger_error_asks_for_a_larger_rise():
    assert holds(bracket_check(PLAN, KM, [5.5, 5.4, 5.0, 5.4, 5.5]))["b"] is True
    assert holds(bracket_check(PLAN, KM, [5.5, 5.4, 5.0, 5.4, 5.5], replicate_spread_mg_l=0.4))["b"] is False


def test_the_rule_asks_for_stations():
    last = bracket_check(PLAN, KM[:3], DO[:3])
    assert any("go on downstream" in sentence for sentence in last.add)
    first = bracket_check(PLAN, KM[2:], DO[2:])
    assert any("go on upstream" in sentence for sentence in first.add)
    wide = bracket_check(PLAN, [2.0, 5.0, 10.0, 12.0, 16.0], DO)
    assert any("from 5.0 to 10.0 km is wide" in sentence for sentence in wide.add)
    step = bracket_check(PLAN, KM, [7.5, 6.2, 5.0, 5.4, 6.2])
    assert any("from 8.0 to 10.0 km" in sentence for sentence in step.add)
    far = bracket_check(PLAN, KM, DO, predicted_mg_l=DO + [0.0, 0.0, 0.9, 0.9, 0.0])
    assert any("10.0 and 12.0 km" in sentence for sentence in far.add)


def test_missing_readings_and_those_above_the_outfall_are_left_out():
    km, do = np.append(KM, [-2.0, 20.0]), np.append(DO, [3.0, np.nan])
    assert bracket_check(PLAN, km, do) == bracket_check(PLAN, KM, DO)


@pytest.mark.parametrize("km", [[], [np.nan], [-2.0]])
def test_without_a_station_below_the_outfall_nothing_is_bracketed(km):
    check = bracket_check(PLAN, km, np.full(len(km), 7.0))
    assert not check.bracketed
    assert check.lowest_km is None
