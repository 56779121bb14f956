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
DRIFT_REPORT = "after USGS Techniques and Methods 1-D3"
LAB_METHOD = "after Standard Methods 5210 B"
HOLDING = "after 40 CFR 136, table II"
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

    stable_values: float = _setting(5.0, "values", "Stability: the last so many values", FIELD_MANUAL)
    soak_s: float = _setting(60.0, "s", "Stability: the probe settles at least", FIELD_MANUAL)
    stable_span_s: float = _setting(120.0, "s", "Stability: the values span at least", FIELD_MANUAL)
    stable_mg_l: float = _setting(0.2, "mg/L", "Stability: oxygen, each side of the median", FIELD_MANUAL)
    stable_c: float = _setting(0.2, "°C", "Stability: temperature, each side of the median", FIELD_MANUAL)
    stable_conductance_percent: float = _setting(3.0, "%", "Stability: conductance", FIELD_MANUAL)
    stable_conductance_low_percent: float = _setting(5.0, "%", "Stability: low conductance", FIELD_MANUAL)
    stable_conductance_low_us_cm: float = _setting(100.0, "µS/cm", "Stability: conductance is low up to", FIELD_MANUAL)
    stable_ph: float = _setting(0.1, "pH", "Stability: pH, each side of the median", FIELD_MANUAL)

    check_mg_l: float = _setting(0.2, "mg/L", "Meter check: oxygen before the first station within", FIELD_MANUAL)
    check_percent: float = _setting(2.0, "%", "Meter check: oxygen before the first station, if larger", FIELD_MANUAL)
    field_check_mg_l: float = _setting(0.3, "mg/L", "Meter check: oxygen between stations within", PLANNING)
    second_method_mg_l: float = _setting(0.3, "mg/L", "Meter check: against titration or a second meter", COMMON)
    winkler_pair_mg_l: float = _setting(0.1, "mg/L", "Titration: two bottles agree within", COMMON)
    zero_mg_l: float = _setting(0.2, "mg/L", "Zero check: reads no more than", FIELD_MANUAL)
    zero_days: float = _setting(31.0, "days", "Zero check: at least every", FIELD_MANUAL)
    zero_low_mg_l: float = _setting(2.0, "mg/L", "Zero check: before a survey that expects less than", FIELD_MANUAL)
    zero_low_days: float = _setting(1.0, "days", "Zero check: no older than this before such a survey", PLANNING)
    thermometer_c: float = _setting(0.2, "°C", "Thermometer: within this of a certified one", FIELD_MANUAL)
    thermometer_worst_c: float = _setting(0.5, "°C", "Thermometer: not to be used beyond", FIELD_MANUAL)
    thermometer_days: float = _setting(365.0, "days", "Thermometer: checked over its range every", FIELD_MANUAL)
    conductance_check_percent: float = _setting(3.0, "%", "Meter check: conductance within", DRIFT_REPORT)
    conductance_check_us_cm: float = _setting(5.0, "µS/cm", "Meter check: conductance, if larger", DRIFT_REPORT)
    ph_check: float = _setting(0.2, "pH", "Meter check: pH within", DRIFT_REPORT)
    standards_beyond_percent: float = _setting(20.0, "%", "Standards: readings above the highest by up to", PLANNING)
    recheck_elevation_m: float = _setting(100.0, "m", "Check again: elevation changed by more than", PLANNING)
    recheck_pressure_mmhg: float = _setting(7.0, "mmHg", "Check again: pressure changed by more than", PLANNING)
    recheck_temperature_c: float = _setting(10.0, "°C", "Check again: temperature changed by more than", PLANNING)
    recheck_h: float = _setting(4.0, "h", "Check again: last checked longer ago than", PLANNING)
    bracket_longest_h: float = _setting(36.0, "h", "Between two checks: longest time", PLANNING)
    meter_speed_km_h: float = _setting(110.0, "km/h", "One meter at two places: faster than", PLANNING)
    meter_places_km: float = _setting(0.5, "km", "One meter at two places: further apart than", PLANNING)

    drift_mg_l: float = _setting(0.3, "mg/L", "Drift: oxygen corrected above", DRIFT_REPORT)
    drift_c: float = _setting(0.2, "°C", "Drift: temperature corrected above", DRIFT_REPORT)
    drift_conductance_us_cm: float = _setting(5.0, "µS/cm", "Drift: conductance corrected above", DRIFT_REPORT)
    drift_conductance_percent: float = _setting(3.0, "%", "Drift: conductance corrected above, if larger", DRIFT_REPORT)
    drift_ph: float = _setting(0.2, "pH", "Drift: pH corrected above", DRIFT_REPORT)
    grade_both_limits: float = _setting(1.0, "", "Grade: 1 both limits hold, 0 the larger one counts", PLANNING)
    grade_excellent_mg_l: float = _setting(0.3, "mg/L", "Grade: oxygen, excellent up to", DRIFT_REPORT)
    grade_good_mg_l: float = _setting(0.5, "mg/L", "Grade: oxygen, good up to", DRIFT_REPORT)
    grade_fair_mg_l: float = _setting(0.8, "mg/L", "Grade: oxygen, fair up to", DRIFT_REPORT)
    grade_report_mg_l: float = _setting(2.0, "mg/L", "Grade: oxygen, not reported beyond", DRIFT_REPORT)
    grade_excellent_percent: float = _setting(5.0, "%", "Grade: oxygen in percent, excellent up to", DRIFT_REPORT)
    grade_good_percent: float = _setting(10.0, "%", "Grade: oxygen in percent, good up to", DRIFT_REPORT)
    grade_fair_percent: float = _setting(15.0, "%", "Grade: oxygen in percent, fair up to", DRIFT_REPORT)
    grade_report_percent: float = _setting(20.0, "%", "Grade: oxygen in percent, not reported beyond", DRIFT_REPORT)
    grade_excellent_c: float = _setting(0.2, "°C", "Grade: temperature, excellent up to", DRIFT_REPORT)
    grade_good_c: float = _setting(0.5, "°C", "Grade: temperature, good up to", DRIFT_REPORT)
    grade_fair_c: float = _setting(0.8, "°C", "Grade: temperature, fair up to", DRIFT_REPORT)
    grade_report_c: float = _setting(2.0, "°C", "Grade: temperature, not reported beyond", DRIFT_REPORT)
    grade_excellent_conductance_percent: float = _setting(3.0, "%", "Grade: conductance, excellent up to", DRIFT_REPORT)
    grade_good_conductance_percent: float = _setting(10.0, "%", "Grade: conductance, good up to", DRIFT_REPORT)
    grade_fair_conductance_percent: float = _setting(15.0, "%", "Grade: conductance, fair up to", DRIFT_REPORT)
    grade_report_conductance_percent: float = _setting(
        30.0, "%", "Grade: conductance, not reported beyond", DRIFT_REPORT
    )
    grade_excellent_ph: float = _setting(0.2, "pH", "Grade: pH, excellent up to", DRIFT_REPORT)
    grade_good_ph: float = _setting(0.5, "pH", "Grade: pH, good up to", DRIFT_REPORT)
    grade_fair_ph: float = _setting(0.8, "pH", "Grade: pH, fair up to", DRIFT_REPORT)
    grade_report_ph: float = _setting(2.0, "pH", "Grade: pH, not reported beyond", DRIFT_REPORT)

    mixed_mg_l: float = _setting(0.3, "mg/L", "Mixed: oxygen within this of the section's mean", PLANNING)
    mixed_c: float = _setting(0.3, "°C", "Mixed: temperature within this of the section's mean", PLANNING)
    mixed_conductance_percent: float = _setting(5.0, "%", "Mixed: conductance within this of the mean", FIELD_MANUAL)
    mixed_balance_percent: float = _setting(10.0, "%", "Mixed: conductance within this of the balance", PLANNING)
    stratified_mg_l: float = _setting(0.5, "mg/L", "Stratified: oxygen, top and bottom differ by more than", PLANNING)
    stratified_c: float = _setting(1.0, "°C", "Stratified: temperature, top and bottom differ by more than", PLANNING)
    two_depths_m: float = _setting(0.76, "m", "Depths: two from this depth of water on", FIELD_MANUAL)
    single_depth_percent: float = _setting(60.0, "%", "Depths: a single one at this part of the depth", FIELD_MANUAL)
    upper_depth_percent: float = _setting(20.0, "%", "Depths: the upper of two", FIELD_MANUAL)
    lower_depth_percent: float = _setting(80.0, "%", "Depths: the lower of two", FIELD_MANUAL)
    profile_depth_m: float = _setting(2.0, "m", "Profile: in still water deeper than", PLANNING)
    profile_top_m: float = _setting(0.3, "m", "Profile: first under the surface at", PLANNING)
    profile_step_m: float = _setting(1.0, "m", "Profile: then every", PLANNING)
    profile_bed_m: float = _setting(0.5, "m", "Profile: down to this far above the bed", PLANNING)

    replicate_every: float = _setting(10.0, "readings", "Replicate: one in so many readings", COMMON)
    replicate_per_day: float = _setting(1.0, "replicates", "Replicate: at least so many a crew's day", COMMON)
    anchor_mg_l: float = _setting(0.3, "mg/L", "Anchor station: oxygen moved by more than", PLANNING)
    after_sunrise_h: float = _setting(1.0, "h", "Snapshot: daylight counts from this long after sunrise", PLANNING)
    stage_change_m: float = _setting(0.03, "m", "Stage: changed by more than", PLANNING)
    flow_change_percent: float = _setting(10.0, "%", "Flow: changed by more than", PLANNING)
    flow_stop_percent: float = _setting(20.0, "%", "Flow: changed so much that the survey is not steady", PLANNING)
    rain_mm: float = _setting(2.5, "mm", "Rain in the reach: more than", PLANNING)
    effluent_change_percent: float = _setting(20.0, "%", "Effluent flow: changed by more than", PLANNING)
    complete_percent: float = _setting(90.0, "%", "Completeness: valid values of those planned", COMMON)
    complete_critical_percent: float = _setting(100.0, "%", "Completeness: at critical stations", COMMON)
    balance_percent: float = _setting(10.0, "%", "Mass balance: found within this of expected", PLANNING)
    ph_low: float = _setting(6.0, "pH", "pH: unlikely below", COMMON)
    ph_high: float = _setting(9.0, "pH", "pH: unlikely above", COMMON)
    position_m: float = _setting(20.0, "m", "Position: radius asked about above", COMMON)
    position_worst_m: float = _setting(100.0, "m", "Position: radius not to be taken above", COMMON)
    clock_s: float = _setting(60.0, "s", "Clock of a phone: off by more than", COMMON)

    bod_h: float = _setting(48.0, "h", "Hold time: BOD set up within", HOLDING)
    bod_caution_h: float = _setting(24.0, "h", "Hold time: BOD, the project's own limit", LAB_METHOD)
    bottle_reading_min: float = _setting(10.0, "min", "Bottle: oxygen read at the same point within", PLANNING)
    ammonia_h: float = _setting(672.0, "h", "Hold time: ammonia, preserved (28 days)", HOLDING)
    chlorophyll_h: float = _setting(24.0, "h", "Hold time: chlorophyll a, to filtering", COMMON)
    winkler_h: float = _setting(8.0, "h", "Hold time: titration of a bottle fixed on site", HOLDING)
    conductance_lab_h: float = _setting(672.0, "h", "Hold time: conductance in the laboratory (28 days)", HOLDING)
    hold_soon_percent: float = _setting(75.0, "%", "Hold time: told from this part of it on", PLANNING)
    receipt_c: float = _setting(6.0, "°C", "Receipt: bottles no warmer than", HOLDING)
    receipt_frozen_c: float = _setting(0.0, "°C", "Receipt: bottles no colder than", HOLDING)
    on_ice_min: float = _setting(15.0, "min", "Bottle: on ice within", COMMON)
    bottle_replicates_percent: float = _setting(10.0, "%", "Bottles: replicates, at least", COMMON)
    bottle_blanks_percent: float = _setting(5.0, "%", "Bottles: blanks, at least", COMMON)
    bottle_rpd_percent: float = _setting(20.0, "%", "Bottle replicates: relative difference up to", COMMON)
    bottle_low_multiple: float = _setting(2.0, "", "Bottle replicates: or, when low, times the reporting limit", COMMON)
    bottle_low_below_multiple: float = _setting(
        5.0, "", "Bottle replicates: low below this many times the reporting limit", PLANNING
    )
    blank_mg_l: float = _setting(0.2, "mg/L", "BOD blank: uses up no more than", LAB_METHOD)
    gga_mg_l: float = _setting(198.0, "mg/L", "Glucose-glutamic acid check: BOD expected", LAB_METHOD)
    gga_tolerance_mg_l: float = _setting(30.5, "mg/L", "Glucose-glutamic acid check: within", LAB_METHOD)
    depletion_mg_l: float = _setting(2.0, "mg/L", "BOD dilution: uses up at least", LAB_METHOD)
    residual_mg_l: float = _setting(1.0, "mg/L", "BOD dilution: leaves at least", LAB_METHOD)
    incubation_days: float = _setting(5.0, "days", "BOD incubation: length", LAB_METHOD)
    incubation_tolerance_h: float = _setting(6.0, "h", "BOD incubation: length within", LAB_METHOD)
    incubation_c: float = _setting(20.0, "°C", "BOD incubation: temperature", LAB_METHOD)
    incubation_tolerance_c: float = _setting(1.0, "°C", "BOD incubation: temperature within", LAB_METHOD)

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
        for low, high in LOW_AND_HIGH:
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


# Settings of which the first must be below the second.
LOW_AND_HIGH = (
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
    ("thermometer_c", "thermometer_worst_c"),
    ("grade_excellent_mg_l", "grade_good_mg_l"),
    ("grade_good_mg_l", "grade_fair_mg_l"),
    ("grade_fair_mg_l", "grade_report_mg_l"),
    ("grade_excellent_percent", "grade_good_percent"),
    ("grade_good_percent", "grade_fair_percent"),
    ("grade_fair_percent", "grade_report_percent"),
    ("grade_excellent_c", "grade_good_c"),
    ("grade_good_c", "grade_fair_c"),
    ("grade_fair_c", "grade_report_c"),
    ("grade_excellent_conductance_percent", "grade_good_conductance_percent"),
    ("grade_good_conductance_percent", "grade_fair_conductance_percent"),
    ("grade_fair_conductance_percent", "grade_report_conductance_percent"),
    ("grade_excellent_ph", "grade_good_ph"),
    ("grade_good_ph", "grade_fair_ph"),
    ("grade_fair_ph", "grade_report_ph"),
    ("upper_depth_percent", "lower_depth_percent"),
    ("flow_change_percent", "flow_stop_percent"),
    ("ph_low", "ph_high"),
    ("position_m", "position_worst_m"),
    ("bod_caution_h", "bod_h"),
    ("receipt_frozen_c", "receipt_c"),
)

SETTINGS = tuple(
    Setting(item.name, item.metadata["label"], item.metadata["unit"], item.default, item.metadata["source"])
    for item in dataclasses.fields(Settings)
)
