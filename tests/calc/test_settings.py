import dataclasses
import math
import re
from pathlib import Path

import pytest

from calc.errors import CalcError, OutOfRangeError
from calc.settings import SETTINGS, Settings


def test_every_field_is_listed_once_with_label_and_source():
    assert [setting.key for setting in SETTINGS] == [field.name for field in dataclasses.fields(Settings)]
    assert len({setting.label for setting in SETTINGS}) == len(SETTINGS)
    assert all(setting.label and setting.source for setting in SETTINGS)
    # Plain ratios and one choice are the only settings without a unit.
    unitless = {"oxygen_step_bands", "grade_both_limits", "bottle_low_multiple", "bottle_low_below_multiple"}
    assert {setting.key for setting in SETTINGS if not setting.unit} == unitless


def test_every_setting_is_used():
    root = Path(__file__).parents[2]
    sources = [path for path in (*root.glob("calc/*.py"), *root.glob("webapp/**/*.py")) if path.name != "settings.py"]
    used = set(re.findall(r"settings\.(\w+)", " ".join(path.read_text(encoding="utf-8") for path in sources)))
    # The grades are read by their common name: grade_{name}_{unit}.
    unused = {setting.key for setting in SETTINGS} - used
    assert {key for key in unused if not key.startswith("grade_")} == set()


def test_defaults_are_those_of_the_list():
    assert Settings().as_dict() == {setting.key: setting.default for setting in SETTINGS}


def test_given_values_replace_defaults_and_survive_a_round_trip():
    settings = Settings.from_dict({"oxygen_step_mg_l": 0.8, "wading_depth_m": 1})
    assert settings.oxygen_step_mg_l == 0.8
    assert settings.temperature_step_c == 3.0
    assert Settings.from_dict(settings.as_dict()) == settings


def test_unknown_keys_are_refused_by_name():
    with pytest.raises(CalcError, match="settings must be known keys, got 7, oxygen_stepp"):
        Settings.from_dict({"oxygen_stepp": 1.0, 7: 1.0})


@pytest.mark.parametrize("value", [math.nan, math.inf, None, "3", True])
def test_what_is_no_finite_number_is_refused(value):
    with pytest.raises(OutOfRangeError, match="temperature_step_c must be a finite number"):
        Settings.from_dict({"temperature_step_c": value})


def test_limits_in_the_wrong_order_are_refused():
    with pytest.raises(OutOfRangeError, match="oxygen_low_mg_l must be below oxygen_high_mg_l, got 16"):
        Settings.from_dict({"oxygen_low_mg_l": 16.0})


def test_settings_cannot_be_changed_in_place():
    with pytest.raises(dataclasses.FrozenInstanceError, match="oxygen_step_mg_l"):
        Settings().oxygen_step_mg_l = 2.0
