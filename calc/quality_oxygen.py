"""Checks on an oxygen value: range, the meter's percentage, supersaturation, steps, replicates, probe in the air."""

import math

from calc.findings import Finding, exceeds, known, shown, within

# Two boxes hold the same number when they agree to half of what a meter's last digit shows.
_SAME_NUMBER = 0.05


def oxygen_unlikely(do_mg_l, settings):
    """Return a finding when oxygen is too low to tell from zero, or higher than rivers go. [mg/L]"""
    (do,) = known(do_mg_l)
    if exceeds(settings.oxygen_low_mg_l, do):
        says = f"{shown(do, 2)} mg/L is below {settings.oxygen_low_mg_l:g}: a meter can't tell that from zero."
        cause = "The river has no oxygen here, or the probe is in the bed, dry or worn out."
        do_next = "Lift the probe off the bed and read again. It is kept as read and reported as less than the limit."
    elif exceeds(do, settings.oxygen_high_mg_l):
        says = f"{shown(do, 2)} mg/L is very high for a river."
        cause = "A wrong digit, a percentage, bubbles on the sensor, or dense plants in bright sun."
        do_next = "Wipe the sensor, check what the meter shows, and read again."
    else:
        return ()
    return (Finding("oxygen_unlikely", "do_mg_l", says, cause, do_next),)


def percent_as_concentration(do_mg_l, saturation_mg_l, settings):
    """Return a finding when the number in the mg/L box looks like percent saturation.

    Parameters
    ----------
    do_mg_l : float
        Entry in the concentration box. [mg/L]
    saturation_mg_l : float
        Saturation at the station; without it nothing is offered. [mg/L]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    do, saturation = known(do_mg_l, saturation_mg_l)
    if not exceeds(do, settings.percent_typed_mg_l):
        return ()
    meant = round(do * saturation / 100, 2)
    offered = math.isfinite(meant)
    return (
        Finding(
            name="percent_as_concentration",
            field="do_mg_l",
            says=f"{shown(do, 1)} is too high for mg/L and looks like a percentage."
            + (f" As percent it stands for {shown(meant, 2)} mg/L." if offered else ""),
            cause="The meter shows percent saturation.",
            do="Switch the meter to mg/L and enter that. If it can't, move the number to the percent box.",
            suggestion={"do_mg_l": meant, "do_percent_meter": do} if offered else None,
        ),
    )


def percent_against_concentration(do_mg_l, do_percent_meter, saturation_mg_l, saturation_760_mg_l, settings):
    """Return a finding when the meter's percentage and its concentration don't belong together.

    Parameters
    ----------
    do_mg_l : float
        Concentration read. [mg/L]
    do_percent_meter : float
        Percent saturation the meter shows. [%]
    saturation_mg_l : float
        Saturation at the station pressure. [mg/L]
    saturation_760_mg_l : float
        Saturation at 760 mmHg, to recognise a meter that shows percent relative to it. [mg/L]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    do, percent, saturation, saturation_760 = known(do_mg_l, do_percent_meter, saturation_mg_l, saturation_760_mg_l)
    if not saturation > 0 or not _percent_differs(do, percent, saturation, settings):
        return ()
    if abs(do - percent) < _SAME_NUMBER:
        cause = "The same number is in the mg/L box and in the percent box."
        do_next = "Look which of the two the meter shows, and correct the other."
    elif saturation_760 > 0 and not _percent_differs(do, percent, saturation_760, settings):
        cause = "The meter shows percent relative to 760 mmHg, not to the pressure here."
        do_next = "Set the meter to local percent, or note its basis. The mg/L can stand."
    else:
        cause = "A wrong digit, or the meter's pressure, salinity or percent setting is not that of this station."
        do_next = "Read both again. Check the pressure and the salinity set in the meter."
    return (
        Finding(
            name="percent_against_concentration",
            field="do_percent_meter",
            says=f"The meter shows {shown(percent, 1)} %, but {shown(do, 2)} mg/L at this temperature and pressure is "
            f"{shown(100 * do / saturation, 1)} %; {shown(percent, 1)} % would be "
            f"{shown(percent * saturation / 100, 2)} mg/L.",
            cause=cause,
            do=do_next,
        ),
    )


def _percent_differs(do, percent, saturation, settings):
    by_points = exceeds(abs(100 * do / saturation - percent), settings.percent_difference)
    return by_points or exceeds(abs(do - percent * saturation / 100), settings.percent_difference_mg_l)


def supersaturation(percent, settings):
    """Return a finding when oxygen is further above saturation than plants alone usually bring it. [%]

    From 100 % to the limit there is none: below a discharge that is evidence of photosynthesis, not an error.
    """
    (percent,) = known(percent)
    if not exceeds(percent, settings.supersaturation_percent):
        return ()
    return (
        Finding(
            name="supersaturation",
            field="do_mg_l",
            says=f"{shown(percent, 0)} % saturation is above {settings.supersaturation_percent:g} %.",
            cause="Bubbles on the sensor, a weir or rapids just upstream, a wrong pressure, or strong photosynthesis. "
            f"Between 100 and {settings.supersaturation_percent:g} % plants alone explain it.",
            do="Shake the bubbles off, check the pressure, and read again. If it stays, note sun and plants.",
        ),
    )


def step_against_neighbour(
    do_mg_l, neighbour_mg_l, settings, *, side, expected_step_mg_l=math.nan, band_half_mg_l=math.nan, position=""
):
    """Return a finding when oxygen differs from the neighbouring station by more than the plan explains.

    Parameters
    ----------
    do_mg_l, neighbour_mg_l : float
        Oxygen here and at the neighbour. [mg/L]
    settings : Settings
    side : str
        "upstream" or "downstream": where the neighbour lies.
    expected_step_mg_l : float
        Predicted oxygen here less that at the neighbour; 0 where unknown. [mg/L]
    band_half_mg_l : float
        Half the width of the predicted band here. [mg/L]
    position : str
        Point in the cross-section.

    Returns
    -------
    tuple of Finding
    """
    do, neighbour, expected, band_half = known(do_mg_l, neighbour_mg_l, expected_step_mg_l, band_half_mg_l)
    planned = 0.0 if math.isnan(expected) else expected
    if not exceeds(abs(do - neighbour - planned), _step_limit(band_half, settings)):
        return ()
    plan = "" if math.isnan(expected) else f" The plan has it {_apart(expected)} there."
    return (
        Finding(
            name="step_against_neighbour",
            field="do_mg_l",
            says=f"{shown(do, 2)} mg/L is {_apart(do - neighbour)} the next station {side}, "
            f"{shown(neighbour, 2)}.{plan}",
            cause=_step_cause(position) + " An inflow or weir between the two, or another time of day, does it too.",
            do="Read again, then at a second point. If it stays, keep it with the reason; a station between may help.",
        ),
    )


def step_against_prediction(do_mg_l, predicted_mg_l, band_low_mg_l, band_high_mg_l, settings, *, position=""):
    """Return a finding when oxygen is further from the prediction than its band makes likely.

    Parameters
    ----------
    do_mg_l, predicted_mg_l : float
        Oxygen read and predicted. [mg/L]
    band_low_mg_l, band_high_mg_l : float
        Predicted band. [mg/L]
    settings : Settings
    position : str
        Point in the cross-section.

    Returns
    -------
    tuple of Finding
    """
    do, predicted, low, high = known(do_mg_l, predicted_mg_l, band_low_mg_l, band_high_mg_l)
    if not exceeds(abs(do - predicted), _step_limit((high - low) / 2, settings)):
        return ()
    return (
        Finding(
            name="step_against_prediction",
            field="do_mg_l",
            says=f"{shown(do, 2)} mg/L is {_apart(do - predicted)} the predicted {shown(predicted, 2)}.",
            cause=_step_cause(position) + " Or the river is not what the plan assumed: that is worth knowing.",
            do="Read again, then check with a second point, meter or titration. If it stays, keep it with the reason.",
        ),
    )


def _step_limit(band_half, settings):
    """Return the largest step that passes. Python's max keeps its first value against NaN, which is wanted here."""
    return max(settings.oxygen_step_mg_l, settings.oxygen_step_bands * band_half)


def _apart(difference):
    if round(difference, 2) == 0:
        return "the same as"
    return f"{shown(abs(difference), 2)} mg/L {'higher' if difference > 0 else 'lower'} than"


def _step_cause(position):
    if position and position not in ("centre", "center", "middle"):
        return f"The value had not settled, or the water at this point ({position}) is not mixed."
    return "The value had not settled, or the probe is near the bed or in slack water."


def replicate_spread(do_mg_l, replicate_mg_l, settings):
    """Return a finding when oxygen and its replicate differ by more than a repeat should. [mg/L]"""
    do, replicate = known(do_mg_l, replicate_mg_l)
    low = exceeds(settings.replicate_low_below_mg_l, (do + replicate) / 2)
    limit = settings.replicate_low_mg_l if low else settings.replicate_mg_l
    if not exceeds(abs(do - replicate), limit):
        return ()
    says = f"Replicates {shown(replicate, 2)} and {shown(do, 2)} differ by {shown(abs(do - replicate), 2)} mg/L."
    return _replicate("do_mg_l", f"{says} They should agree within {limit:g}.")


def replicate_temperature(water_temp_c, replicate_c, settings):
    """Return a finding when the temperature and its replicate differ by more than a repeat should. [°C]"""
    water_temp, replicate = known(water_temp_c, replicate_c)
    if not exceeds(abs(water_temp - replicate), settings.replicate_c):
        return ()
    says = (
        f"Replicates {shown(replicate, 1)} and {shown(water_temp, 1)} °C differ by more than {settings.replicate_c:g}."
    )
    return _replicate("water_temp_c", says)


def replicate_conductance(conductance_us_cm, replicate_us_cm, settings):
    """Return a finding when conductance and its replicate differ by more than a repeat should. [µS/cm]"""
    conductance, replicate = known(conductance_us_cm, replicate_us_cm)
    limit = settings.replicate_conductance_percent
    if not (replicate > 0 and exceeds(100 * abs(conductance / replicate - 1), limit)):
        return ()
    says = f"Replicates {shown(replicate, 0)} and {shown(conductance, 0)} µS/cm differ by more than {limit:g} %."
    return _replicate("conductance_us_cm", says)


def _replicate(field, says):
    cause = "One of the two had not settled, or the water changes from moment to moment here."
    return (Finding("replicate_spread", field, says, cause, "Lift the probe, put it back, wait, and read once more."),)


def air_signature(percent, water_temp_c, air_temp_c, settings):
    """Return a finding when a reading looks like one of moist air.

    Parameters
    ----------
    percent : float
        Percent saturation at the station pressure. [%]
    water_temp_c, air_temp_c : float
        Temperature of the reading and of the air. [°C]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    percent, water_temp, air_temp = known(percent, water_temp_c, air_temp_c)
    saturated = within(percent, settings.air_percent_low, settings.air_percent_high)
    if not saturated or not within(abs(water_temp - air_temp), 0, settings.air_temperature_c):
        return ()
    return (
        Finding(
            name="air_signature",
            field="do_mg_l",
            says=f"{shown(percent, 1)} % saturation at {shown(water_temp, 1)} °C, with the air at "
            f"{shown(air_temp, 1)} °C, is what a probe reads in the air.",
            cause="The probe may be out of the water or still in its cap.",
            do="Is the probe in the water? Put it under, wait a minute, and read again.",
        ),
    )


def frozen_value(do_mg_l, recent_do_mg_l, settings):
    """Return a finding when station after station shows the very same oxygen.

    Parameters
    ----------
    do_mg_l : float
        Oxygen read. [mg/L]
    recent_do_mg_l : iterable of float
        Oxygen at the stations read before this one, the latest last. [mg/L]
    settings : Settings

    Returns
    -------
    tuple of Finding
        None where oxygen can't be told from zero: a river without oxygen reads the same everywhere.
    """
    (do,) = known(do_mg_l)
    others = round(settings.frozen_stations) - 1
    recent = known(*recent_do_mg_l)[-others:] if others > 0 else ()
    same = all(exceeds(settings.frozen_mg_l / 2, abs(do - value)) for value in recent)
    if not recent or len(recent) < others or not same or exceeds(settings.oxygen_low_mg_l, do):
        return ()
    return (
        Finding(
            name="frozen_value",
            field="do_mg_l",
            says=f"{shown(do, 2)} mg/L is exactly what the last {others} stations showed.",
            cause="The meter's display is held, or the probe is not in the water.",
            do="Is the probe in the water? Release the hold, move the probe, and see that the number moves.",
        ),
    )
