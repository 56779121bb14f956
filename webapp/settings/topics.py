"""Every threshold by topic, as the settings page shows it, and what each may be set to."""

from dataclasses import dataclass

from calc.settings import LOW_AND_HIGH, SETTINGS, Setting
from webapp.display import plain_digits

__all__ = ["LOW_AND_HIGH", "SETTINGS", "TOPICS", "Topic", "limits_of", "title_of", "typed", "values_of"]

# What stands before the colon of a setting's label tells its topic.
_PREFIXES = {
    "Oxygen": ("Oxygen", "Percent on the meter", "Supersaturation", "Probe in the air", "Frozen value"),
    "Water temperature": ("Temperature that looks like °F", "Water temperature"),
    "Air pressure": (
        "Sea-level pressure",
        "Pressure that looks like inHg",
        "Pressure that looks like hPa",
        "Pressure that looks like mmHg",
        "Station pressure",
    ),
    "Conductance, pH, depth and velocity": (
        "Conductance",
        "pH",
        "Depth",
        "Depth that looks like feet",
        "Sensor",
        "Velocity",
    ),
    "Time and place": ("Same parcel", "Snapshot", "Time of the reading", "Position", "Clock of a phone"),
    "Steady values": ("Stability",),
    "Replicates": ("Replicate",),
    "Across and down the river": ("Mixed", "Stratified", "Depths", "Profile"),
    "A river that changes": (
        "Anchor station",
        "Stage",
        "Flow",
        "Rain in the reach",
        "Effluent flow",
        "Mass balance",
    ),
    "Meter checks": (
        "Meter check",
        "Titration",
        "Zero check",
        "Thermometer",
        "Standards",
        "Check again",
        "Between two checks",
        "One meter at two places",
    ),
    "Drift": ("Drift",),
    "Grades of drift": ("Grade",),
    "Bottles": ("Bottle", "Bottles", "Bottle replicates", "Hold time", "Receipt"),
    "Laboratory": ("BOD blank", "Glucose-glutamic acid check", "BOD dilution", "BOD incubation"),
    "Completeness": ("Completeness",),
    "Estimate, and leaving the river": ("Estimate", "May we leave"),
    "Safety at the water": ("Wading", "Cold water"),
}
_LIMITS = {"°C": (-50.0, 100.0), "°F": (-58.0, 212.0), "%": (0.0, 1000.0), "pH": (0.0, 14.0)}
_COUNTED = {"values", "stations", "readings"}
_SHARES = {
    "single_depth_percent",
    "upper_depth_percent",
    "lower_depth_percent",
    "complete_percent",
    "complete_critical_percent",
    "leave_between_percent",
    "hold_soon_percent",
}


@dataclass(frozen=True)
class Topic:
    """Settings that belong together."""

    key: str
    title: str
    settings: tuple[Setting, ...]


def _topics():
    of_prefix = {prefix: title for title, prefixes in _PREFIXES.items() for prefix in prefixes}
    by_title = {title: [] for title in _PREFIXES}
    for one in SETTINGS:
        by_title[of_prefix[one.label.split(":")[0]]].append(one)
    return tuple(Topic(f"topic-{at}", title, tuple(some)) for at, (title, some) in enumerate(by_title.items(), 1))


TOPICS = _topics()
_BY_KEY = {one.key: one for one in SETTINGS}


def title_of(key):
    """Return what a setting is called; the key itself for one that is no more."""
    return _BY_KEY[key].label if key in _BY_KEY else key


def limits_of(setting):
    """Return (lowest, highest) that a setting may be: beyond them no rule makes sense."""
    if setting.key in _SHARES:
        return 0.0, 100.0
    if setting.key == "grade_both_limits":
        return 0.0, 1.0
    if setting.key.startswith("estimate_"):
        return 0.01, 10.0  # an error of nothing would believe one reading against all others
    if setting.key.startswith("sea_level") and setting.unit == "m":
        return -430.0, 6000.0
    if setting.unit in _COUNTED:
        return 1.0, 1000.0
    return _LIMITS.get(setting.unit, (0.0, 1e6))


def values_of(thresholds):
    """Return the value of every setting: the version's own, the default of one that the version did not know yet."""
    return {one.key: float(thresholds.get(one.key, one.default)) for one in SETTINGS}


def typed(value):
    """Return a value as somebody would type it."""
    return plain_digits(value)
