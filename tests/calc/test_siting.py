"""Where the next station pays most, and the answer to "may we leave"."""

from dataclasses import replace

import numpy as np
import pytest

from calc.fit import FitSettings, refine
from calc.river import Inflow, Reach, River, Water
from calc.sag import critical_point, predict
from calc.siting import next_station, verdict

REACH = Reach(0, 60, velocity_m_s=0.3, depth_m=1.2, kd20_per_day=0.5, ka20_per_day=1.6, ks20_per_day=0.1)
OUTFALL = Inflow(0.0, Water(0.8, 5.0, 21.0, 90.0), "works", "outfall")
PLAN = River(Water(4.0, 8.4, 20.0, 2.0), (REACH,), (OUTFALL,))
TRUTH = replace(PLAN, reaches=(replace(REACH, kd20_per_day=0.6, ka20_per_day=1.3),))
LOWEST_KM = critical_point(TRUTH).distance_km
ACCESS = np.array([1.0, 4.0, 7.0, 9.0, 12.0, 15.0, 19.0, 24.0, 30.0, 38.0, 45.0, 55.0])


def readings(places, noise=0.0):
    return predict(TRUTH, places).do_mg_l + noise * np.sin(7.0 * np.arange(len(places)))


def test_while_oxygen_still_falls_at_the_last_station_only_points_beyond_it_are_offered():
    places = np.array([2.0, 4.0, 6.0])
    found = next_station(PLAN, places, readings(places), ACCESS)
    assert found
    assert all(one.distance_km > 6.0 for one in found)
    assert found[0].settles == "recovery"
    assert "recovers below your last station" in found[0].reason
    assert verdict(PLAN, places, readings(places)).word == "open below"


def test_while_oxygen_only_rises_only_points_above_the_first_station_are_offered():
    places = np.array([30.0, 40.0, 52.0])
    found = next_station(PLAN, places, readings(places), ACCESS)
    assert found
    assert all(one.distance_km < 30.0 for one in found)
    assert verdict(PLAN, places, readings(places)).word == "open above"


def test_stations_are_not_offered_again_nor_what_cannot_be_used():
    places = np.array([4.0, 12.0, 30.0])
    usable = ACCESS < 20
    found = next_station(PLAN, places, readings(places), ACCESS, usable=usable, how_many=20)
    offered = {one.distance_km for one in found}
    assert not offered & set(places)
    assert max(offered) < 20
    assert [ACCESS[one.access_index] for one in found] == [one.distance_km for one in found]


def test_of_points_nearly_as_good_the_cheapest_comes_first():
    places = np.array([4.0, 12.0, 30.0])
    free = FitSettings(enough_of_best=0.0)
    costs = np.where(ACCESS == 55.0, 1.0, 100.0)
    assert next_station(PLAN, places, readings(places), ACCESS, costs_min=costs, settings=free)[0].distance_km == 55.0
    strict = FitSettings(enough_of_best=1.0)
    found = next_station(PLAN, places, readings(places), ACCESS, costs_min=costs, settings=strict, how_many=20)
    assert found[0].gain == max(one.gain for one in found)


def test_without_costs_the_way_from_the_last_reading_counts():
    free = FitSettings(enough_of_best=0.0)
    places = np.array([4.0, 55.0, 12.0])
    found = next_station(PLAN, places, readings(places), ACCESS, settings=free)
    assert found[0].apart_km == np.abs(ACCESS[np.abs(ACCESS - 12.0) > 0] - 12.0).min()


def test_anywhere_needs_no_access_points():
    places = np.array([4.0, 12.0, 30.0])
    found = next_station(PLAN, places, readings(places), [], anywhere=True)
    assert len(found) == 3
    assert {one.access_index for one in found} == {-1}
    assert all(PLAN.from_km < one.distance_km <= PLAN.to_km for one in found)


def test_without_access_points_nothing_is_offered():
    assert next_station(PLAN, [4.0], [6.0], []) == ()


def test_the_walk_from_two_stations_ends_with_the_low_point_held():
    order = [7.0, 19.0]
    while len(order) < 9:
        answer = verdict(PLAN, order, readings(order, 0.05), access_km=ACCESS)
        if answer.word in ("held", "flat"):
            break
        order.append(next_station(PLAN, order, readings(order, 0.05), ACCESS)[0].distance_km)
    assert answer.word in ("held", "flat")
    assert min(order) < LOWEST_KM < max(order)
    estimate = refine(PLAN, order, readings(order, 0.05))
    assert estimate.critical_do_mg_l.low <= critical_point(TRUTH).do_mg_l <= estimate.critical_do_mg_l.high
    assert estimate.critical_km.low <= LOWEST_KM <= estimate.critical_km.high


def test_a_reading_there_narrows_about_as_much_as_was_promised():
    places = np.array([4.0, 12.0, 30.0])
    before = refine(PLAN, places, readings(places))
    found = next_station(PLAN, places, readings(places), ACCESS, estimate=before)[0]
    more = np.append(places, found.distance_km)
    after = refine(PLAN, more, readings(more))
    width = [one.critical_km.high - one.critical_km.low for one in (before, after)]
    assert found.gain > 0
    assert 1 - width[1] / width[0] == pytest.approx(found.narrows_place, abs=0.35)


def test_held_needs_four_stations_and_says_what_is_missing():
    answer = verdict(PLAN, [8.0, 12.0, 40.0], readings(np.array([8.0, 12.0, 40.0])))
    assert answer.word != "held"
    assert any("3 of at least 4 stations" in sentence for sentence in answer.missing)


def test_a_well_read_sag_is_held():
    places = np.array([1.0, 3.0, 6.0, 9.0, 11.0, 13.0, 16.0, 20.0, 25.0, 32.0, 40.0, 50.0])
    easy = FitSettings(regret_mg_l=0.2)
    answer = verdict(PLAN, places, readings(places, 0.03), settings=easy)
    assert answer.word == "held"
    assert answer.missing == ()
    assert answer.p_between >= 0.95


def test_the_value_settled_and_nowhere_left_to_narrow_the_place_is_flat():
    places = np.array([1.0, 3.0, 6.0, 9.0, 11.0, 13.0, 16.0, 20.0, 25.0, 32.0, 40.0, 50.0])
    strict = FitSettings(place_half=0.001, regret_mg_l=0.0)
    answer = verdict(PLAN, places, readings(places, 0.03), settings=strict, access_km=[])
    assert answer.word == "flat"
    assert len(answer.missing) == 1


def test_a_strained_fit_is_not_yet_held():
    places = np.array([1.0, 6.0, 9.0, 11.0, 13.0, 16.0, 25.0, 40.0])
    do = readings(places)
    do[6] += 2.0
    answer = verdict(PLAN, places, do)
    assert answer.word == "not yet"
    assert any("25.0 km" in sentence for sentence in answer.missing)


def test_where_estimate_and_bracket_rule_disagree_it_is_said():
    places = np.array([2.0, 6.0, 10.0, 18.0, 26.0, 45.0])
    easy = FitSettings(regret_mg_l=1.0, do_half_mg_l=1.0, between=0.5)
    answer = verdict(PLAN, places, readings(places), settings=easy)
    assert answer.word == "held"
    assert not answer.bracket.bracketed
    assert answer.disagrees
    assert "bracket rule does not" in answer.disagreement


def test_a_sag_that_ends_beyond_the_last_access_point_stays_open_below():
    places = np.array([1.0, 2.0, 3.0, 4.0, 5.0])
    answer = verdict(PLAN, places, readings(places), access_km=[1.5, 2.5])
    assert answer.word == "open below"
    assert any("below your last access point" in sentence for sentence in answer.missing)
    found = next_station(PLAN, places, readings(places), [1.5, 2.5])
    assert {one.distance_km for one in found} <= {1.5, 2.5}
