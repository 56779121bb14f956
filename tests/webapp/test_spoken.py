import pytest

from calc.quality import cold_water, depth_unlikely, sensor_depth, temperature_step, velocity_unlikely, wading
from calc.settings import Settings
from webapp.display import Show
from webapp.spoken import in_units_of

US, SI, SETTINGS = Show(unit_system="us"), Show(), Settings()


@pytest.mark.parametrize(
    ("findings", "says"),
    [
        (cold_water(10.0, SETTINGS), "50.0 °F"),
        (temperature_step(20.0, 15.0, float("nan"), SETTINGS), "68.0 °F is 9.0 °F warmer than"),
        (velocity_unlikely(3.0, SETTINGS), "9.84 ft/s is very fast"),
        (depth_unlikely(20.0, float("nan"), SETTINGS), "66 ft is very deep"),
        (sensor_depth(0.03, 1.0, SETTINGS), "0.1 ft under the surface"),
        (wading(1.2, 1.0, SETTINGS), "3.9 ft times velocity 3.28 ft/s is 12.9 ft²/s. The limit is 10 ft²/s."),
        (wading(0.8, 0.9, SETTINGS), "is 7.8 ft²/s. The project's wading limit is 6 ft²/s."),
    ],
)
def test_checks_speak_us_customary_units_in_a_us_survey(findings, says):
    assert says in in_units_of(US, findings[0].says)
    assert in_units_of(SI, findings[0].says) == findings[0].says


@pytest.mark.parametrize(
    "text", ["The meter shows percent relative to 760 mmHg.", "Used 3 times.", "5 mg/L at D5.", ""]
)
def test_what_has_no_such_unit_stays(text):
    assert in_units_of(US, text) == text
