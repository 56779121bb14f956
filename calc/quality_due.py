"""Checks that are due: before the first station, again when conditions move, in zero solution, of the thermometer."""

import math

from calc.findings import Finding, exceeds, known, shown


def calibration_missing(checks_today, passed_today, settings):
    """Return a finding when oxygen was not checked, or did not pass, before the first station of the day.

    Parameters
    ----------
    checks_today, passed_today : float
        How many oxygen checks of this meter were made at the site today, other than in zero solution, and how many of
        them passed.
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    made, passed = known(checks_today, passed_today)
    if made <= 0:
        says = "This meter has no oxygen check today."
    elif passed <= 0:
        says = "No oxygen check of this meter passed today."
    else:
        return ()
    return (
        Finding(
            name="calibration_missing",
            field="meter",
            says=says,
            cause="The check was skipped, not written down, or entered for another meter or day.",
            do="Check in air-saturated water here, as found. Adjust if it is off by more than "
            f"{settings.check_mg_l:g} mg/L, and read back.",
        ),
    )


def standard_expired(days_past):
    """Return a finding when a standard, or the certificate of a reference, is past its date. [days]"""
    (days,) = known(days_past)
    if not exceeds(days, 0):
        return ()
    past = f"{math.ceil(days)} day{'' if days <= 1 else 's'}"
    return (
        Finding(
            name="standard_expired",
            field="standard",
            says=f"This standard expired {past} ago.",
            cause="An old bottle, a reference that was not sent in, or a mistyped date.",
            do="Use a fresh standard. If there is none, keep the check and note the date.",
        ),
    )


def recheck_due(
    hours_since, elevation_change_m, pressure_change_mmhg, temperature_change_c, settings, *, disturbed=False
):
    """Return a finding when conditions have moved so far since the last check that another is due.

    Parameters
    ----------
    hours_since : float
        Time since the last check. [h]
    elevation_change_m, pressure_change_mmhg, temperature_change_c : float
        Change since then, either way. [m, mmHg, °C]
    settings : Settings
    disturbed : bool
        A new cap, membrane or battery, a knock, or a surprise.

    Returns
    -------
    tuple of Finding
        One, with every reason.
    """
    hours, elevation, pressure, temperature = known(
        hours_since, elevation_change_m, pressure_change_mmhg, temperature_change_c
    )
    elevation, pressure = abs(elevation), abs(pressure)
    warmer = "warmer" if temperature > 0 else "colder"
    reasons = [
        reason
        for holds, reason in (
            (disturbed, "something was changed or knocked"),
            (exceeds(hours, settings.recheck_h), f"{shown(hours, 1)} h have passed"),
            (exceeds(elevation, settings.recheck_elevation_m), f"the elevation differs by {shown(elevation, 0)} m"),
            (exceeds(pressure, settings.recheck_pressure_mmhg), f"the pressure differs by {shown(pressure, 0)} mmHg"),
            (
                exceeds(abs(temperature), settings.recheck_temperature_c),
                f"the water is {shown(abs(temperature), 1)} °C {warmer}",
            ),
        )
        if holds
    ]
    if not reasons:
        return ()
    return (
        Finding(
            name="recheck_due",
            field="meter",
            says=f"Since the last meter check {', '.join(reasons)}.",
            cause="Saturation moves with pressure and temperature, and a sensor moves with time and handling.",
            do=f"Check the meter here: within {settings.field_check_mg_l:g} mg/L it is fit to go on.",
        ),
    )


def zero_check_due(days_since, lowest_expected_mg_l, settings):
    """Return a finding when a check in zero solution is due.

    Parameters
    ----------
    days_since : float
        Time since the last one; infinity where there never was one. [days]
    lowest_expected_mg_l : float
        Lowest oxygen that the survey expects. [mg/L]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    never = days_since == math.inf
    days, lowest = known(days_since, lowest_expected_mg_l)
    low = exceeds(settings.zero_low_mg_l, lowest) and (never or exceeds(days, settings.zero_low_days))
    if not (low or never or exceeds(days, settings.zero_days)):
        return ()
    last = "never was one" if never else f"last was one {shown(days, 0)} days ago"
    why = f" This survey expects {shown(lowest, 1)} mg/L." if low else ""
    return (
        Finding(
            name="zero_check_due",
            field="meter",
            says=f"A zero check is due: there {last}.{why}",
            cause="A sensor may read saturated water right and little oxygen wrong.",
            do=f"Read fresh zero solution: up to {settings.zero_mg_l:g} mg/L passes. Rinse well after.",
        ),
    )


def outside_standards(lowest, highest, lowest_standard, highest_standard, settings):
    """Return a finding when values lie outside the standards that the meter was checked in.

    Parameters
    ----------
    lowest, highest : float
        Lowest and highest value read. [one unit for all four]
    lowest_standard, highest_standard : float
        Lowest and highest value of a passing check.
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    lowest, highest, lowest_standard, highest_standard = known(lowest, highest, lowest_standard, highest_standard)
    if exceeds(lowest_standard, lowest):
        says = f"{lowest:g} was read, but the lowest standard that passed is {lowest_standard:g}."
    elif exceeds(highest, highest_standard * (1 + settings.standards_beyond_percent / 100)):
        says = f"{highest:g} was read, but the highest standard that passed is {highest_standard:g}."
    else:
        return ()
    cause = "The meter was checked at one value only, or the river holds more or less than was expected."
    do = "Check the meter in a standard beyond that value too, for little oxygen in zero solution."
    return (Finding("outside_standards", "standard", says, cause, do),)


def thermometer_differs(meter_c, reference_c, settings):
    """Return a finding when a meter's temperature differs from a certified thermometer's. [°C]"""
    meter, reference = known(meter_c, reference_c)
    difference = abs(meter - reference)
    if not exceeds(difference, settings.thermometer_c):
        return ()
    worst = exceeds(difference, settings.thermometer_worst_c)
    return (
        Finding(
            name="thermometer_differs",
            field="water_temp_c",
            says=f"The meter reads {shown(difference, 1)} °C {'warmer' if meter > reference else 'colder'} than the "
            f"certified thermometer, {shown(reference, 1)} °C.",
            cause="One of the two had not settled, or the meter's thermometer is off; its oxygen is off with it.",
            do="Use another meter." if worst else "Stir, wait a minute and compare again. If it stays, correct for it.",
        ),
    )


def thermometer_due(days_since, settings):
    """Return a finding when a meter's thermometer was not compared over its range for too long. [days]"""
    (days,) = known(days_since)
    if not exceeds(days, settings.thermometer_days):
        return ()
    return (
        Finding(
            name="thermometer_due",
            field="meter",
            says=f"This meter's thermometer was last compared over its range {shown(days, 0)} days ago.",
            cause="The yearly comparison is overdue, or was not entered.",
            do="Compare at two points with a certified thermometer, and at five before the next season.",
        ),
    )


def winkler_pair(first_mg_l, second_mg_l, settings):
    """Return a finding when the two titrations of one water differ by more than they should. [mg/L]"""
    first, second = known(first_mg_l, second_mg_l)
    if not exceeds(abs(first - second), settings.winkler_pair_mg_l):
        return ()
    return (
        Finding(
            name="winkler_pair",
            field="do_mg_l",
            says=f"The two titrations, {shown(first, 2)} and {shown(second, 2)} mg/L, differ by more than "
            f"{settings.winkler_pair_mg_l:g}.",
            cause="Air in a bottle, a reagent that is old, or an endpoint that was passed.",
            do="Titrate a third bottle, and keep the two that agree.",
        ),
    )


def meter_in_two_places(distance_km, hours, settings):
    """Return a finding when one meter would have travelled faster than a car.

    Parameters
    ----------
    distance_km, hours : float
        Distance and time between two of its uses. [km, h]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    distance, hours = known(distance_km, hours)
    distance, hours = abs(distance), abs(hours)
    if not exceeds(distance, settings.meter_places_km) or not exceeds(distance, settings.meter_speed_km_h * hours):
        return ()
    return (
        Finding(
            name="meter_in_two_places",
            field="meter",
            says=f"This meter was used {shown(distance, 1)} km apart within {shown(60 * hours, 0)} minutes.",
            cause="Two meters share a number, the wrong meter was chosen, or a time is mistyped.",
            do="Look at the serial number on the meter and at the two times, and correct what is wrong.",
        ),
    )
