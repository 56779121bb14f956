from dataclasses import replace

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from calc.demand import ultimate_mg_l
from calc.errors import OutOfRangeError
from calc.oxygen import saturation_mg_l
from calc.reaeration import at_temperature
from calc.river import Inflow, Reach, River, Thetas, Water, Weir
from calc.sag import critical_point, critical_time_d, deficit_mg_l, predict
from tests.calc.integration import random_river
from tests.calc.rows import inputs, rows

EXAMPLES = rows("sag_examples.csv")
EXTENSIONS = rows("sag_extensions.csv")
KM_PER_MILE = 1.609344
AT_20_C = Thetas(1.0, 1.0, 1.0, 1.0, 1.0)


def expected(example):
    return {
        row["quantity"]: pytest.approx(row["value"], abs=row["tolerance"]) for row in EXAMPLES if row["id"] == example
    }


def example_inputs(example):
    return inputs(next(row["inputs"] for row in EXAMPLES if row["id"] == example))


def one_reach(values, do_sat, velocity_m_s, initial_deficit):
    """Return a river at the temperature where saturation is do_sat, its outfall part of the head."""
    temperatures = np.linspace(0, 40, 40001)
    water_temp_c = float(np.interp(-do_sat, -saturation_mg_l(temperatures), temperatures))
    head = Water(1.0, do_sat - initial_deficit, water_temp_c, values["L0"])
    return River(head, (Reach(0.0, 400.0, velocity_m_s, 1.0, values["kd"], values["ka"]),), thetas=AT_20_C)


def stretch(values):
    return {
        "initial_deficit_mg_l": values.get("D0", 0.0),
        "cbod_mg_l": values["L0"],
        "kd_per_day": values["kd"],
        "ka_per_day": values["ka"],
        "ks_per_day": values.get("ks", 0.0),
        "nbod_mg_l": values.get("N0", 0.0),
        "kn_per_day": values.get("kn", 0.0),
        "net_demand_mg_l_per_day": values.get("net", 0.0),
    }


def test_sag_agrees_with_example_s01():
    values, answers = example_inputs("S01"), expected("S01")
    point = critical_point(one_reach(values, 10.0, 48 * KM_PER_MILE / 86.4, 0.0))
    assert point.travel_time_h / 24 == answers["tc_d"]
    assert point.distance_km / KM_PER_MILE == answers["xc_mile"]
    assert point.deficit_mg_l == answers["dc_mg_l"]
    assert point.do_mg_l == answers["do_min_mg_l"]
    # Deficit is proportional to the load when there is none at first, so a deficit of 5 leaves this share of it.
    assert 1 - 5.0 / point.deficit_mg_l == answers["removal_fraction_for_do_min_5"]


def test_sag_agrees_with_example_s07():
    values, answers = example_inputs("S07"), expected("S07")
    temperatures = np.linspace(20, 40, 20001)
    warm = float(np.interp(-8.0, -saturation_mg_l(temperatures), temperatures))
    head = Water(values["Qr"], values["DOr"], warm, values["Lr"])
    outfall = Inflow(0.0, Water(values["Qw"], values["DOw"], warm, values["Lw"]), kind="outfall")
    reach = Reach(0.0, 100.0, 0.65, 1.0, values["kd"], values["ka"])
    river = River(head, (reach,), (outfall,), thetas=AT_20_C)
    mixing, point = predict(river, 0.0), critical_point(river)
    assert mixing.cbod_mg_l == answers["l0_mg_l"]
    assert mixing.do_mg_l == answers["do_mix_mg_l"]
    assert point.travel_time_h / 24 == answers["tc_d"]
    assert point.distance_km == answers["xc_km"]
    assert point.deficit_mg_l == answers["dc_mg_l"]
    assert point.do_mg_l == answers["do_min_mg_l"]


def test_sag_agrees_with_example_s13():
    values, answers = example_inputs("S13"), expected("S13")
    point = critical_point(one_reach(values, 9.1, 0.30, values["D0"]))
    assert point.travel_time_h / 24 == answers["tc_d"]
    assert point.distance_km == answers["xc_km"]
    assert point.deficit_mg_l == answers["dc_mg_l"]
    assert point.do_mg_l == answers["do_min_mg_l"]


def test_sag_agrees_with_example_s17_from_bod5_and_rates_at_20_degrees():
    answers = expected("S17")
    head = Water(8.0, 0.90 * float(saturation_mg_l(15.0)), 15.0, float(ultimate_mg_l(2.0, 5, 0.30)))
    outfall = Inflow(0.0, Water(1.25, 0.0, 20.0, float(ultimate_mg_l(250.0, 5, 0.30))), kind="outfall")
    reach = Reach(0.0, 300.0, 3.0 / 3.6, 2.0, 0.30, 0.70)
    river = River(head, (reach,), (outfall,), thetas=Thetas(kd=1.135, ka=1.024))
    mixing, point = predict(river, 0.0), critical_point(river)
    assert mixing.water_temp_c == answers["t_mix_c"]
    assert mixing.do_mg_l == answers["do_mix_mg_l"]
    assert mixing.cbod_mg_l == answers["l0_mg_l"]
    assert at_temperature(0.30, mixing.water_temp_c, 1.135) == answers["kd_d"]
    assert at_temperature(0.70, mixing.water_temp_c, 1.024) == answers["ka_d"]
    assert point.travel_time_h / 24 == answers["tc_d"]
    assert point.distance_km == answers["xc_km"]
    assert point.deficit_mg_l == answers["dc_mg_l"]
    # The book turns what is left into BOD5 with the rate of 20 °C.
    left = predict(river, point.distance_km).cbod_mg_l
    assert left * (1 - np.exp(-5 * 0.30)) == answers["bod5_at_xc"]


@pytest.mark.parametrize("example", ["S19", "S21"])
def test_closed_form_agrees_with_examples_of_equal_rates_and_of_slow_reaeration(example):
    values, answers = example_inputs(example), expected(example)
    critical_d = critical_time_d(**stretch(values))
    assert critical_d == answers["tc_d"]
    assert deficit_mg_l(critical_d, **stretch(values)) == answers["dc_mg_l"]
    if "do_min_linear_mg_l" in answers:
        assert values["do_sat"] - deficit_mg_l(critical_d, **stretch(values)) == answers["do_min_linear_mg_l"]


def test_river_of_example_s21_goes_anoxic_instead_of_below_zero():
    values = example_inputs("S21")
    river = one_reach(values, values["do_sat"], 0.30, values["D0"])
    profile, point = predict(river, np.linspace(0, 400, 2001)), critical_point(river)
    assert profile.do_mg_l.min() == 0.0
    assert point.do_mg_l == 0.0
    assert point.anoxic
    assert point.distance_km == point.anoxic_from_km
    inside = (profile.distance_km > point.anoxic_from_km) & (profile.distance_km < point.anoxic_to_km)
    assert profile.anoxic.tolist() == inside.tolist()
    # Without oxygen L falls by ka Cs a day until kd L is no more than that.
    onset_d, supply = point.travel_time_h / 24, values["ka"] * values["do_sat"]
    waiting = values["L0"] * np.exp(-values["kd"] * onset_d) - supply / values["kd"]
    assert point.anoxic_to_km - point.anoxic_from_km == pytest.approx(0.30 * 86.4 * waiting / supply, rel=1e-6)


@pytest.mark.parametrize("row", [row for row in EXTENSIONS if row["quantity"].startswith("deficit at t=")])
def test_deficit_agrees_with_extended_examples(row):
    time_d = float(row["quantity"].removeprefix("deficit at t=").removesuffix(" d"))
    assert deficit_mg_l(time_d, **stretch(inputs(row["inputs"]))) == pytest.approx(row["value"], abs=row["tolerance"])


@pytest.mark.parametrize("row", [row for row in EXTENSIONS if row["quantity"].startswith("t of max deficit")])
def test_critical_time_agrees_with_extended_examples(row):
    time_d, highest = (float(text) for text in row["value"].split("/"))
    critical_d = critical_time_d(**stretch(inputs(row["inputs"])))
    assert critical_d == pytest.approx(time_d, abs=row["tolerance"])
    assert deficit_mg_l(critical_d, **stretch(inputs(row["inputs"]))) == pytest.approx(highest, abs=row["tolerance"])


def test_permissible_load_of_thomas_is_within_two_percent_of_the_exact_one():
    (row,) = [row for row in EXTENSIONS if row["quantity"] == "thomas_1948_permissible_l0"]
    values = inputs(row["inputs"])
    of_one = {**stretch({**values, "L0": 1.0})}
    exact = values["Dc"] / deficit_mg_l(critical_time_d(**of_one), **of_one)
    assert row["value"] == pytest.approx(exact, rel=0.02)


RATE = st.floats(0.01, 20)


@given(RATE, RATE, st.floats(0, 5), st.floats(1, 100))
@example(14.5, 0.01, 0.0, 1.0)  # the curve is all but flat where the search begins
def test_critical_time_is_the_classic_one_without_settling(kd, ka, initial, load):
    values = {"D0": initial, "L0": load, "kd": kd, "ka": ka}
    critical_d = critical_time_d(**stretch(values))
    if ka * initial >= kd * load:
        assert critical_d == 0.0
    elif abs(ka - kd) > 1e-3:
        classic = np.log(ka / kd * (1 - initial * (ka - kd) / (kd * load))) / (ka - kd)
        assert critical_d == pytest.approx(classic, rel=1e-7, abs=1e-9)


@given(RATE, st.floats(0, 5), st.floats(1, 100), st.floats(0, 20))
def test_deficit_is_smooth_through_equal_rates(rate, initial, load, time_d):
    near, equal = (
        deficit_mg_l(time_d, initial_deficit_mg_l=initial, cbod_mg_l=load, kd_per_day=rate, ka_per_day=ka)
        for ka in (rate * (1 + 1e-10), rate)
    )
    assert equal == pytest.approx((initial + rate * load * time_d) * np.exp(-rate * time_d), rel=1e-12)
    assert near == pytest.approx(equal, rel=1e-8)


def test_closed_form_does_not_overflow_far_down_a_fast_stretch():
    times = np.array([0.0, 1.0, 1e3, 1e5])
    fast = {"initial_deficit_mg_l": 1.0, "cbod_mg_l": 20.0, "kd_per_day": 0.3, "ka_per_day": 90.0}
    assert np.isfinite(deficit_mg_l(times, **fast)).all()
    assert np.isfinite(deficit_mg_l(times, **{**fast, "kd_per_day": 90.0, "ka_per_day": 0.3})).all()
    assert critical_time_d(**{**fast, "initial_deficit_mg_l": 0.0}) == pytest.approx(np.log(300) / 89.7)


def test_critical_time_is_infinite_where_oxygen_keeps_falling():
    rising = {"initial_deficit_mg_l": 0.0, "cbod_mg_l": 0.0, "kd_per_day": 0.3, "ka_per_day": 0.5}
    assert critical_time_d(**rising, net_demand_mg_l_per_day=1.0) == np.inf
    assert deficit_mg_l(200.0, **rising, net_demand_mg_l_per_day=1.0) == pytest.approx(2.0)


def test_closed_form_broadcasts_and_passes_missing_values():
    times = critical_time_d(
        initial_deficit_mg_l=[0.0, np.nan], cbod_mg_l=[[20.0], [0.0]], kd_per_day=0.3, ka_per_day=0.9
    )
    assert times.shape == (2, 2)
    assert np.isnan(times).tolist() == [[False, True], [False, True]]
    assert times[1, 0] == 0.0


@pytest.mark.parametrize(
    ("changed", "message"),
    [
        ({"time_d": -1.0}, "time_d must be between 0 and inf days, got -1"),
        ({"cbod_mg_l": -1.0}, "cbod_mg_l must be between 0"),
        ({"ka_per_day": -0.1}, "ka_per_day must be between 0"),
        ({"net_demand_mg_l_per_day": np.inf}, "net_demand_mg_l_per_day must be between -inf"),
    ],
)
def test_closed_form_refuses_what_cannot_be(changed, message):
    arguments = {"time_d": 1.0, "initial_deficit_mg_l": 1.0, "cbod_mg_l": 9.0, "kd_per_day": 0.3, "ka_per_day": 0.9}
    with pytest.raises(OutOfRangeError, match=message):
        deficit_mg_l(**{**arguments, **changed})


def plan(**changes):
    """Return a river of two reaches with an outfall at 0 km, whose low point lies near 10 km."""
    reaches = (Reach(-2.0, 15.0, 0.15, 1.2, 0.6, 1.6), Reach(15.0, 40.0, 0.45, 0.8, 0.5, 4.0))
    outfall = Inflow(0.0, Water(0.6, 2.0, 22.0, 90.0, 20.0, 900.0), kind="outfall")
    river = River(Water(3.0, 8.4, 19.0, 2.0, 0.5, 350.0), reaches, (outfall,))
    return replace(river, **changes)


def with_reach(river, place, **changes):
    reaches = list(river.reaches)
    reaches[place] = replace(reaches[place], **changes)
    return replace(river, reaches=tuple(reaches))


def test_value_at_the_outfall_is_the_mixed_water_and_just_above_the_river():
    profile = predict(plan(), [0.0, -1e-9])
    assert profile.flow_m3_s.tolist() == [3.6, 3.0]
    assert profile.water_temp_c == pytest.approx([(3 * 19 + 0.6 * 22) / 3.6, 19.0])
    assert profile.cbod_mg_l[0] == pytest.approx((3 * predict(plan(), -1e-9).cbod_mg_l + 0.6 * 90) / 3.6, rel=1e-9)
    assert profile.conductance_us_cm == pytest.approx([(3 * 350 + 0.6 * 900) / 3.6, 350.0])


def test_oxygen_is_continuous_where_the_reach_changes_and_saturation_is_not():
    river = with_reach(plan(), 1, water_temp_c=26.0)
    above, below = (predict(river, km) for km in (15.0 - 1e-9, 15.0))
    assert below.do_mg_l == pytest.approx(above.do_mg_l, abs=1e-8)
    assert above.saturation_mg_l - below.saturation_mg_l > 0.5
    assert below.saturation_mg_l == pytest.approx(saturation_mg_l(26.0), abs=0.02)


def test_temperature_given_for_a_reach_holds_whatever_flows_in():
    tributary = Inflow(20.0, Water(2.0, 8.0, 12.0))
    river = with_reach(plan(), 1, water_temp_c=24.0)
    river = replace(river, inflows=(*river.inflows, tributary))
    assert predict(river, [16.0, 20.0, 40.0]).water_temp_c.tolist() == [24.0, 24.0, 24.0]
    carried = replace(plan(), inflows=(*plan().inflows, tributary))
    assert predict(carried, [16.0, 40.0]).water_temp_c == pytest.approx([19.5, (3.6 * 19.5 + 2 * 12) / 5.6])


def test_withdrawal_takes_flow_and_nothing_else():
    taken = Inflow(10.0, Water(1.0, 0.0, 0.0), kind="withdrawal")
    river = plan(inflows=(*plan().inflows, taken))
    before, after = predict(plan(), [10.0, 30.0]), predict(river, [10.0, 30.0])
    assert after.flow_m3_s == pytest.approx(before.flow_m3_s - 1.0)
    assert after.do_mg_l == pytest.approx(before.do_mg_l, rel=1e-12)


def test_more_water_withdrawn_than_the_river_carries_is_refused():
    taken = Inflow(10.0, Water(4.0, 0.0, 0.0), kind="withdrawal")
    with pytest.raises(OutOfRangeError, match="flow_m3_s of a withdrawal must be between 0 and 3.6 m³/s, got 4 m³/s"):
        predict(plan(inflows=(*plan().inflows, taken)), 5.0)


def test_weir_divides_the_deficit_by_its_ratio():
    (row, *_) = [row for row in rows("weir.csv") if row["t_c"] == 20 and row["h_m"] == 1]
    reach = Reach(0.0, 10.0, 0.3, 1.0, 0.3, 1.0)
    head = Water(1.0, float(saturation_mg_l(20.0)) - row["deficit_above_mg_l"], 20.0)
    weir = Weir(0.0, row["h_m"], row["a_quality"], row["b_weir"])
    below = predict(River(head, (reach,), weirs=(weir,)), 0.0)
    assert below.deficit_mg_l == pytest.approx(row["deficit_below_mg_l"], rel=1e-3)
    assert below.do_mg_l == pytest.approx(row["do_below_mg_l_at_1atm"], rel=1e-3)
    assert below.warnings == ()


def test_supersaturated_water_passes_a_weir_unchanged_and_says_so():
    weir = Weir(-1.0, 1.5, name="Mill")
    river = plan(head=Water(3.0, 12.0, 19.0), weirs=(weir,))
    above, below = predict(river, -1.0 - 1e-9), predict(river, -1.0)
    assert below.do_mg_l == pytest.approx(above.do_mg_l, abs=1e-6)
    assert below.deficit_mg_l < 0
    assert [caution.name for caution in below.warnings] == ["supersaturated above a weir"]
    assert "Mill" in below.warnings[0].message


def test_supersaturation_is_not_clipped():
    profile = predict(plan(head=Water(3.0, 14.0, 19.0)), -2.0)
    assert profile.do_mg_l == 14.0
    assert profile.deficit_mg_l == pytest.approx(saturation_mg_l(19.0) - 14.0)


def test_water_of_unknown_conductance_counts_as_fresh():
    river = plan(head=Water(3.0, 8.4, 19.0, 2.0, 0.5))
    known = predict(river, [-2.0, 0.0])
    assert np.isnan(known.conductance_us_cm[0])
    assert known.conductance_us_cm[1] == pytest.approx(0.6 * 900 / 3.6)
    assert known.saturation_mg_l[0] == saturation_mg_l(19.0)


def test_settling_removes_demand_only_above_where_it_ends():
    settles = with_reach(plan(settling_ends_km=8.0), 0, ks20_per_day=0.5, water_temp_c=20.0)
    profile = predict(settles, [4.0, 6.0, 10.0, 12.0])
    travel_d = np.diff(profile.travel_time_h)[[0, 2]] / 24
    removal = -np.diff(np.log(profile.cbod_mg_l))[[0, 2]] / travel_d
    assert removal == pytest.approx([1.1, 0.6])


def test_low_point_inside_a_reach_has_no_slope():
    point = critical_point(plan())
    assert point.kind == "within a reach"
    assert not point.anoxic
    assert np.isnan(point.anoxic_from_km)
    around = predict(plan(), point.distance_km + np.array([-0.01, 0.0, 0.01]))
    assert point.do_mg_l == pytest.approx(around.do_mg_l[1], abs=1e-12)
    assert point.travel_time_h == pytest.approx(around.travel_time_h[1])
    assert (around.do_mg_l[[0, 2]] > point.do_mg_l).all()


def test_mixing_point_is_the_lowest_where_oxygen_only_recovers():
    weak = Inflow(0.0, Water(3.0, 1.0, 19.0, 2.0), kind="outfall")
    point = critical_point(plan(inflows=(weak,)))
    assert point.kind == "at the mixing point"
    assert point.distance_km == 0.0
    assert point.do_mg_l == predict(plan(inflows=(weak,)), 0.0).do_mg_l


def test_low_point_just_above_a_weir_or_inflow_is_the_water_above_it():
    for feature in ({"weirs": (Weir(6.0, 2.0),)}, {"inflows": (*plan().inflows, Inflow(6.0, Water(9.0, 9.0, 18.0)))}):
        river = plan(**feature)
        point = critical_point(river)
        assert point.kind == "at an inflow or weir, just above"
        assert point.distance_km == 6.0
        assert point.do_mg_l == pytest.approx(predict(river, 6.0 - 1e-9).do_mg_l, abs=1e-7)
        assert point.do_mg_l < predict(river, 6.0).do_mg_l


def test_inflow_poor_in_oxygen_makes_the_low_point_just_below_it():
    stale = Inflow(20.0, Water(6.0, 0.5, 19.0))
    point = critical_point(plan(inflows=(*plan().inflows, stale)))
    assert point.kind == "at an inflow, just below"
    assert point.distance_km == 20.0


def test_low_point_may_lie_where_the_reach_changes():
    above, below = plan().reaches
    early = plan(reaches=(replace(above, to_km=6.0), replace(below, from_km=6.0)))
    point = critical_point(early)
    assert point.kind == "where the reach changes"
    assert point.distance_km == 6.0


def test_low_point_beyond_the_last_reach_is_called_still_falling():
    short = plan(reaches=(replace(plan().reaches[0], to_km=5.0),))
    point = critical_point(short)
    assert point.kind == "at the end of the last reach (oxygen still falling)"
    assert point.distance_km == 5.0


def test_low_point_above_the_outfall_does_not_count_and_without_outfall_it_does():
    stale = plan(head=Water(3.0, 0.5, 19.0))
    assert critical_point(stale).distance_km >= 0
    assert critical_point(replace(stale, inflows=())).distance_km == -2.0
    assert critical_point(replace(stale, inflows=())).kind == "at the head of the first reach"


def test_lowest_oxygen_is_not_always_the_highest_deficit():
    colder = with_reach(with_reach(plan(), 0, water_temp_c=22.0), 1, water_temp_c=8.0, ka20_per_day=1.0)
    distance_km = np.linspace(0, 40, 2001)
    profile = predict(colder, distance_km)
    assert distance_km[profile.deficit_mg_l.argmax()] > distance_km[profile.do_mg_l.argmin()] + 1
    assert critical_point(colder).distance_km == pytest.approx(distance_km[profile.do_mg_l.argmin()], abs=0.02)


def test_anoxia_at_the_mixing_point_starts_there():
    foul = Inflow(0.0, Water(3.0, 0.0, 22.0, 400.0, 50.0), kind="outfall")
    river = with_reach(plan(head=Water(3.0, 0.0, 20.0), inflows=(foul,)), 0, from_km=0.0)
    point = critical_point(river)
    assert (point.kind, point.anoxic_from_km) == ("at the mixing point", 0.0)
    assert predict(river, [0.0, 1.0]).anoxic.all()


def test_river_anoxic_to_its_end_is_anoxic_at_its_end():
    foul = Inflow(0.0, Water(3.0, 0.0, 22.0, 4000.0), kind="outfall")
    river = plan(inflows=(foul,))
    assert critical_point(river).anoxic_to_km == 40.0
    (caution,) = predict(river, 0.0).warnings
    assert caution.name == "oxygen runs out"
    assert f"at {critical_point(river).anoxic_from_km:.2f} km" in caution.message
    last = predict(river, 40.0)
    assert last.anoxic
    assert last.do_mg_l == 0.0


def test_caution_counts_the_plausible_rivers_that_run_out_of_oxygen():
    outfall = replace(plan().inflows[0], water=Water(0.6, 2.0, 22.0, np.array([90.0, 400.0, 900.0])))
    river = plan(inflows=(outfall,))
    assert critical_point(river).anoxic.tolist() == [False, True, True]
    (caution,) = predict(river, 0.0).warnings
    assert "in 2 of 3 plausible rivers" in caution.message


def test_background_demand_above_all_reaeration_leaves_demand_waiting():
    river = with_reach(plan(settling_ends_km=-2.0), 0, sod20_g_m2_per_day=200.0)
    profile = predict(river, [5.0, 14.0])
    assert profile.anoxic.all()
    assert profile.cbod_mg_l[0] == profile.cbod_mg_l[1]
    assert profile.nbod_mg_l[0] == profile.nbod_mg_l[1]


@given(st.integers(0, 10**6))
@settings(max_examples=60, deadline=None)
def test_oxygen_is_never_negative_and_never_below_the_critical_point(seed):
    river = random_river(seed)
    distance_km = np.linspace(0, river.to_km, 700)
    do = predict(river, distance_km).do_mg_l
    point = critical_point(river)
    assert (do >= 0).all()
    assert point.do_mg_l <= do.min() + 1e-12
    just_above = predict(river, max(point.distance_km - 1e-9, 0.0)).do_mg_l
    assert min(just_above, predict(river, point.distance_km).do_mg_l) == pytest.approx(point.do_mg_l, abs=1e-6)


@given(st.integers(0, 10**6))
@settings(max_examples=40, deadline=None)
def test_one_place_and_many_give_the_same(seed):
    river = random_river(seed)
    distance_km = np.linspace(river.from_km, river.to_km, 9)
    many = predict(river, distance_km)
    for place, km in enumerate(distance_km):
        one = predict(river, float(km))
        for name in ("do_mg_l", "cbod_mg_l", "nbod_mg_l", "travel_time_h", "water_temp_c", "anoxic"):
            assert np.ndim(getattr(one, name)) == 0
            assert getattr(one, name) == pytest.approx(getattr(many, name)[place], abs=1e-12)


def varied(river, seed, members):
    """Return the river with arrays in it, and the single rivers they stand for."""
    rng = np.random.default_rng(seed)
    factors = rng.lognormal(0, 0.4, (4, members))
    ends = rng.uniform(river.from_km - 5, river.to_km + 5, members)
    shift = rng.normal(0, 0.3, members)

    def member(chosen):
        kd, ka, speed, load = factors[:, chosen]
        reaches = tuple(
            replace(
                reach,
                kd20_per_day=reach.kd20_per_day * kd,
                ka20_per_day=reach.ka20_per_day * ka,
                velocity_m_s=reach.velocity_m_s * speed,
            )
            for reach in river.reaches
        )
        outfall, *others = river.inflows
        outfall = replace(outfall, water=replace(outfall.water, cbod_mg_l=outfall.water.cbod_mg_l * load))
        return replace(
            river,
            reaches=reaches,
            inflows=(outfall, *others),
            settling_ends_km=ends[chosen],
            initial_deficit_shift_mg_l=shift[chosen],
        )

    return member(slice(None)), [member(place) for place in range(members)]


@pytest.mark.parametrize("first", range(0, 40, 10))
def test_plausible_rivers_are_each_predicted_as_if_alone(first):
    for seed in range(first, first + 10):
        together, singles = varied(random_river(seed), seed, 5)
        distance_km = np.linspace(together.from_km, together.to_km, 60)
        profile, points = predict(together, distance_km), critical_point(together)
        assert profile.do_mg_l.shape == profile.flow_m3_s.shape == (5, 60)
        for place, single in enumerate(singles):
            alone, point = predict(single, distance_km), critical_point(single)
            for name in ("do_mg_l", "cbod_mg_l", "nbod_mg_l", "travel_time_h", "water_temp_c", "saturation_mg_l"):
                assert getattr(profile, name)[place] == pytest.approx(getattr(alone, name), abs=1e-9), (seed, name)
            assert profile.anoxic[place].tolist() == alone.anoxic.tolist(), seed
            for name in ("do_mg_l", "deficit_mg_l", "anoxic_from_km", "anoxic_to_km"):
                assert getattr(points, name)[place] == pytest.approx(getattr(point, name), abs=1e-6, nan_ok=True), (
                    seed,
                    name,
                )
            assert points.distance_km[place] == pytest.approx(point.distance_km, abs=1e-5), seed
            assert points.kind[place] == point.kind, seed


@given(st.integers(0, 10**6), st.floats(0.1, 0.9))
@settings(max_examples=50, deadline=None)
def test_reach_cut_in_two_changes_nothing(seed, share):
    river = random_river(seed)
    first = river.reaches[0]
    middle = first.from_km + share * (first.to_km - first.from_km)
    halves = (replace(first, to_km=middle), replace(first, from_km=middle))
    parted = replace(river, reaches=(*halves, *river.reaches[1:]))
    distance_km = np.linspace(river.from_km, river.to_km, 80)
    whole, two = predict(river, distance_km), predict(parted, distance_km)
    assert two.do_mg_l == pytest.approx(whole.do_mg_l, abs=1e-9)
    assert two.cbod_mg_l == pytest.approx(whole.cbod_mg_l, abs=1e-9)
    assert two.nbod_mg_l == pytest.approx(whole.nbod_mg_l, abs=1e-9)
    before, after = critical_point(river), critical_point(parted)
    assert after.do_mg_l == pytest.approx(before.do_mg_l, abs=1e-10)
    assert after.distance_km == pytest.approx(before.distance_km, abs=1e-4)


@pytest.mark.parametrize("distance_km", [-2.01, 40.01, np.inf])
def test_prediction_refuses_a_place_outside_the_river(distance_km):
    with pytest.raises(OutOfRangeError, match="distance_km must be between -2 and 40 km"):
        predict(plan(), [1.0, distance_km])


def test_missing_distance_gives_missing_oxygen():
    assert np.isnan(predict(plan(), [np.nan, 1.0]).do_mg_l).tolist() == [True, False]


def test_missing_rate_gives_a_missing_low_point():
    point = critical_point(with_reach(plan(), 0, kd20_per_day=np.array([0.6, np.nan])))
    assert np.isnan(point.do_mg_l).tolist() == np.isnan(point.distance_km).tolist() == [False, True]
    assert point.kind.tolist() == ["within a reach", "not known, a number is missing"]


def test_arrays_of_different_lengths_in_a_river_are_refused():
    uneven = with_reach(plan(head=Water(3.0, np.full(3, 8.0), 19.0)), 0, velocity_m_s=np.full(4, 0.3))
    with pytest.raises(OutOfRangeError, match=r"arrays in a river must all have one shape \(n,\)"):
        predict(uneven, 1.0)


@pytest.mark.parametrize(
    ("build", "message"),
    [
        (lambda: Water(-1.0, 8.0, 20.0), "flow_m3_s must be between 0"),
        (lambda: Water(1.0, -0.1, 20.0), "do_mg_l must be between 0"),
        (lambda: Water(1.0, 8.0, 293.0), "water_temp_c must be between 0 and 40 °C, got 293"),
        (lambda: Reach(0.0, 1.0, 0.0, 1.0, 0.3, 1.0), "velocity_m_s must be between"),
        (lambda: Reach(0.0, 1.0, [0.3, -0.3], 1.0, 0.3, 1.0), "velocity_m_s must be between"),
        (lambda: Weir(0.0, 6.0), "drop_m must be between 0 and 4.5 m, got 6"),
        (lambda: plan(weirs=(Weir(41.0, 1.0),)), "distance_km must be between -2 and 40 km, got 41 km"),
        (lambda: plan(inflows=(Inflow(1.0, Water(1.0, 8.0, 20.0), kind="spring"),)), "kind must be one of outfall"),
        (lambda: plan(reaches=()), "reaches must hold at least one reach"),
    ],
)
def test_river_refuses_what_cannot_be(build, message):
    with pytest.raises(OutOfRangeError, match=message):
        build()


def test_prediction_leaves_the_river_as_it_was():
    together, _ = varied(random_river(3), 3, 4)
    velocity = together.reaches[0].velocity_m_s.copy()
    predict(together, np.linspace(0, together.to_km, 10))
    assert (together.reaches[0].velocity_m_s == velocity).all()
