from dataclasses import fields, replace

import numpy as np
import pytest
from scipy.special import ndtri

from calc.critical import STILL_FALLING
from calc.errors import OutOfRangeError
from calc.river import Inflow, Reach, River, Water
from calc.sag import critical_point, predict
from calc.spread import PlanSpread, band, critical_interval, ensemble, evenly_spread

CERTAIN = PlanSpread(**{deviation.name: 0.0 for deviation in fields(PlanSpread)})


def plan():
    reaches = (Reach(0.0, 15.0, 0.15, 1.2, 0.6, 1.6), Reach(15.0, 40.0, 0.45, 0.8, 0.5, 4.0))
    inflows = (
        Inflow(0.0, Water(0.6, 2.0, 22.0, 90.0, 20.0), kind="outfall"),
        Inflow(20.0, Water(0.5, 9.0, 17.0, 3.0, 1.0)),
    )
    return River(Water(3.0, 8.4, 19.0, 2.0, 0.5), reaches, inflows)


def only(**deviations):
    return replace(CERTAIN, **deviations)


def test_same_plan_gives_the_same_rivers():
    first, second = (band(plan(), [2.0, 10.0, 30.0]) for _ in range(2))
    assert first.low_mg_l.tolist() == second.low_mg_l.tolist()


def test_points_fill_each_axis_and_each_pair_of_axes_evenly():
    points = evenly_spread(256, 7)
    assert points.shape == (256, 7)
    for axis in points.T:
        assert np.abs(np.sort(axis) - (np.arange(256) + 0.5) / 256).max() < 0.03
    off_diagonal = np.corrcoef(ndtri(points).T) - np.eye(7)
    assert np.abs(off_diagonal).max() < 0.15


def test_spread_of_the_rivers_is_the_spread_asked_for():
    rivers, spread = ensemble(plan(), n=1024), PlanSpread()
    of_plan = plan().reaches[0]
    first, second = rivers.reaches
    for name, deviation in (("kd20_per_day", 0.35), ("ka20_per_day", 0.40), ("velocity_m_s", 0.15)):
        log_factor = np.log(getattr(first, name) / getattr(of_plan, name))
        assert log_factor.std() == pytest.approx(deviation, rel=0.02)
        assert log_factor.mean() == pytest.approx(0.0, abs=0.01)
    assert np.log(rivers.head.cbod_mg_l / 2.0).std() == pytest.approx(spread.log_cbod, rel=0.02)
    assert np.log(rivers.inflows[0].water.nbod_mg_l / 20.0).std() == pytest.approx(spread.log_nbod, rel=0.02)
    assert rivers.initial_deficit_shift_mg_l.std() == pytest.approx(0.3, rel=0.02)
    assert first.respiration_mg_l_per_day.std() == pytest.approx(0.2 + 0.5 / 1.2, rel=0.02)
    assert second.respiration_mg_l_per_day.std() == pytest.approx(0.2 + 0.5 / 0.8, rel=0.02)


def test_one_factor_is_shared_by_all_reaches_and_by_head_and_outfall():
    rivers = ensemble(plan())
    first, second = rivers.reaches
    assert first.kd20_per_day / 0.6 == pytest.approx(second.kd20_per_day / 0.5)
    assert rivers.head.cbod_mg_l / 2.0 == pytest.approx(rivers.inflows[0].water.cbod_mg_l / 90.0)
    assert rivers.inflows[1].water.cbod_mg_l == 3.0


def test_initial_deficit_is_shifted_where_the_outfall_has_mixed():
    rivers = ensemble(plan(), only(initial_deficit_mg_l=0.3))
    mixed = predict(plan(), 0.0).do_mg_l
    assert predict(rivers, 0.0).do_mg_l == pytest.approx(mixed - rivers.initial_deficit_shift_mg_l)


def test_certain_plan_has_no_band():
    known = band(plan(), [0.0, 10.0, 40.0], CERTAIN)
    assert known.low_mg_l == pytest.approx(known.high_mg_l)
    assert known.median_mg_l == pytest.approx(predict(plan(), [0.0, 10.0, 40.0]).do_mg_l)
    place = critical_interval(plan(), CERTAIN)
    point = critical_point(plan())
    assert (place.distance_km.low, place.distance_km.high) == pytest.approx((point.distance_km, point.distance_km))
    assert place.do_mg_l.median == pytest.approx(point.do_mg_l)


def test_band_of_one_guess_is_where_that_guess_puts_it():
    low, high = 1.6 * np.exp(0.4 * ndtri([0.05, 0.95]))
    bounds = [
        predict(replace(plan(), reaches=(replace(plan().reaches[0], ka20_per_day=ka), plan().reaches[1])), 10.0).do_mg_l
        for ka in (low, high)
    ]
    guessed = band(plan(), 10.0, only(log_ka=0.4), n=2048)
    assert [guessed.low_mg_l, guessed.high_mg_l] == pytest.approx(bounds, abs=0.02)


def test_band_holds_the_share_of_other_plausible_rivers_it_claims():
    kd, ka = np.exp(np.random.default_rng(5).normal(0, [0.35, 0.40], (2000, 2))).T
    reaches = tuple(
        replace(reach, kd20_per_day=reach.kd20_per_day * kd, ka20_per_day=reach.ka20_per_day * ka)
        for reach in plan().reaches
    )
    distance_km = [3.0, 10.0, 30.0]
    do = predict(replace(plan(), reaches=reaches), distance_km).do_mg_l
    guessed = band(plan(), distance_km, only(log_kd=0.35, log_ka=0.40))
    inside = ((do >= guessed.low_mg_l) & (do <= guessed.high_mg_l)).mean(axis=0)
    assert inside == pytest.approx([0.9, 0.9, 0.9], abs=0.025)


def test_wider_level_gives_a_wider_band():
    narrow, wide = (band(plan(), 10.0, level=level) for level in (0.5, 0.95))
    assert wide.low_mg_l < narrow.low_mg_l < narrow.median_mg_l < narrow.high_mg_l < wide.high_mg_l


def test_place_is_known_less_well_than_the_value():
    known = critical_interval(plan())
    point = critical_point(plan())
    assert known.distance_km.low < point.distance_km < known.distance_km.high
    assert known.travel_time_h.low < point.travel_time_h < known.travel_time_h.high
    assert known.do_mg_l.low < point.do_mg_l < known.do_mg_l.high
    assert known.still_falling == 0.0


def test_share_whose_oxygen_still_falls_at_the_end_of_the_plan_is_told():
    short = replace(plan(), reaches=(replace(plan().reaches[0], to_km=9.0),), inflows=plan().inflows[:1])
    known = critical_interval(short)
    falling = critical_point(ensemble(short)).kind == STILL_FALLING
    assert known.still_falling == falling.mean()
    assert 0.3 < known.still_falling < 0.8
    assert known.distance_km.high == 9.0


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: ensemble(plan(), n=1), "n must be between 2 and 100000, got 1"),
        (lambda: band(plan(), 1.0, level=90), "level must be between 0.01 and 0.999, got 90"),
        (lambda: PlanSpread(log_kd=-0.1), "log_kd must be between 0 and 3, got -0.1"),
        (lambda: band(plan(), 41.0), "distance_km must be between 0 and 40 km"),
    ],
)
def test_spread_refuses_what_cannot_be(call, message):
    with pytest.raises(OutOfRangeError, match=message):
        call()
