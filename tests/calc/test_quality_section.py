import math

import pytest

from calc.quality_section import (
    SectionPoint,
    depths_wanted,
    not_mixed,
    section_verdict,
    stratification,
    stratified,
)
from calc.settings import Settings

SETTINGS = Settings()
NAN = math.nan


def section(do=(6.0, 6.0, 6.0), temp=(20.0, 20.0, 20.0), conductance=(500, 500, 500), **expected):
    places = ("left", "centre", "right", "1 of 5")
    points = [SectionPoint(*row) for row in zip(places, do, temp, conductance, strict=False)]
    return section_verdict(points, SETTINGS, **expected)


def test_three_positions_that_agree_are_mixed():
    verdict = section((6.0, 6.1, 6.2), (20.0, 20.1, 20.1), (500, 505, 495))
    assert (verdict.mixed, verdict.points) == (True, 3)
    assert verdict.do_spread == pytest.approx(0.2) and verdict.temp_spread == pytest.approx(0.1)
    assert verdict.conductance_spread_percent == pytest.approx(2.0)
    assert verdict.says == "Mixed: 3 positions agree."


@pytest.mark.parametrize(
    ("values", "mixed"),
    [
        # Each mean is the middle value, so that the limit lies on both sides of it.
        ({"do": (5.71, 6.0, 6.29)}, True),
        ({"do": (5.7, 6.0, 6.3)}, True),
        ({"do": (5.69, 6.0, 6.31)}, False),
        ({"temp": (19.7, 20.0, 20.3)}, True),
        ({"temp": (19.69, 20.0, 20.31)}, False),
        ({"conductance": (475, 500, 525)}, True),
        ({"conductance": (474, 500, 526)}, False),
    ],
)
def test_each_parameter_lies_within_its_limit_of_the_mean(values, mixed):
    assert section(**values).mixed is mixed


@pytest.mark.parametrize(
    ("mean", "mixed"), [(500, True), (549, True), (550, True), (551, False), (450, True), (449, False)]
)
def test_conductance_lies_within_a_tenth_of_the_mass_balance(mean, mixed):
    assert section(conductance=(mean, mean, mean), expected_conductance_us_cm=500).mixed is mixed


@pytest.mark.parametrize("missing", [NAN, None, 0.0, -5.0, math.inf])
def test_without_a_mass_balance_the_positions_alone_decide(missing):
    assert section(expected_conductance_us_cm=missing).mixed is True


def test_two_positions_can_only_show_that_water_is_not_mixed():
    assert section((6.0, 6.1), (20.0, 20.0), (500, 500)).mixed is None
    found = section((5.0, 6.1), (20.0, 20.0), (500, 500))
    assert (found.mixed, found.points) == (False, 2)


def test_one_position_shows_nothing_and_none_neither():
    found = section((6.0,), (20.0,), (500,), expected_conductance_us_cm=200.0)
    assert (found.mixed, found.points) == (None, 1) and math.isnan(found.do_spread)
    assert section_verdict((), SETTINGS).mixed is None


def test_several_readings_at_one_position_are_averaged_first():
    points = [
        SectionPoint("left", 5.6, 20.0, 500),
        SectionPoint("Left ", 6.2, 20.0, 500),
        SectionPoint("centre", 6.0, 20.0, 500),
        SectionPoint("right", 6.1, 20.0, 500),
    ]
    found = section_verdict(points, SETTINGS)
    assert (found.mixed, found.points) == (True, 3)
    assert found.do_spread == pytest.approx(0.2)
    assert section_verdict(points[:2], SETTINGS).points == 1


def test_points_without_a_position_are_left_out():
    points = [SectionPoint(place, 6.0, 20.0, 500) for place in ("", "  ", "left")]
    assert section_verdict(points, SETTINGS).points == 1


def test_conductance_not_measured_is_said():
    found = section(conductance=(None, NAN, math.inf))
    assert found.mixed is True and math.isnan(found.conductance_spread_percent)
    assert "Conductance was not measured" in found.says


@pytest.mark.parametrize("missing", [{"do": (6.0, NAN, 6.0)}, {"temp": (20.0, 20.0, None)}])
def test_mixed_needs_oxygen_and_temperature_at_three_positions(missing):
    assert section(**missing).mixed is None


def test_water_that_is_not_mixed_is_a_finding_with_what_differs():
    verdict = section((5.0, 6.0, 6.0), (20.0, 21.0, 21.0))
    (finding,) = not_mixed(verdict)
    assert (finding.name, finding.field) == ("not_mixed", "position")
    assert finding.says == (
        "Not mixed: oxygen is up to 0.67 mg/L from the mean, the water is up to 0.7 °C warmer or colder than the mean."
    )
    assert not_mixed(section()) == () == not_mixed(None) == not_mixed(section((6.0,)))


def vertical(top_do, bottom_do, top_c=20.0, bottom_c=20.0):
    return (
        SectionPoint("centre", top_do, top_c, NAN, 0.3, 3.0),
        SectionPoint("centre", 6.0, 15.0, NAN, 1.3, 3.0),
        SectionPoint("centre", bottom_do, bottom_c, NAN, 2.3, 3.0),
    )


@pytest.mark.parametrize(
    ("points", "layered"),
    [
        (vertical(6.0, 6.0), False),
        (vertical(6.5, 6.0), False),
        (vertical(6.51, 6.0), True),
        (vertical(5.49, 6.0), True),
        (vertical(6.0, 6.0, 21.0, 20.0), False),
        (vertical(6.0, 6.0, 21.01, 20.0), True),
        (vertical(NAN, 6.0, 21.01, 20.0), True),
        (vertical(6.51, 6.0, None, 20.0), True),
        (vertical(6.5, 6.0, None, 20.0), False),
        (vertical(NAN, 6.0, None, 20.0), None),
        (vertical(6.0, 6.0)[:1], None),
        ((), None),
    ],
)
def test_water_is_layered_where_top_and_bottom_differ(points, layered):
    assert stratification(points, SETTINGS).stratified is layered


def test_layers_are_told_from_the_top():
    layers = stratification(vertical(7.0, 6.2, 22.5, 20.0), SETTINGS)
    assert layers.do_difference == pytest.approx(0.8) and layers.temp_difference == pytest.approx(2.5)
    assert layers.says == "Layered: the top is 2.5 °C warmer and holds 0.80 mg/L more oxygen than the bottom."
    (finding,) = stratified(layers)
    assert (finding.name, finding.field) == ("stratified", "sensor_depth_m")
    assert stratified(stratification(vertical(6.0, 6.0), SETTINGS)) == () == stratified(None)
    assert stratified(stratification((), SETTINGS)) == ()


def test_readings_of_two_verticals_are_not_taken_for_layers():
    left, right = SectionPoint("left", 5.0, 20.0, NAN, 0.3), SectionPoint("right", 7.0, 20.0, NAN, 2.0)
    assert stratification((left, right), SETTINGS).stratified is None


def test_of_several_verticals_the_most_layered_counts():
    other = [SectionPoint("left", do, 20.0, NAN, depth) for do, depth in ((6.0, 0.3), (6.1, 2.0))]
    assert stratification((*other, *vertical(6.8, 6.0)), SETTINGS).do_difference == pytest.approx(0.8)


@pytest.mark.parametrize(
    ("depth_m", "still", "depths"),
    [
        (0.5, False, (0.3,)),
        (0.75, False, (0.45,)),
        (0.76, False, (0.15, 0.61)),
        (2.5, False, (0.5, 2.0)),
        (0.5, True, (0.3,)),
        (2.0, True, (0.4, 1.6)),
        (2.01, True, (0.3, 1.3)),
        (2.3, True, (0.3, 1.3, 1.8)),
        (2.8, True, (0.3, 1.3, 2.3)),
        (3.0, True, (0.3, 1.3, 2.3)),
        (3.4, True, (0.3, 1.3, 2.3, 2.9)),
        (0.0, False, ()),
        (-1.0, True, ()),
        (NAN, False, ()),
        (None, True, ()),
        (math.inf, True, ()),
    ],
)
def test_the_sensor_hangs_where_the_depth_asks_for_it(depth_m, still, depths):
    assert depths_wanted(depth_m, SETTINGS, still=still) == depths


def test_odd_settings_and_depths_still_give_few_depths():
    odd = Settings.from_dict({"profile_step_m": 0.0, "profile_depth_m": 0.1})
    assert depths_wanted(0.7, odd, still=True) == (0.42,)
    assert len(depths_wanted(3.0, odd, still=True)) <= 52
    assert len(depths_wanted(1e308, SETTINGS, still=True)) <= 52


def test_any_numbers_give_a_verdict():
    for odd in (NAN, None, math.inf, 0.0, -1.0, 1e308):
        point = SectionPoint("left", odd, odd, odd, odd, odd)
        points = [point, SectionPoint("right", 6.0, 20.0, 500.0, 0.3), SectionPoint("centre", odd, odd, odd, 1.0)]
        assert isinstance(not_mixed(section_verdict(points, SETTINGS, odd)), tuple)
        assert isinstance(stratified(stratification(points, SETTINGS)), tuple)
