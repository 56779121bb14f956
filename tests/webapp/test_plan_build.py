import copy

import pytest

from tests.webapp.plans import PLAN
from webapp.display import Show
from webapp.plan.build import build
from webapp.plan.notes import NotReady


def changed(table, row, **values):
    """The plan with values of one row changed; None takes a value away."""
    tables = copy.deepcopy(PLAN)
    tables[table][row].update(values)
    return tables


def without(table, row):
    tables = copy.deepcopy(PLAN)
    del tables[table][row]
    return tables


def missing_of(tables):
    with pytest.raises(NotReady, match=".") as refusal:
        build(tables, 210.0)
    return refusal.value.missing


def test_outfall_stands_at_zero_and_the_river_begins_at_the_top_of_the_first_reach():
    river = build(PLAN, 210.0).river
    assert (river.outfall_km, river.from_km, river.to_km) == (0.0, -1.0, 30.0)


def test_bod5_becomes_ultimate_by_the_bottles_own_rate():
    outfall = build(changed("basis", 0, bod_bottle_rate_per_day=0.12), 210.0).river.inflows[0].water
    assert outfall.cbod_mg_l == pytest.approx(66.0 / (1 - 2.718281828459045 ** (-0.6)))


def test_bod5_takes_0_23_per_day_where_the_plan_names_no_bottle_rate():
    outfall = build(PLAN, 210.0).river.inflows[0].water
    assert outfall.cbod_mg_l == pytest.approx(66.0 / (1 - 2.718281828459045 ** (-1.15)))


def test_ultimate_bod_beats_bod5():
    assert build(changed("waters", 1, cbod_ultimate_mg_l=80.0), 210.0).river.inflows[0].water.cbod_mg_l == 80.0


def test_kjeldahl_nitrogen_beats_ammonia():
    outfall = build(changed("waters", 1, ammonia_mg_n_l=5.0), 210.0).river.inflows[0].water
    assert outfall.nbod_mg_l == pytest.approx(9.0 * 4.57)


def test_percent_saturation_counts_at_the_waters_own_temperature_and_pressure():
    low, high = (build(changed("waters", 1, do_percent=100.0), metres).river.inflows[0].water for metres in (0, 1500))
    # 22 °C at 1 atm: 8.743 mg/L fresh (Standard Methods 4500-O); 890 µS/cm lowers it by a quarter of a percent.
    assert low.do_mg_l == pytest.approx(8.743 * 0.9975, abs=0.01)
    assert high.do_mg_l < 0.86 * low.do_mg_l


def test_velocity_follows_from_flow_width_and_depth_with_what_has_joined():
    rates = build(PLAN, 210.0).reach_rates[2]
    assert rates.velocity_m_s == pytest.approx((1.8 + 0.35 + 0.15) / (12.0 * 1.1))
    assert rates.velocity_why == "flow over width and depth"


def test_empty_kd_follows_from_depth_and_says_so():
    rates = build(PLAN, 210.0).reach_rates[0]
    assert rates.kd20_per_day == pytest.approx(0.3 * (0.9 / 0.3048 / 8) ** -0.434)
    assert "Hydroscience" in rates.kd_why


def test_measured_ka_beats_the_formula():
    rates = build(changed("reaches", 2, ka20_per_day=1.9), 210.0).reach_rates[2]
    assert (rates.ka20_per_day, rates.ka_key) == (1.9, "measured")


def test_formula_outside_its_range_is_named():
    rates = build(changed("reaches", 1, ka_formula="churchill"), 210.0).reach_rates[1]
    assert [warning.argument for warning in rates.ka_warnings] == ["velocity_m_s"]


def test_weir_words_become_their_coefficients():
    weir = build(PLAN, 210.0).river.weirs[0]
    assert (weir.quality, weir.shape) == (1.6, 0.8)


def test_rows_may_come_in_any_order():
    tables = copy.deepcopy(PLAN)
    tables["reaches"].reverse()
    tables["waters"].reverse()
    rivers = [build(each, 210.0).river for each in (tables, PLAN)]
    assert rivers[0].reaches == rivers[1].reaches
    assert [one.name for one in rivers[0].inflows] == ["Sallow Ford works", "Rush Beck", "Meadow intake"]


def test_ends_that_differ_by_less_than_a_metre_are_one_place():
    assert build(changed("reaches", 1, from_km=0.0004), 210.0).river.reaches[1].from_km == 0.0


def test_missing_bod_upstream_is_taken_as_none_and_said():
    built = build(changed("waters", 0, bod5_mg_l=None), 210.0)
    assert built.river.head.cbod_mg_l == 0
    assert "Alder Brook above the works" in built.notes[0].said(Show())


def test_empty_plan_says_all_it_needs():
    missing = missing_of({"reaches": [], "waters": []})
    assert missing == (
        "Add the reaches of the river, from above the outfall down.",
        "Add the river above the outfall under Waters that meet: its flow, oxygen and temperature.",
        "Add the outfall under Waters that meet.",
    )


@pytest.mark.parametrize(
    ("tables", "sentence"),
    [
        (without("waters", 1), "Add the outfall under Waters that meet."),
        (without("reaches", 2), "Reaches, Gravel run: it leaves a gap below Willow glides"),
        (changed("reaches", 2, from_km=6.0), "Reaches, Osier flats: it overlaps with Willow glides"),
        (changed("reaches", 3, to_km=18.0), "Reaches, Gravel run: it must end below where it begins."),
        (changed("reaches", 2, width_m=None), "Reaches, Osier flats: enter its velocity, or its width"),
        (changed("reaches", 1, depth_m=None), "Reaches, Willow glides: enter its mean depth."),
        (changed("reaches", 1, ka_formula="tsivoglou_neal", slope=None), "needs a slope above zero"),
        (changed("waters", 1, do_percent=None), "Waters that meet, Sallow Ford works: enter its oxygen"),
        (changed("waters", 1, bod5_mg_l=None), "Waters that meet, Sallow Ford works: enter its BOD5"),
        (changed("waters", 1, distance_km=3.0), "distances count from the outfall, so leave its place empty"),
        (changed("waters", 1, conductance_us_cm=9e4), "Sallow Ford works: specific conductance lies outside"),
        (changed("waters", 2, distance_km=None), "Waters that meet, Rush Beck: enter where it meets the river."),
        (changed("waters", 2, distance_km=40.0), "Waters that meet, Rush Beck: it lies below the last reach"),
        (changed("waters", 2, kind="outfall", distance_km=None), "Waters that meet: keep one row as the outfall"),
        (changed("waters", 3, flow_m3_s=9.0), "Meadow intake: more is taken out than the river carries"),
        (changed("weirs", 0, drop_m=None), "Weirs, Old mill weir: enter where it is and its drop."),
        (changed("reaches", 1, velocity_m_s=6.0, depth_m=0.02), "Reaches, Willow glides: ka lies outside"),
    ],
)
def test_what_cannot_be_predicted_is_said_in_plain_words(tables, sentence):
    missing = " ".join(missing_of(tables))
    assert sentence in missing
    assert "_" not in missing


def test_elevation_beyond_the_equations_is_said():
    with pytest.raises(NotReady, match="The survey's elevation is beyond"):
        build(PLAN, 6000.0)
