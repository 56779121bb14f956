import dataclasses
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from calc import quality
from calc.quality import Bracket, ReadingContext, ReadingValues, Settings, reading_findings, stability

SETTINGS = Settings()

ORDINARY = ReadingValues(
    do_mg_l=6.1,
    water_temp_c=22.0,
    depth_m=0.8,
    do_percent_meter=74.2,
    conductance_us_cm=480,
    pressure_mmhg=716,
    pressure_value=716,
    pressure_source="barometer",
    sensor_depth_m=0.5,
    velocity_m_s=0.3,
    position="centre",
    ph=7.6,
    stability=stability((6.1, 6.1, 6.2, 6.1, 6.1), (60, 90, 120, 150, 180), SETTINGS),
    position_radius_m=8,
)
MOVING = stability((5.6, 5.8, 6.1, 6.2, 6.3), (), SETTINGS)
AROUND = ReadingContext(
    elevation_m=500,
    station_pressure_mmhg=716,
    predicted_do_mg_l=6.4,
    band_low_mg_l=5.9,
    band_high_mg_l=6.9,
    predicted_temp_c=21.5,
    upstream_do_mg_l=6.9,
    downstream_do_mg_l=5.6,
    upstream_temp_c=21.6,
    downstream_temp_c=22.3,
    upstream_conductance_us_cm=470,
    downstream_conductance_us_cm=490,
    planned_depth_m=0.7,
    air_temp_c=27.0,
    hours_late=0.4,
    travel_time_h=12,
    replicate_do_mg_l=6.0,
    replicate_temp_c=22.1,
    replicate_conductance_us_cm=481,
    recent_do_mg_l=(7.3, 6.9),
    snapshot_span_h=2,
    hours_after_now=-0.01,
    hours_before_survey=-4,
    bracket=Bracket("bracketed", 0, 1),
)


def findings(reading=None, **context):
    """Return the findings on the ordinary reading, with the given fields changed."""
    return reading_findings(
        dataclasses.replace(ORDINARY, **(reading or {})), dataclasses.replace(AROUND, **context), SETTINGS
    )


def names(found):
    return [finding.name for finding in found]


def test_an_ordinary_reading_gives_no_finding():
    assert findings() == ()


def test_a_reading_of_which_nothing_is_known_gives_no_finding():
    assert reading_findings(ReadingValues(), ReadingContext(), SETTINGS) == ()


@pytest.mark.parametrize(
    ("reading", "around", "expected"),
    [
        ({}, {"upstream_do_mg_l": 7.2}, ["step_against_neighbour"]),
        ({"do_percent_meter": 60}, {}, ["percent_against_concentration"]),
        ({"do_percent_meter": None}, {"air_temp_c": 22, "saturation_mg_l": 6.1}, ["air_signature"]),
        ({}, {"recent_do_mg_l": (6.1, 6.1)}, ["frozen_value"]),
        ({}, {"predicted_do_mg_l": 7.2}, ["step_against_prediction"]),
        ({}, {"replicate_do_mg_l": 5.8}, ["replicate_spread"]),
        ({}, {"replicate_temp_c": 22.5}, ["replicate_spread"]),
        ({}, {"replicate_conductance_us_cm": 520}, ["replicate_spread"]),
        ({}, {"upstream_temp_c": 18.0}, ["temperature_step"]),
        ({}, {"downstream_conductance_us_cm": 600}, ["conductance_step"]),
        ({"conductance_us_cm": 2100, "do_percent_meter": None}, {}, ["conductance_step", "conductance_high"]),
        ({}, {"planned_depth_m": 0.25}, ["depth_unit"]),
        ({"sensor_depth_m": 1.2}, {}, ["sensor_below_bed"]),
        ({"velocity_m_s": 0.01}, {}, ["velocity_unlikely"]),
        ({"velocity_m_s": 1.2}, {}, ["do_not_wade"]),
        ({"depth_m": 1.2, "sensor_depth_m": 0.7}, {}, ["wading_caution"]),
        ({}, {"hours_late": 2.0}, ["late_for_parcel"]),
        ({}, {"snapshot_span_h": 4}, ["snapshot_long"]),
        ({}, {"hours_after_now": 1}, ["time_in_future"]),
        ({}, {"station_pressure_mmhg": 735}, ["pressure_against_elevation"]),
        ({"ph": 9.3}, {}, ["ph_unlikely"]),
        ({"stability": MOVING}, {}, ["unstable"]),
        ({"position_radius_m": 60}, {}, ["position_poor"]),
        ({}, {"bracket": Bracket("no_check_after", 0, None)}, ["not_bracketed"]),
        ({}, {"bracket": Bracket("drift", 0, 1)}, ["drift_uncorrected"]),
        ({}, {"bracket": Bracket("not_reportable", 0, 1)}, ["not_reportable"]),
    ],
)
def test_each_oddity_is_found_by_its_own_name(reading, around, expected):
    if "conductance_us_cm" in reading:
        around = {**around, "replicate_conductance_us_cm": None}
    assert names(findings(reading, **around)) == expected


def test_a_reading_without_values_in_time_or_checks_is_not_asked_about_them():
    assert findings({"ph": None, "stability": None, "position_radius_m": None}, bracket=None) == ()


def test_hazards_come_first():
    found = findings({"water_temp_c": 12.0, "velocity_m_s": 1.2, "do_percent_meter": 20.0})
    assert names(found)[:2] == ["do_not_wade", "cold_water"]
    assert [finding.hazard for finding in found] == sorted((finding.hazard for finding in found), reverse=True)


@pytest.mark.parametrize(("platform", "found"), [("", True), ("wade", True), ("boat", False), ("bridge", False)])
def test_wading_limits_are_for_those_who_wade_or_may(platform, found):
    deep = findings({"depth_m": 2.0, "velocity_m_s": 1.0, "platform": platform}, planned_depth_m=2.0)
    assert ("do_not_wade" in names(deep)) is found


def test_a_sea_level_pressure_gives_one_finding_though_much_follows_from_it():
    found = findings({"pressure_mmhg": 762, "pressure_value": 762, "do_percent_meter": 80}, station_pressure_mmhg=762)
    assert names(found) == ["sea_level_pressure"]


def test_the_same_pressure_as_a_weather_value_gives_none():
    found = findings({"pressure_mmhg": 762, "pressure_value": 762, "pressure_source": "weather"})
    assert found == ()


def test_inches_of_mercury_in_the_mmhg_box_give_one_finding():
    found = findings({"pressure_mmhg": 29.5, "pressure_value": 29.5}, station_pressure_mmhg=29.5)
    assert names(found) == ["pressure_unit"]
    assert found[0].suggestion == {"pressure_value": 29.5, "pressure_unit": "[in_i'Hg]"}


def test_high_up_a_value_that_may_be_hpa_or_sea_level_is_asked_about_both_ways():
    found = findings({"pressure_mmhg": 770, "pressure_value": 770}, elevation_m=2200, station_pressure_mmhg=770)
    assert names(found) == ["sea_level_pressure", "pressure_unit"]


def test_a_weather_value_high_up_is_not_taken_for_hpa():
    found = findings(
        {"pressure_mmhg": 770, "pressure_value": 770, "pressure_source": "weather", "do_percent_meter": None},
        elevation_m=2200,
        station_pressure_mmhg=589,
    )
    assert found == ()


def test_fahrenheit_gives_one_finding_though_saturation_follows_from_it():
    found = findings({"water_temp_c": 71.6})
    assert names(found) == ["temperature_unit"]
    assert found[0].suggestion == {"water_temp_c": 22.0}


def test_percent_in_the_concentration_box_gives_one_finding():
    found = findings({"do_mg_l": 74.2})
    assert names(found) == ["percent_as_concentration"]
    # 74.2 % of 8.22 mg/L, saturation at 22 °C and 716 mmHg.
    assert found[0].suggestion["do_mg_l"] == pytest.approx(6.10, abs=0.02)


def test_182_percent_saturation_is_one_question_and_can_be_kept():
    found = findings(
        {"do_mg_l": 15.2, "do_percent_meter": 185},
        upstream_do_mg_l=14.9,
        downstream_do_mg_l=14.9,
        predicted_do_mg_l=14.6,
        replicate_do_mg_l=15.1,
    )
    assert names(found) == ["supersaturation"]


def test_a_fall_the_plan_expects_is_no_step():
    expected = {"upstream_predicted_do_mg_l": 8.4, "upstream_do_mg_l": 8.2}
    assert names(findings(**{**expected, "upstream_predicted_do_mg_l": math.nan})) == ["step_against_neighbour"]
    assert findings(**expected) == ()


def test_a_percentage_relative_to_760_mmhg_is_explained():
    # Saturation at 22 °C is 8.22 mg/L at 716 mmHg and 8.74 at 760: 6.1 mg/L is 74.2 % here and 69.8 % there.
    (finding,) = findings({"do_percent_meter": 69.8})
    assert "relative to 760 mmHg" in finding.cause


def test_the_saturation_on_the_page_is_the_one_checked_against():
    assert names(findings(saturation_mg_l=7.0)) == ["percent_against_concentration"]


@pytest.mark.parametrize("odd", [math.nan, math.inf, -math.inf, None, 0.0, -0.0, 1e308, -1e308, 5e-324])
@pytest.mark.parametrize("name", [field.name for field in dataclasses.fields(ReadingValues) if field.type is float])
def test_one_odd_number_never_stops_the_checks(name, odd):
    assert isinstance(findings({name: odd}), tuple)


# Plausible numbers lie beside the limits and fire the rules; any float at all must not stop them.
NUMBER = st.one_of(
    st.none(),
    st.floats(allow_nan=True, allow_infinity=True),
    st.floats(-2, 40),
    st.floats(400, 1100),
    st.sampled_from([0.0, 0.2, 1.0, 6.1, 29.5, 68.0, 92.0, 760.0, 2500.0]),
)


def numbers_of(kind, **others):
    return st.builds(kind, **{f.name: NUMBER for f in dataclasses.fields(kind) if f.type is float}, **others)


@settings(max_examples=300, deadline=None)
@given(
    numbers_of(
        ReadingValues,
        pressure_unit=st.sampled_from(["mm[Hg]", "hPa", "[in_i'Hg]", "kPa", "atm", "m", "", "no unit"]),
        pressure_source=st.sampled_from(["meter", "barometer", "weather", "none"]),
        position=st.sampled_from(["", "left", "centre"]),
        stability=st.one_of(
            st.none(), st.lists(NUMBER, max_size=7).map(lambda values: stability(values, (), SETTINGS))
        ),
    ),
    numbers_of(
        ReadingContext,
        recent_do_mg_l=st.lists(NUMBER, max_size=4).map(tuple),
        bracket=st.sampled_from([None, Bracket("bracketed", 0, 1), Bracket("drift", 0, 1)]),
    ),
)
def test_any_numbers_give_whole_findings(reading, context):
    for finding in reading_findings(reading, context, SETTINGS):
        text = f"{finding.says} {finding.cause} {finding.do}"
        assert finding.says and finding.cause and finding.do
        assert "safe" not in text.lower()
        assert "nan" not in text.lower().split()
        assert finding.field in {field.name for field in dataclasses.fields(ReadingValues)} | {"taken_at"}
        for value in (finding.suggestion or {}).values():
            assert isinstance(value, str) or math.isfinite(value)


@pytest.mark.parametrize(
    ("changed", "expected"),
    [
        ({"oxygen_step_mg_l": 0.5, "oxygen_step_bands": 0.1}, ["step_against_neighbour"]),
        ({"temperature_step_c": 0.3}, ["temperature_step"]),
        ({"conductance_step_percent": 2.0}, ["conductance_step"]),
        ({"replicate_mg_l": 0.05}, ["replicate_spread"]),
        ({"cold_water_c": 23.0}, ["cold_water"]),
        ({"wading_caution_m2_s": 0.2}, ["wading_caution"]),
        ({"parcel_h": 0.3, "parcel_percent": 1.0}, ["late_for_parcel"]),
        ({"snapshot_h": 1.0}, ["snapshot_long"]),
        ({"ph_high": 7.5}, ["ph_unlikely"]),
        ({"position_m": 5.0}, ["position_poor"]),
    ],
)
def test_the_surveys_own_settings_decide(changed, expected):
    found = reading_findings(ORDINARY, AROUND, Settings.from_dict(changed))
    assert list(dict.fromkeys(names(found))) == expected


def test_every_check_is_offered_by_name():
    assert sorted(quality.__all__) == sorted(set(quality.__all__))
    assert all(hasattr(quality, name) for name in quality.__all__)
