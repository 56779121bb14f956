"""Every threshold the checks on readings use, with its unit, its trade default and where the default comes from.

One Settings belongs to a survey; the settings page and the dataset print SETTINGS beside the survey's own values.
"""

import dataclasses
import math
from dataclasses import dataclass

from calc.errors import CalcError, OutOfRangeError

COMMON = "common practice"
PLANNING = "planning default"
BAROMETER = "computed from the US Standard Atmosphere 1976; ordinary weather moves pressure by about 15 mmHg"
FIELD_MANUAL = "after the USGS National Field Manual, chapters A6 and A9"
SIMULATED = "chosen on simulated rivers"
COLD = "common cold-water guidance: caution below 70 °F, immersion clothing below 60 °F"


@dataclass(frozen=True)
class Setting:
    """One threshold as a page or the dataset prints it: key, plain label, unit as shown, default and its source."""

    key: str
    label: str
    unit: str
    default: float
    source: str


def _setting(default, unit, label, source):
    return dataclasses.field(default=default, metadata={"unit": unit, "label": label, "source": source})


@dataclass(frozen=True)
class Settings:
    """The thresholds of one survey. Build it with from_dict; a value that is no finite number is refused.

    Raises
    ------
    OutOfRangeError
        If a value is not a finite number, or a lower limit is not below its upper limit.
    """

    sea_level_elevation_m: float = _setting(
        150.0, "m", "Sea-level pressure: looked for above this elevation", BAROMETER
    )
    sea_level_firm_elevation_m: float = _setting(
        300.0, "m", "Sea-level pressure: weather no longer explains it above this elevation", BAROMETER
    )
    sea_level_low_mmhg: float = _setting(745.0, "mmHg", "Sea-level pressure: lowest entry that looks so", BAROMETER)
    sea_level_high_mmhg: float = _setting(790.0, "mmHg", "Sea-level pressure: highest entry that looks so", BAROMETER)
    sea_level_excess_mmhg: float = _setting(
        10.0, "mmHg", "Sea-level pressure: more than this above standard for the elevation", BAROMETER
    )
    inhg_low: float = _setting(25.0, "inHg", "Pressure that looks like inHg: from", COMMON)
    inhg_high: float = _setting(31.0, "inHg", "Pressure that looks like inHg: to", COMMON)
    hpa_low: float = _setting(850.0, "hPa", "Pressure that looks like hPa: from", COMMON)
    hpa_high: float = _setting(1100.0, "hPa", "Pressure that looks like hPa: to", COMMON)
    mmhg_low: float = _setting(500.0, "mmHg", "Pressure that looks like mmHg: from", COMMON)
    mmhg_high: float = _setting(825.0, "mmHg", "Pressure that looks like mmHg: to", COMMON)
    pressure_departure_mmhg: float = _setting(
        15.0, "mmHg", "Station pressure: furthest from standard for the elevation", BAROMETER
    )

    fahrenheit_low: float = _setting(33.0, "°F", "Temperature that looks like °F: from", COMMON)
    fahrenheit_high: float = _setting(104.0, "°F", "Temperature that looks like °F: to", COMMON)
    temperature_low_c: float = _setting(0.0, "°C", "Water temperature: unlikely below", COMMON)
    temperature_high_c: float = _setting(35.0, "°C", "Water temperature: unlikely above", COMMON)
    temperature_limit_c: float = _setting(40.0, "°C", "Water temperature: no river is warmer than", COMMON)
    temperature_step_c: float = _setting(3.0, "°C", "Water temperature: largest step between stations", PLANNING)

    oxygen_low_mg_l: float = _setting(0.2, "mg/L", "Oxygen: too low to tell from zero below", FIELD_MANUAL)
    oxygen_high_mg_l: float = _setting(15.0, "mg/L", "Oxygen: unlikely above", COMMON)
    percent_typed_mg_l: float = _setting(20.0, "mg/L", "Oxygen: looks like a percentage above", PLANNING)
    percent_difference: float = _setting(3.0, "points", "Percent on the meter: furthest from computed", PLANNING)
    percent_difference_mg_l: float = _setting(
        0.3, "mg/L", "Percent on the meter: furthest from the mg/L it stands for", PLANNING
    )
    supersaturation_percent: float = _setting(120.0, "%", "Supersaturation: asked about above", PLANNING)
    oxygen_step_mg_l: float = _setting(1.0, "mg/L", "Oxygen: largest step against neighbour or prediction", PLANNING)
    oxygen_step_bands: float = _setting(
        2.0, "", "Oxygen: largest step, as a multiple of half the width of the predicted band", PLANNING
    )
    air_percent_low: float = _setting(97.0, "%", "Probe in the air: saturation from", PLANNING)
    air_percent_high: float = _setting(103.0, "%", "Probe in the air: saturation to", PLANNING)
    air_temperature_c: float = _setting(0.5, "°C", "Probe in the air: water within this of the air", PLANNING)
    frozen_stations: float = _setting(3.0, "stations", "Frozen value: the same at this many stations", PLANNING)
    frozen_mg_l: float = _setting(0.01, "mg/L", "Frozen value: the same to this", PLANNING)
    replicate_mg_l: float = _setting(0.2, "mg/L", "Replicate: oxygen agrees within", COMMON)
    replicate_low_mg_l: float = _setting(0.3, "mg/L", "Replicate: low oxygen agrees within", COMMON)
    replicate_low_below_mg_l: float = _setting(2.0, "mg/L", "Replicate: oxygen is low below", COMMON)
    replicate_c: float = _setting(0.2, "°C", "Replicate: temperature agrees within", COMMON)
    replicate_conductance_percent: float = _setting(3.0, "%", "Replicate: conductance agrees within", COMMON)

    conductance_step_percent: float = _setting(10.0, "%", "Conductance: largest step between stations", PLANNING)
    conductance_high_us_cm: float = _setting(2000.0, "µS/cm", "Conductance: salinity matters above", COMMON)
    depth_high_m: float = _setting(15.0, "m", "Depth: unlikely above", COMMON)
    feet_ratio_percent: float = _setting(
        15.0, "%", "Depth that looks like feet: this near to 3.28 times the plan", PLANNING
    )
    sensor_top_m: float = _setting(0.1, "m", "Sensor: at least this far under the surface", COMMON)
    sensor_bed_m: float = _setting(0.1, "m", "Sensor: at least this far above the bed", COMMON)
    velocity_low_m_s: float = _setting(0.02, "m/s", "Velocity: unlikely below", COMMON)
    velocity_high_m_s: float = _setting(2.0, "m/s", "Velocity: unlikely above", COMMON)

    parcel_percent: float = _setting(10.0, "%", "Same parcel: early or late by this part of the travel time", PLANNING)
    parcel_h: float = _setting(1.0, "h", "Same parcel: early or late by this, if larger", PLANNING)
    snapshot_h: float = _setting(3.0, "h", "Snapshot: longest run", PLANNING)
    future_min: float = _setting(5.0, "min", "Time of the reading: furthest ahead of the clock", PLANNING)
    before_survey_h: float = _setting(24.0, "h", "Time of the reading: furthest before the survey", PLANNING)
    # 10 ft²/s is 0.929 m²/s: rounding it up to 0.93 would let exactly the limit through.
    wading_stop_m2_s: float = _setting(0.929, "m²/s", "Wading: never at or above depth times velocity", FIELD_MANUAL)
    wading_caution_m2_s: float = _setting(0.6, "m²/s", "Wading: project limit of depth times velocity", PLANNING)
    wading_depth_m: float = _setting(0.9, "m", "Wading: project limit of depth", PLANNING)
    cold_water_c: float = _setting(21.0, "°C", "Cold water: caution below", COLD)
    very_cold_water_c: float = _setting(15.0, "°C", "Cold water: dress for immersion below", COLD)

    estimate_error_mg_l: float = _setting(0.12, "mg/L", "Estimate: error of one reading", PLANNING)
    estimate_bias_mg_l: float = _setting(0.10, "mg/L", "Estimate: error that one meter's readings share", PLANNING)
    leave_stations: float = _setting(4.0, "stations", "May we leave: fewest stations read", SIMULATED)
    leave_between_percent: float = _setting(
        95.0, "%", "May we leave: least chance that the low point lies between stations", SIMULATED
    )
    leave_oxygen_mg_l: float = _setting(0.30, "mg/L", "May we leave: lowest oxygen known to within", SIMULATED)
    leave_place_percent: float = _setting(20.0, "%", "May we leave: place of the low point known to within", SIMULATED)
    leave_regret_mg_l: float = _setting(
        0.04, "mg/L", "May we leave: or oxygen elsewhere lower by no more than", SIMULATED
    )

    def __post_init__(self):
        for key, value in self.as_dict().items():
            if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
                raise OutOfRangeError(f"{key} must be a finite number, got {value!r}")
        for low, high in _LOW_AND_HIGH:
            if not getattr(self, low) < getattr(self, high):
                raise OutOfRangeError(f"{low} must be below {high}, got {getattr(self, low):g}")

    @classmethod
    def from_dict(cls, values):
        """Return the settings with the given values, the defaults elsewhere.

        Raises
        ------
        CalcError
            If a key is no setting.
        """
        unknown = sorted(set(values) - {setting.key for setting in SETTINGS}, key=str)
        if unknown:
            raise CalcError(f"settings must be known keys, got {', '.join(map(str, unknown))}")
        return cls(**values)

    def as_dict(self):
        """Return key and value of every setting, in their fixed order."""
        return {setting.key: getattr(self, setting.key) for setting in SETTINGS}


_LOW_AND_HIGH = (
    ("sea_level_elevation_m", "sea_level_firm_elevation_m"),
    ("sea_level_low_mmhg", "sea_level_high_mmhg"),
    ("inhg_low", "inhg_high"),
    ("hpa_low", "hpa_high"),
    ("mmhg_low", "mmhg_high"),
    ("fahrenheit_low", "fahrenheit_high"),
    ("temperature_low_c", "temperature_high_c"),
    ("oxygen_low_mg_l", "oxygen_high_mg_l"),
    ("air_percent_low", "air_percent_high"),
    ("velocity_low_m_s", "velocity_high_m_s"),
    ("wading_caution_m2_s", "wading_stop_m2_s"),
    ("very_cold_water_c", "cold_water_c"),
)

SETTINGS = tuple(
    Setting(item.name, item.metadata["label"], item.metadata["unit"], item.default, item.metadata["source"])
    for item in dataclasses.fields(Settings)
)
