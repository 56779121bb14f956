"""The parts of the estimate: weighted quantiles, gaps, hypotheses, and readings made ready."""

import numpy as np
import pytest

from calc.beliefs import FitSettings, gap_edges, hypotheses
from calc.evidence import gather
from calc.river import Inflow, Reach, River, Water
from calc.sag import predict
from calc.weighted import quantiles

PLAN = River(
    Water(4.0, 8.4, 20.0, 2.0),
    (Reach(0, 60, velocity_m_s=0.3, depth_m=1.2, kd20_per_day=0.5, ka20_per_day=1.6),),
    (Inflow(0.0, Water(0.8, 5.0, 21.0, 90.0), "works", "outfall"),),
)
KM, DO = np.array([2.0, 6.0, 11.0]), np.array([7.0, 6.0, 5.5])


def test_equal_weights_give_the_ordinary_median():
    values = np.random.default_rng(1).standard_normal(101)
    assert quantiles(values, np.full(101, 1 / 101), [0.5])[0] == pytest.approx(np.median(values))


def test_a_draw_of_double_weight_counts_as_two():
    once = quantiles(np.array([1.0, 2.0, 3.0, 3.0]), np.full(4, 0.25), [0.5])
    double = quantiles(np.array([1.0, 2.0, 3.0]), np.array([0.25, 0.25, 0.5]), [0.5])
    assert double == pytest.approx(once, abs=0.2)
    assert quantiles(np.array([1.0, 9.0]), np.array([1.0, 0.0]), [0.05, 0.5]) == pytest.approx([1.0, 1.0])


def test_rows_have_their_own_quantiles():
    values = np.arange(20.0).reshape(2, 10)
    low, high = quantiles(values, np.full(10, 0.1), [0.2, 0.8])
    assert high - low == pytest.approx([6.0, 6.0])
    assert low[1] - low[0] == pytest.approx(10.0)


def test_the_narrowest_gaps_are_merged_when_there_are_many():
    edges = gap_edges(0.0, 50.0, np.linspace(1, 49, 40))
    assert len(edges) == 11
    assert (edges[0], edges[-1]) == (0.0, 50.0)
    assert np.diff(edges).max() < 12


@pytest.mark.parametrize("edges", [[0.0], [0.0, 5.0], [0.0, 5.0, 30.0]])
def test_the_weights_of_the_hypotheses_sum_to_one(edges):
    found = hypotheses(np.array(edges), FitSettings())
    assert np.exp(found.log_prior).sum() == pytest.approx(1.0)


def test_a_wider_gap_is_more_likely_to_hide_a_change():
    found = hypotheses(np.array([0.0, 5.0, 30.0]), FitSettings())
    weight = np.exp(found.log_prior[found.structure == 1])
    assert weight[1] == pytest.approx(5 * weight[0])


def test_replicates_of_a_visit_are_averaged_and_visits_are_not():
    km, do = np.repeat(KM, 2), np.repeat(DO, 2) + np.tile([-0.1, 0.1], 3)
    together = gather(PLAN, km, do, settings=FitSettings())[1]
    apart = gather(PLAN, km, do, visits=["a", "b"] * 3, settings=FitSettings())[1]
    assert together.do_mg_l == pytest.approx(DO)
    assert len(apart.do_mg_l) == 6
    assert (together.error_sd_mg_l < together.noise_mg_l).all()
    assert apart.error_sd_mg_l == pytest.approx(np.full(6, apart.noise_mg_l))
    assert list(together.row) == [0, 0, 1, 1, 2, 2]


def test_one_reading_warmer_than_the_rest_is_compared_by_its_deficit():
    profile = predict(PLAN, KM)
    celsius = profile.water_temp_c + [0.0, 0.0, 2.0]
    ready, evidence = gather(PLAN, KM, DO, water_temp_c=celsius, settings=FitSettings())
    assert evidence.warmer_c == pytest.approx(0.0)
    assert ready.head.water_temp_c == PLAN.head.water_temp_c
    # Water 2 °C warmer holds about 0.35 mg/L less at 20 °C (0.18 mg/L per °C), so the same oxygen is a smaller deficit.
    assert evidence.do_mg_l - DO == pytest.approx([0.0, 0.0, 0.35], abs=0.03)


def test_measured_demand_that_cannot_be_used_is_named():
    evidence = gather(PLAN, KM, DO, bod=([2.0, 99.0, 6.0], [10.0, 5.0, np.nan], 1.0), settings=FitSettings())[1]
    assert list(evidence.bod_mg_l) == [10.0]
    assert "2 of the measured demands could not be used" in evidence.dropped[0]
