import copy
import itertools
import re
from dataclasses import dataclass, replace
from itertools import combinations
from types import SimpleNamespace

import pytest
from flask import render_template

from calc.settings import Settings
from tests.webapp.plans import PLAN
from tests.webapp.test_estimate import VERSION
from tests.webapp.test_estimate import reading as a_reading
from webapp.chart_axes import hour_step, multiples, plain, round_step
from webapp.chart_labels import Box
from webapp.charts import sag_chart
from webapp.display import Show
from webapp.models import Survey
from webapp.plan.prediction import predict_plan
from webapp.sag.estimate import estimate_of

SI = Show()
MILES = Show(unit_system="us", distance_rule="river_mile", outfall_mark=41.2)


@dataclass(frozen=True)
class Read:
    """A reading as a chart takes it."""

    id: str
    distance_km: float
    do_mg_l: float
    label: str
    state: str = "used"


READINGS = (
    Read("1", -0.6, 8.2, "U1"),
    Read("2", 1.8, 6.4, "D1"),
    Read("3", 3.4, 5.5, "D2"),
    Read("4", 6.9, 4.3, "D3"),
    Read("5", 10.5, 3.4, "D4"),
    Read("6", 12.4, 3.0, "D5"),
    Read("7", 12.4, 5.0, "D5", "set aside"),
    Read("8", 17.5, 3.2, "D6"),
)


@pytest.fixture(scope="module")
def predicted():
    return predict_plan(PLAN, 210.0)


@pytest.fixture(scope="module")
def crowded():
    tables = copy.deepcopy(PLAN)
    for number in range(12):
        tables["waters"].append(
            {**tables["waters"][2], "name": f"Nameless little beck {number}", "distance_km": 7.2 + 0.3 * number}
        )
    return predict_plan(tables, 210.0)


def texts_of(chart):
    return [*chart.labels, *chart.distance_ticks, *chart.hour_ticks]


def points_of(line):
    return [tuple(float(number) for number in pair.split(",")) for pair in line.points.split()]


@pytest.mark.parametrize("show", [SI, MILES], ids=["km", "river mile"])
def test_everything_lies_inside_the_viewbox(predicted, show):
    chart = sag_chart(show, predicted, READINGS, "6", 5.0)
    frame = Box(0, 0, chart.width, chart.height)
    assert all(label.box.within(frame) for label in texts_of(chart))
    drawn = [*(point for line in (*chart.lines, *chart.bands) for point in points_of(line))]
    drawn += [(dot.x, dot.y) for dot in chart.dots]
    assert all(chart.left <= x <= chart.right and chart.top <= y <= chart.bottom for x, y in drawn)


@pytest.mark.parametrize("show", [SI, MILES], ids=["km", "river mile"])
@pytest.mark.parametrize("which", ["predicted", "crowded"])
def test_no_two_texts_overlap(request, which, show):
    chart = sag_chart(show, request.getfixturevalue(which), READINGS, "6", 5.0)
    overlapping = [(one.text, other.text) for one, other in combinations(texts_of(chart), 2) if one.box.hits(other.box)]
    assert overlapping == []


def test_no_leader_crosses_the_name_of_another_feature(crowded):
    chart = sag_chart(SI, crowded)
    names = [label for label in chart.labels if label.y > chart.bottom]
    crossed = [
        name.text
        for name in names
        for feature in chart.features
        if name.box.left < feature.x < name.box.right and name.box.top < feature.leader_y
    ]
    assert len(names) >= 4
    assert crossed == []


def test_every_feature_of_an_ordinary_river_is_named(predicted):
    chart = sag_chart(SI, predicted)
    assert {label.text for label in chart.labels} == {"outfall", "Rush Beck", "Meadow intake", "Old mill weir"}
    assert [feature.kind for feature in chart.features] == ["outfall", "tributary", "withdrawal", "weir"]


def test_features_can_be_left_out(predicted):
    chart = sag_chart(SI, predicted, features=False)
    assert chart.features == chart.labels == ()
    assert chart.height < sag_chart(SI, predicted).height


def test_water_flows_to_the_right_whichever_way_distances_count(predicted):
    for show, order in ((SI, 1), (MILES, -1)):
        ticks = sag_chart(show, predicted).distance_ticks
        assert [tick.x for tick in ticks] == sorted(tick.x for tick in ticks)
        numbers = [float(tick.text) for tick in ticks]
        assert numbers == sorted(numbers)[::order]


def test_distance_numbers_are_round_in_the_unit_shown(predicted):
    chart = sag_chart(MILES, predicted)
    assert [tick.text for tick in chart.distance_ticks] == ["40", "35", "30", "25"]
    assert chart.distance_title == "River mile"
    assert sag_chart(SI, predicted).distance_title == "Distance below the outfall, km"


def test_hours_of_travel_stand_where_the_water_is_by_then(predicted):
    chart = sag_chart(SI, predicted)
    zero, six = chart.hour_ticks[:2]
    assert (zero.text, six.text) == ("0", "6")
    scale = (chart.right - chart.left) / 31
    assert zero.x == pytest.approx(chart.left + scale, abs=0.1)
    assert six.x == pytest.approx(chart.left + scale * (1 + 6 * 3.6 * 0.26), abs=0.2)


def test_drawn_line_stays_on_the_prediction(predicted):
    chart = sag_chart(SI, predicted)
    points = points_of(chart.lines[0])
    assert len(points) < 100
    oxygen_per_unit = 10 / (chart.bottom - chart.top)
    for x, y in points:
        km = -1 + 31 * (x - chart.left) / (chart.right - chart.left)
        near = [here for here in predicted.along([km - 0.02, km, km + 0.02]) if here]
        assert min(abs((chart.bottom - y) * oxygen_per_unit - here.do_mg_l) for here in near) < 0.05


def test_marked_reading_and_its_code_stand_out(predicted):
    chart = sag_chart(SI, predicted, READINGS, "6", 5.0)
    assert [dot.code for dot in chart.dots if dot.marked] == ["D5"]
    assert ("marked", "this reading") in chart.legend
    assert "D5" in {label.text for label in chart.labels if label.kind == "code"}


def test_legend_names_only_what_is_drawn(predicted):
    symbols = [symbol for symbol, _ in sag_chart(SI, predicted, READINGS[:2]).legend]
    assert "used" in symbols
    assert not {"aside", "marked", "criterion"} & set(symbols)


def test_reading_above_the_band_widens_the_scale(predicted):
    chart = sag_chart(SI, predicted, [Read("9", 5.0, 19.0, "D9")])
    assert chart.dots[0].y > chart.top
    assert float(chart.oxygen_ticks[-1].text) >= 19


@pytest.mark.parametrize("distance_km", [-3.0, 44.0])
def test_reading_outside_the_plan_is_drawn_and_listed_without_prediction(predicted, distance_km):
    chart = sag_chart(SI, predicted, [Read("9", distance_km, 7.0, "X")])
    assert chart.left <= chart.dots[0].x <= chart.right
    row = next(row for row in chart.rows if row.what == "reading at X")
    assert (row.predicted, row.difference) == ("–", "–")


def test_reading_without_oxygen_is_passed_over(predicted):
    assert sag_chart(SI, predicted, [Read("9", 5.0, None, "D9")]).dots == ()


def test_table_holds_the_numbers_of_the_plot(predicted):
    chart = sag_chart(SI, predicted, READINGS, "6", 5.0)
    here = predicted.at(12.4)
    row = next(row for row in chart.rows if row.what == "reading at D5, this one")
    assert row.place == "12.40"
    assert row.predicted == f"{here.do_mg_l:.2f}"
    assert row.reading == "3.00"
    assert row.difference == f"\u2212{here.do_mg_l - 3:.1f}"
    assert "reading at D5, set aside" in {row.what for row in chart.rows}
    assert len([row for row in chart.rows if row.what == "along the river"]) == 7


def test_sentence_says_where_and_how_low_with_the_interval(predicted):
    point, span = predicted.critical, predicted.critical_interval
    assert sag_chart(SI, predicted, READINGS).sentence == (
        f"Predicted lowest oxygen {point.do_mg_l:.1f} mg/L at {point.distance_km:.2f} km below the outfall, "
        f"21 h 35 min after it (90 %: {span.low_mg_l:.1f} to {span.high_mg_l:.1f} mg/L, "
        f"{span.low_km:.1f} to {span.high_km:.1f} km). Lowest reading so far 3.00 mg/L at D5."
    )


def test_sentence_in_river_miles_names_the_mile(predicted):
    sentence = sag_chart(MILES, predicted).sentence
    assert "at river mile 31.31, 21 h 35 min after the outfall" in sentence
    assert re.search(r"river mile 3\d\.\d to 29\.4\)", sentence)
    assert "km" not in sentence


def test_reading_set_aside_is_never_the_lowest(predicted):
    low = Read("9", 14.8, 0.1, "D9", "set aside")
    assert "Lowest reading so far 3.00 mg/L at D5." in sag_chart(SI, predicted, [*READINGS, low]).sentence


def changed(**columns):
    tables = copy.deepcopy(PLAN)
    for name, value in columns.items():
        table, row, key = name.split("__")
        tables[table][int(row)][key] = value
    return predict_plan(tables, 210.0)


def test_river_without_sag_is_said_to_have_none():
    clean = changed(waters__1__bod5_mg_l=1.0, waters__1__tkn_mg_n_l=0.0, reaches__1__sod20_g_m2_per_day=0.0)
    assert clean.never_sags
    assert sag_chart(SI, clean).sentence.startswith("No sag is predicted: oxygen is lowest where the outfall mixes")


def test_sag_that_falls_to_the_end_is_said_to_lie_further_down():
    tables = {**PLAN, "reaches": PLAN["reaches"][:2], "waters": PLAN["waters"][:2], "weirs": []}
    falling = predict_plan(tables, 210.0)
    sentence = sag_chart(SI, falling).sentence
    assert "the true lowest point lies further down" in sentence
    assert "or further)" in sentence


def test_river_that_runs_out_of_oxygen_is_said_to():
    dead = changed(waters__1__bod5_mg_l=400.0)
    chart = sag_chart(SI, dead)
    assert "runs out of oxygen" in chart.sentence
    assert min(y for _, y in points_of(chart.lines[0])) >= chart.top
    assert max(y for _, y in points_of(chart.lines[0])) == chart.bottom


def test_picture_has_decimal_dots_only_and_says_what_it_shows(app, predicted):
    chart = sag_chart(SI, predicted, READINGS, "6", 5.0)
    with app.test_request_context():
        svg = render_template("charts/_sag.svg", chart=chart)
    for points in re.findall(r'points="([^"]*)"', svg):
        assert re.fullmatch(r"(\d+\.\d,\d+\.\d ?)+", points)
    assert chart.sentence in svg
    assert "<desc" in svg
    assert 'style="' not in svg
    assert "nan" not in svg.lower().replace("nanum", "")


def test_names_with_markup_stay_text(app, predicted):
    nasty = replace(READINGS[0], label="<script>")
    with app.test_request_context():
        page = render_template("charts/_sag.svg", chart=sag_chart(SI, predicted, [nasty]))
        page += render_template("charts/_sag_table.html", chart=sag_chart(SI, predicted, [nasty]), show=SI)
    assert "<script>" not in page


@pytest.mark.parametrize(
    ("span", "at_most", "step"), [(31, 7, 5), (10, 6, 2), (0.7, 7, 0.1), (7, 7, 1), (200, 7, 50), (0.03, 6, 0.005)]
)
def test_steps_are_round(span, at_most, step):
    assert round_step(span, at_most) == pytest.approx(step)


@pytest.mark.parametrize(("span", "step"), [(1.4, 0.25), (5, 1), (34, 6), (70, 12), (140, 24), (5000, 10000)])
def test_hours_are_counted_as_people_count_them(span, step):
    assert hour_step(span, 6) == step


def test_multiples_hold_both_ends_and_negative_ones():
    assert multiples(-1, 0.5, 0.5) == [-1, -0.5, 0, 0.5]


def test_tick_numbers_have_the_digits_their_step_needs():
    assert [plain(value, 0.5) for value in (-0.5, 0, -0.0001)] == ["\u22120.5", "0.0", "0.0"]
    assert plain(20, 5) == "20"


@pytest.fixture
def today():
    """Today's sag from three readings on the plan of the tests."""
    survey = Survey(id="s", elevation_m=210.0)
    readings = [a_reading("D2", 6.0), a_reading("D3", 5.0, 60), a_reading("D4", 4.0, 120)]
    return estimate_of(survey, VERSION, Settings(), readings)


def test_todays_sag_is_a_line_and_a_band_of_its_own_named_in_legend_words_and_table(today):
    chart = sag_chart(Show(), today.prediction, today=today)
    assert [line.kind for line in chart.lines] == [band.kind for band in chart.bands] == ["plan", "today"]
    assert [one.kind for one in chart.criticals] == ["plan", "today"]
    assert {"today", "today band", "today critical", "plan"} <= {symbol for symbol, _ in chart.legend}
    assert chart.sentence.startswith("Today's sag is lowest with ")
    assert any(row.what == "today's lowest" and row.today for row in chart.rows)


def test_places_offered_are_numbered_and_cover_neither_each_other_nor_the_axis(today):
    offers = [SimpleNamespace(distance_km=km) for km in (12.4, 12.9, 13.4, 14.8)]
    chart = sag_chart(Show(), today.prediction, today=today, candidates=offers)
    assert [one.number for one in chart.candidates] == [1, 2, 3, 4]
    for one, other in itertools.combinations(chart.candidates, 2):
        assert abs(one.x - other.x) >= 18 or abs(one.y - other.y) >= 18
    assert all(one.y + 9 <= chart.bottom + 0.1 for one in chart.candidates)
    assert sum(row.what.startswith("where next") for row in chart.rows) == 4
