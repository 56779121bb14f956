"""Checks on what is read beside oxygen: temperature, conductance, depth, sensor depth and velocity."""

import math
from statistics import median

from calc.findings import Finding, exceeds, known, or_nan, reaches, shown, within
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.units import FOOT_M


def temperature_unit(water_temp_c, nearby_c, settings):
    """Return a finding when a temperature looks like °F in the °C box, and offer the conversion.

    Parameters
    ----------
    water_temp_c : float
        Temperature as entered for °C. [°C]
    nearby_c : iterable of float
        Temperatures at the neighbouring stations and predicted here; NaN where unknown. [°C]
    settings : Settings

    Returns
    -------
    tuple of Finding
        Only where the conversion comes closer to what is nearby; with nothing nearby, where no river is so warm.
    """
    (entered,) = known(water_temp_c)
    if not within(entered, settings.fahrenheit_low, settings.fahrenheit_high):
        return ()
    limit = settings.temperature_limit_c
    usual = [value for value in known(*nearby_c) if within(value, 0, limit)]
    meant = round((entered - 32) / 1.8, 1)
    if usual:
        closer = abs(meant - median(usual)) < abs(entered - median(usual))
        if not closer or not exceeds(abs(entered - median(usual)), settings.temperature_step_c):
            return ()
        why = f"nearby it is {shown(median(usual), 1)} °C"
    elif exceeds(entered, limit):
        why = "no river is that warm"
    else:
        return ()
    return (
        Finding(
            name="temperature_unit",
            field="water_temp_c",
            says=f"{shown(entered, 1)} looks like °F: {why}. As °F it is {shown(meant, 1)} °C.",
            cause="The meter or thermometer shows °F.",
            do=f"If so, enter {shown(meant, 1)} °C, and set the meter to °C.",
            suggestion={"water_temp_c": meant},
        ),
    )


def temperature_unlikely(water_temp_c, settings):
    """Return a finding when the water is colder or warmer than rivers are. [°C]"""
    (water_temp,) = known(water_temp_c)
    if exceeds(settings.temperature_low_c, water_temp):
        says = f"{shown(water_temp, 1)} °C is below freezing."
        cause = "The probe is in the air or in ice, or °C was typed where °F is shown."
    elif exceeds(water_temp, settings.temperature_high_c):
        says = f"{shown(water_temp, 1)} °C is very warm for a river."
        cause = "The probe is in the air or in the discharge itself, or the number is in °F."
    else:
        return ()
    return (
        Finding(
            "temperature_unlikely", "water_temp_c", says, cause, "Put the probe under, wait a minute, and read again."
        ),
    )


def temperature_step(water_temp_c, upstream_c, downstream_c, settings):
    """Return a finding when the temperature differs much from a neighbouring station's.

    Parameters
    ----------
    water_temp_c, upstream_c, downstream_c : float
        Temperature here, at the next station upstream and downstream. [°C]
    settings : Settings

    Returns
    -------
    tuple of Finding
        One, for the larger step.
    """
    here, *neighbours = known(water_temp_c, upstream_c, downstream_c)
    step, neighbour, side = _largest_step(lambda value: abs(here - value), *neighbours)
    if not exceeds(step, settings.temperature_step_c):
        return ()
    return (
        Finding(
            name="temperature_step",
            field="water_temp_c",
            says=f"{shown(here, 1)} °C is {shown(step, 1)} °C {'warmer' if here > neighbour else 'colder'} than "
            f"the next station {side}, {shown(neighbour, 1)} °C.",
            cause="The probe had not settled, or an inflow, a spring, shade or the time of day changed the water.",
            do="Wait a minute and read again. If it stays, keep it and look for an inflow between the two.",
        ),
    )


def _largest_step(step_from, upstream, downstream):
    """Return the larger step with its neighbour and side; NaN where no neighbour is known."""
    steps = [
        (step_from(value), value, side)
        for value, side in ((upstream, "upstream"), (downstream, "downstream"))
        if not math.isnan(step_from(value))
    ]
    return max(steps, default=(math.nan, math.nan, ""))


def conductance_step(conductance_us_cm, upstream_us_cm, downstream_us_cm, settings):
    """Return a finding when specific conductance differs much from a neighbouring station's.

    Parameters
    ----------
    conductance_us_cm, upstream_us_cm, downstream_us_cm : float
        Specific conductance here, at the next station upstream and downstream. [µS/cm at 25 °C]
    settings : Settings

    Returns
    -------
    tuple of Finding
        One, for the larger step.
    """
    here, *neighbours = known(conductance_us_cm, upstream_us_cm, downstream_us_cm)
    step, neighbour, side = _largest_step(
        lambda value: 100 * abs(here / value - 1) if value > 0 else math.nan, *neighbours
    )
    if not exceeds(step, settings.conductance_step_percent):
        return ()
    return (
        Finding(
            name="conductance_step",
            field="conductance_us_cm",
            says=f"{shown(here, 0)} µS/cm is {shown(step, 0)} % {'above' if here > neighbour else 'below'} the next "
            f"station {side}, {shown(neighbour, 0)}.",
            cause="An inflow, water that is not mixed yet, another unit, or air in the cell.",
            do="Check µS or mS, shake the cell, and read again. If it stays, look for an inflow between the two.",
        ),
    )


def conductance_high(conductance_us_cm, water_temp_c, settings):
    """Return a finding when salinity lowers saturation enough to be set in the meter.

    Parameters
    ----------
    conductance_us_cm : float
        Specific conductance. [µS/cm at 25 °C]
    water_temp_c : float
        Temperature the effect is told for. [°C]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    conductance, water_temp = known(conductance_us_cm, water_temp_c)
    if not exceeds(conductance, settings.conductance_high_us_cm):
        return ()
    salinity = or_nan(salinity_psu, conductance)
    lower = or_nan(saturation_mg_l, water_temp) - or_nan(saturation_mg_l, water_temp, 760.0, salinity)
    effect = "" if math.isnan(lower) else f" It lowers saturation by about {shown(lower, 2)} mg/L."
    return (
        Finding(
            name="conductance_high",
            field="conductance_us_cm",
            says=f"{shown(conductance, 0)} µS/cm is too salty to leave out of saturation.{effect}",
            cause="Brine, mine or industrial water, tide, or the wrong unit.",
            do="Check µS or mS. If it is right, set the salinity in the meter too and calibrate with it.",
        ),
    )


def depth_unlikely(depth_m, planned_depth_m, settings):
    """Return a finding when a depth looks like feet in the metre box, or is deeper than such rivers are.

    Parameters
    ----------
    depth_m : float
        Depth entered. [m]
    planned_depth_m : float
        Depth of the plan's reach here. [m]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    depth, planned = known(depth_m, planned_depth_m)
    off_percent = 100 * abs(depth * FOOT_M / planned - 1) if planned > 0 else math.nan
    if within(off_percent, 0, settings.feet_ratio_percent):
        meant = round(depth * FOOT_M, 2)
        return (
            Finding(
                name="depth_unit",
                field="depth_m",
                says=f"{shown(depth, 2)} m is {shown(depth / planned, 1)} times the planned {shown(planned, 2)} m, "
                f"as feet are to metres. As feet it is {shown(meant, 2)} m.",
                cause="The rod or line is marked in feet, or this is a pool.",
                do=f"If it is in feet, enter {shown(meant, 2)} m. If it is a pool, keep it.",
                suggestion={"depth_m": meant},
            ),
        )
    if not exceeds(depth, settings.depth_high_m):
        return ()
    return (
        Finding(
            name="depth_unlikely",
            field="depth_m",
            says=f"{shown(depth, 1)} m is very deep for a river.",
            cause="A missing decimal point, or feet or centimetres in place of metres.",
            do="Check the unit and measure again.",
        ),
    )


def sensor_depth(sensor_depth_m, depth_m, settings):
    """Return a finding when the sensor hangs in the surface skin, at the bed or, impossibly, below it.

    Parameters
    ----------
    sensor_depth_m : float
        Depth of the sensor under the surface. [m]
    depth_m : float
        Depth of the water at that point. [m]
    settings : Settings

    Returns
    -------
    tuple of Finding
        One at most, the worst.
    """
    sensor, depth = known(sensor_depth_m, depth_m)
    field = "sensor_depth_m"
    if exceeds(sensor, depth):
        says = f"The sensor at {shown(sensor, 2)} m would be under the bed: the water is {shown(depth, 2)} m deep."
        cause = "The two depths are swapped, in different units, or one is mistyped."
        return (Finding("sensor_below_bed", field, says, cause, "Measure both again and correct the wrong one."),)
    if exceeds(settings.sensor_bed_m, depth - sensor):
        says = f"The sensor is {shown(depth - sensor, 2)} m above the bed. Mud there takes up oxygen."
        return (Finding("sensor_near_bed", field, says, "The probe hangs too deep.", _lift_or_lower(depth, settings)),)
    if exceeds(settings.sensor_top_m, sensor):
        says = f"The sensor is {shown(sensor, 2)} m under the surface, in the skin that takes up air."
        return (
            Finding("sensor_at_surface", field, says, "The probe hangs too high.", _lift_or_lower(depth, settings)),
        )
    return ()


def _lift_or_lower(depth, settings):
    if reaches(settings.sensor_top_m + settings.sensor_bed_m, depth):
        return "The water is too shallow to keep clear of both: look for a deeper spot nearby, or note it."
    return "Hang it at 0.6 of the depth and read again."


def velocity_unlikely(velocity_m_s, settings):
    """Return a finding when the water is nearly still, runs backwards, or is faster than crews measure. [m/s]"""
    (velocity,) = known(velocity_m_s)
    if exceeds(0, velocity):
        says, cause = (
            f"{shown(velocity, 2)} m/s runs upstream.",
            "An eddy, tide or backwater, or the meter is reversed.",
        )
    elif exceeds(settings.velocity_low_m_s, velocity):
        says = f"{shown(velocity, 2)} m/s is nearly still: below what most meters can tell."
        cause = "Slack water, a fouled propeller, or a misplaced decimal point."
    elif exceeds(velocity, settings.velocity_high_m_s):
        says = f"{shown(velocity, 2)} m/s is very fast."
        cause = "A misplaced decimal point, or feet per second in place of metres per second."
    else:
        return ()
    return (Finding("velocity_unlikely", "velocity_m_s", says, cause, "Check the unit and measure in the main flow."),)
