"""The bench of siting runs: its rivers are what they say, and every strategy gives numbers on a few of them."""

from dataclasses import replace

import numpy as np
import pytest

from calc.sag import critical_point
from tests.bench.siting import main
from tests.bench.siting_rivers import KINDS, WORLDS, simulated
from tests.bench.siting_strategies import EVEN, HALVE, LOWEST, NEXT, halving, nearest_free


def test_a_simulated_river_is_the_same_for_the_same_seed():
    first, second = simulated(1, 4), simulated(1, 4)
    assert first.truth.reaches == second.truth.reaches
    assert (first.readings_mg_l == second.readings_mg_l).all()
    assert simulated(2, 4).truth.reaches != first.truth.reaches


@pytest.mark.parametrize("index", range(6))
def test_a_simulated_river_has_a_sag_a_survey_would_look_for(index):
    sim = simulated(1, index)
    lowest = critical_point(sim.truth)
    assert 2 <= lowest.distance_km <= 60
    assert lowest.deficit_mg_l >= 1
    assert (sim.critical_km, sim.critical_do_mg_l) == (lowest.distance_km, lowest.do_mg_l)
    assert sim.kind == KINDS[index % 3]
    assert 15 <= len(sim.access_km) <= 40
    assert sim.access_km[-1] <= 3 * sim.plan.critical_km


@pytest.mark.parametrize("world", WORLDS)
def test_nowhere_is_a_simulated_river_lower_than_its_lowest_point(world):
    sim = simulated(3, 5, world)
    profile = sim.do_mg_l(np.linspace(0, 3 * sim.critical_km, 500))
    assert profile.min() >= sim.critical_do_mg_l - 1e-3
    assert profile.min() == pytest.approx(sim.critical_do_mg_l, abs=0.02)


def test_the_told_plan_knows_the_place_of_a_change_but_not_its_size():
    sim = next(sim for sim in (simulated(1, index) for index in range(1, 30, 3)) if len(sim.told.river.reaches) > 1)
    above, below = sim.told.river.reaches
    assert below.from_km == sim.truth.reaches[1].from_km
    assert (below.depth_m, below.velocity_m_s) == (above.depth_m, above.velocity_m_s)


def test_stations_are_the_nearest_access_points_not_yet_taken():
    assert nearest_free(np.array([1.0, 2.0, 5.0]), [1.9, 1.9, 1.9]) == [1, 0, 2]


@pytest.mark.parametrize(
    ("readings", "expected"),
    [
        ([9, 9, 9, 8, 9, 5, 9, 9, 9], 7),  # lowest at the last station: further down by 0.375 of 5 km
        ([9, 9, 9, 5, 9, 8, 9, 9, 9], 1),  # lowest at the first station: further up
    ],
)
def test_halving_extends_past_an_open_end(readings, expected):
    assert halving(_river_of_access_each_km(readings), [3, 5]) == expected


def test_halving_halves_the_wider_gap_beside_the_lowest_station():
    sim = _river_of_access_each_km([9, 9, 5, 9, 9, 9, 9, 9, 8])
    assert halving(sim, [0, 2, 8]) == 5


def _river_of_access_each_km(readings):
    """Return a simulated river whose plan predicts 5 km, with access at 1, 2 ... 9 km."""
    sim = simulated(1, 0)
    plan = replace(sim.plan, critical_km=5.0)
    return replace(sim, plan=plan, access_km=np.arange(1.0, 10.0), readings_mg_l=np.array(readings, dtype=float))


def test_the_bench_compares_strategies_on_the_same_rivers(capsys):
    rows = main(["--rivers", "3", "--seed", "1", "--sizes", "4", "6", "--strategies", LOWEST, EVEN, HALVE, NEXT])
    ratio = next(row for row in rows["base"] if row.text == f"{NEXT} 6 / {EVEN} 6: DO rms")
    assert 0.1 < ratio.value < 10
    printed = capsys.readouterr().out
    for strategy in (LOWEST, EVEN, HALVE, NEXT):
        assert sum(line.startswith(strategy) for line in printed.splitlines()) >= 2
    assert "4 stations: {" in printed
