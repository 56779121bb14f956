"""The checks on one reading, all at once: values, what is known around them, and the survey's settings."""

import math
from dataclasses import dataclass

from calc.findings import known, or_nan
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.quality_bracket import Bracket, bracket_finding
from calc.quality_day import ph_unlikely, position_poor
from calc.quality_oxygen import (
    air_signature,
    frozen_value,
    oxygen_unlikely,
    percent_against_concentration,
    percent_as_concentration,
    replicate_conductance,
    replicate_spread,
    replicate_temperature,
    step_against_neighbour,
    step_against_prediction,
    supersaturation,
)
from calc.quality_pressure import pressure_against_elevation, pressure_unit, sea_level_pressure
from calc.quality_series import Stability, unstable
from calc.quality_visit import cold_water, parcel_timing, snapshot_long, taken_at, wading
from calc.quality_water import (
    conductance_high,
    conductance_step,
    depth_unlikely,
    sensor_depth,
    temperature_step,
    temperature_unit,
    temperature_unlikely,
    velocity_unlikely,
)


@dataclass(frozen=True)
class ReadingValues:
    """What the crew entered, in SI; NaN or None where nothing was.

    Attributes
    ----------
    do_mg_l, water_temp_c, depth_m, do_percent_meter, conductance_us_cm, sensor_depth_m, velocity_m_s : float
    pressure_mmhg : float
        Pressure as entered, converted but not un-reduced. [mmHg]
    pressure_value, pressure_unit : float, str
        Pressure as entered, and the UCUM code of its unit.
    pressure_source : str
        "meter", "barometer", "weather" or "none".
    position : str
        Point in the cross-section: "left", "centre", "right"; empty where not told.
    platform : str
        "wade", "boat", "bridge" or "bank"; empty where not told. Wading limits are for those who wade or may.
    ph : float
    stability : Stability, optional
        Of the raw values of oxygen.
    position_radius_m : float
        Radius around the position in which the reading was taken, as the phone gives it. [m]
    """

    do_mg_l: float = math.nan
    water_temp_c: float = math.nan
    depth_m: float = math.nan
    do_percent_meter: float = math.nan
    conductance_us_cm: float = math.nan
    pressure_mmhg: float = math.nan
    pressure_value: float = math.nan
    pressure_unit: str = "mm[Hg]"
    pressure_source: str = "none"
    sensor_depth_m: float = math.nan
    velocity_m_s: float = math.nan
    position: str = ""
    platform: str = ""
    ph: float = math.nan
    stability: Stability | None = None
    position_radius_m: float = math.nan


@dataclass(frozen=True)
class ReadingContext:
    """What is known around a reading; NaN or None where it is not.

    Attributes
    ----------
    elevation_m : float
    station_pressure_mmhg : float
        Pressure used for saturation, un-reduced where the entry was a weather value. [mmHg]
    saturation_mg_l : float
        Saturation used; computed from the reading and the station pressure where missing. [mg/L]
    predicted_do_mg_l, band_low_mg_l, band_high_mg_l, predicted_temp_c : float
        Prediction at this station.
    upstream_*, downstream_* : float
        At the nearest station read on that side. *_predicted_do_mg_l is the prediction there; with it a step counts
        only beyond the step the plan expects.
    planned_depth_m, air_temp_c : float
    hours_late, travel_time_h : float
        Reading less arrival of the parcel (negative when early), and its travel time to here. [h]
    replicate_* : float
        The reading this one repeats.
    recent_do_mg_l : tuple of float
        Oxygen at the stations read before this one, the latest last. [mg/L]
    snapshot_span_h, hours_after_now, hours_before_survey : float
        First reading of the run to this one; reading less clock; start of the survey less reading. [h]
    bracket : Bracket, optional
        Where the reading lies among its meter's checks. While a day is not closed every reading lacks a check after
        it, so it is left out while the crew is at the water.
    """

    elevation_m: float = math.nan
    station_pressure_mmhg: float = math.nan
    saturation_mg_l: float = math.nan
    predicted_do_mg_l: float = math.nan
    band_low_mg_l: float = math.nan
    band_high_mg_l: float = math.nan
    predicted_temp_c: float = math.nan
    upstream_do_mg_l: float = math.nan
    downstream_do_mg_l: float = math.nan
    upstream_predicted_do_mg_l: float = math.nan
    downstream_predicted_do_mg_l: float = math.nan
    upstream_temp_c: float = math.nan
    downstream_temp_c: float = math.nan
    upstream_conductance_us_cm: float = math.nan
    downstream_conductance_us_cm: float = math.nan
    planned_depth_m: float = math.nan
    air_temp_c: float = math.nan
    hours_late: float = math.nan
    travel_time_h: float = math.nan
    replicate_do_mg_l: float = math.nan
    replicate_temp_c: float = math.nan
    replicate_conductance_us_cm: float = math.nan
    recent_do_mg_l: tuple = ()
    snapshot_span_h: float = math.nan
    hours_after_now: float = math.nan
    hours_before_survey: float = math.nan
    bracket: Bracket | None = None


def reading_findings(reading, context, settings):
    """Return every finding on a reading, hazards to the crew first.

    One slip gives one finding: what follows from a pressure or temperature in the wrong unit, or from a percentage in
    the mg/L box, is not asked about as well.

    Parameters
    ----------
    reading : ReadingValues
    context : ReadingContext
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    pressure_slips = _pressure_slips(reading, context, settings)
    temperature_slips = temperature_unit(
        reading.water_temp_c, (context.upstream_temp_c, context.downstream_temp_c, context.predicted_temp_c), settings
    )
    saturation = math.nan if pressure_slips or temperature_slips else _saturation(reading, context)
    return (
        *_wading(reading, settings),
        *cold_water(reading.water_temp_c, settings),
        *_oxygen(reading, context, saturation, settings),
        *(temperature_slips or _temperature(reading, context, settings)),
        *(pressure_slips or pressure_against_elevation(context.station_pressure_mmhg, context.elevation_m, settings)),
        *_water(reading, context, settings),
        *_pace(context, settings),
        *taken_at(context.hours_after_now, context.hours_before_survey, settings),
        *(position_poor(reading.position_radius_m, settings) if _given(reading.position_radius_m) else ()),
        *bracket_finding(context.bracket),
    )


def _given(value):
    """Return whether there is a value. A check without one finds nothing: not to begin it saves most of the time."""
    return value is not None and not math.isnan(value)


def _wading(reading, settings):
    if reading.platform not in ("", "wade") or not _given(reading.depth_m):
        return ()
    return wading(reading.depth_m, reading.velocity_m_s, settings)


def _pace(context, settings):
    return (
        *(parcel_timing(context.hours_late, context.travel_time_h, settings) if _given(context.hours_late) else ()),
        *(snapshot_long(context.snapshot_span_h, settings) if _given(context.snapshot_span_h) else ()),
    )


def _pressure_slips(reading, context, settings):
    if not _given(reading.pressure_mmhg) and not _given(reading.pressure_value):
        return ()
    # A weather value is reduced to sea level, so its unit shows at elevation 0.
    elevation = 0.0 if reading.pressure_source == "weather" else context.elevation_m
    return sea_level_pressure(
        reading.pressure_mmhg,
        context.elevation_m,
        reading.water_temp_c,
        settings,
        source=reading.pressure_source,
        unit=reading.pressure_unit,
    ) + pressure_unit(reading.pressure_value, reading.pressure_unit, elevation, settings)


def _saturation(reading, context):
    """Return saturation at the station pressure, NaN where it can't be told. [mg/L]"""
    (saturation,) = known(context.saturation_mg_l)
    if not math.isnan(saturation):
        return saturation
    water_temp, pressure = known(reading.water_temp_c, context.station_pressure_mmhg)
    return or_nan(saturation_mg_l, water_temp, pressure, _salinity(reading))


def _salinity(reading):
    """Return the salinity, 0 where it is not known. [-]"""
    (conductance,) = known(reading.conductance_us_cm)
    salinity = or_nan(salinity_psu, conductance)
    return 0.0 if math.isnan(salinity) else salinity


def _oxygen(reading, context, saturation, settings):
    slips = percent_as_concentration(reading.do_mg_l, saturation, settings)
    if slips:
        return slips
    (do,) = known(reading.do_mg_l)
    percent = 100 * do / saturation if saturation > 0 else math.nan
    return (
        *(supersaturation(percent, settings) or oxygen_unlikely(do, settings)),
        *_percent_on_meter(reading, do, saturation, settings),
        *(
            air_signature(percent, reading.water_temp_c, context.air_temp_c, settings)
            if _given(context.air_temp_c)
            else ()
        ),
        *frozen_value(do, context.recent_do_mg_l, settings),
        *unstable(reading.stability, settings),
        *(replicate_spread(do, context.replicate_do_mg_l, settings) if _given(context.replicate_do_mg_l) else ()),
        *_oxygen_steps(do, context, settings, reading.position),
    )


def _percent_on_meter(reading, do, saturation, settings):
    """Return the finding on the meter's percentage; saturation at 760 mmHg is only worked out to explain one."""
    percent = reading.do_percent_meter
    if not _given(percent) or not percent_against_concentration(do, percent, saturation, math.nan, settings):
        return ()
    (water_temp,) = known(reading.water_temp_c)
    saturation_760 = or_nan(saturation_mg_l, water_temp, 760.0, _salinity(reading))
    return percent_against_concentration(do, percent, saturation, saturation_760, settings)


def _oxygen_steps(do, context, settings, position):
    predicted, low, high = context.predicted_do_mg_l, context.band_low_mg_l, context.band_high_mg_l
    neighbours = (
        ("upstream", context.upstream_do_mg_l, context.upstream_predicted_do_mg_l),
        ("downstream", context.downstream_do_mg_l, context.downstream_predicted_do_mg_l),
    )
    band_half = _difference(high, low) / 2
    found = []
    for side, neighbour, predicted_there in neighbours:
        if _given(neighbour):
            found += step_against_neighbour(
                do,
                neighbour,
                settings,
                side=side,
                expected_step_mg_l=_difference(predicted, predicted_there),
                band_half_mg_l=band_half,
                position=position,
            )
    return (*found, *step_against_prediction(do, predicted, low, high, settings, position=position))


def _difference(value, other):
    value, other = known(value, other)
    return value - other


def _temperature(reading, context, settings):
    water_temp = reading.water_temp_c
    steps = temperature_step(water_temp, context.upstream_temp_c, context.downstream_temp_c, settings)
    repeated = context.replicate_temp_c
    return (
        *(temperature_unlikely(water_temp, settings) or steps),
        *(replicate_temperature(water_temp, repeated, settings) if _given(repeated) else ()),
    )


def _water(reading, context, settings):
    return (
        *(_conductance(reading, context, settings) if _given(reading.conductance_us_cm) else ()),
        *(depth_unlikely(reading.depth_m, context.planned_depth_m, settings) if _given(reading.depth_m) else ()),
        *(sensor_depth(reading.sensor_depth_m, reading.depth_m, settings) if _given(reading.sensor_depth_m) else ()),
        *(velocity_unlikely(reading.velocity_m_s, settings) if _given(reading.velocity_m_s) else ()),
        *(ph_unlikely(reading.ph, settings) if _given(reading.ph) else ()),
    )


def _conductance(reading, context, settings):
    here = reading.conductance_us_cm
    return (
        *conductance_step(here, context.upstream_conductance_us_cm, context.downstream_conductance_us_cm, settings),
        *replicate_conductance(here, context.replicate_conductance_us_cm, settings),
        *conductance_high(here, reading.water_temp_c, settings),
    )
