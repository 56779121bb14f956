"""Checks on the visit: hazards to the crew, early or late for the parcel, the length of a run, the time itself."""

import math

from calc.findings import Finding, exceeds, known, reaches, shown
from calc.units import FOOT_M


def wading(depth_m, velocity_m_s, settings):
    """Return a finding when depth times velocity or depth reaches a wading limit.

    Parameters
    ----------
    depth_m : float
        Depth where the crew would wade, measured or estimated. [m]
    velocity_m_s : float
        Velocity there, either direction. [m/s]
    settings : Settings

    Returns
    -------
    tuple of Finding
        Below every limit there is none, which is no permission: the page still says that it is the crew's judgement.
    """
    depth, velocity = known(depth_m, velocity_m_s)
    product = depth * abs(velocity)
    if reaches(product, settings.wading_stop_m2_s):
        limit = settings.wading_stop_m2_s
        says = f"Do not wade. {_product_of(depth, velocity)} "
        says += f"The limit is {shown(limit, 2)} ({shown(limit / FOOT_M**2, 0)} ft²/s)."
        do = "Use a bridge, a boat or the bank."
        return (_wading("do_not_wade", "velocity_m_s", says, do),)
    do = "Local rules, your employer's plan and your judgement decide: bed, cold, debris, experience."
    if reaches(product, settings.wading_caution_m2_s):
        says = f"{_product_of(depth, velocity)} The project's wading limit is {settings.wading_caution_m2_s:g} m²/s."
        return (_wading("wading_caution", "velocity_m_s", says, do),)
    if exceeds(depth, settings.wading_depth_m):
        says = f"Depth {shown(depth, 2)} m is above the project's wading limit of {settings.wading_depth_m:g} m."
        return (_wading("wading_caution", "depth_m", says, do),)
    return ()


def _product_of(depth, velocity):
    product = depth * abs(velocity)
    return (
        f"Depth {shown(depth, 2)} m times velocity {shown(abs(velocity), 2)} m/s is {shown(product, 2)} m²/s "
        f"({shown(product / FOOT_M**2, 1)} ft²/s)."
    )


def _wading(name, field, says, do):
    cause = "Deep or fast water takes people off their feet; soft bed, ice and rising water make it worse."
    return Finding(name, field, says, cause, do, hazard=True)


def cold_water(water_temp_c, settings):
    """Return a finding when the water is cold enough to be a hazard to whoever falls in. [°C]"""
    (water_temp,) = known(water_temp_c)
    cause = "Cold water takes the breath in the first minute and useful movement in about ten."
    if exceeds(settings.very_cold_water_c, water_temp):
        says = f"The water is {shown(water_temp, 1)} °C: dangerously cold."
        do = "Dress for immersion, flotation on and fastened, and never alone."
    elif exceeds(settings.cold_water_c, water_temp):
        says = f"The water is {shown(water_temp, 1)} °C: cold enough to weaken a person who falls in."
        do = "Flotation on and fastened, dry clothes at hand, and never alone."
    else:
        return ()
    return (Finding("cold_water", "water_temp_c", says, cause, do, hazard=True),)


def parcel_timing(hours_late, travel_time_h, settings):
    """Return a finding when the reading misses the parcel of water that is being followed.

    Parameters
    ----------
    hours_late : float
        Time of the reading less the time the parcel gets there; negative when early. [h]
    travel_time_h : float
        Travel time of the parcel from the release to here. [h]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    late, travel_time = known(hours_late, travel_time_h)
    # max keeps its first value against NaN: without a travel time the fixed tolerance counts.
    tolerance = max(settings.parcel_h, settings.parcel_percent / 100 * travel_time)
    if not exceeds(abs(late), tolerance):
        return ()
    word = "late" if late > 0 else "early"
    if late > 0:
        do = "Read now and keep it. Then catch up, or change to a snapshot and note the decision."
    else:
        do = f"Wait {shown(-late, 1)} h if you can, or read now and again when the parcel is here."
    return (
        Finding(
            name=f"{word}_for_parcel",
            field="taken_at",
            says=f"{shown(abs(late), 1)} h {word} for the parcel; up to {shown(tolerance, 1)} h is usual.",
            cause="The river runs slower or faster than planned, the crew does, or the time is mistyped.",
            do=do,
        ),
    )


def snapshot_long(snapshot_span_h, settings):
    """Return a finding when the stations of one snapshot lie too far apart in time. [h]"""
    (span,) = known(snapshot_span_h)
    if not exceeds(span, settings.snapshot_h):
        return ()
    return (
        Finding(
            name="snapshot_long",
            field="taken_at",
            says=f"This run has taken {shown(span, 1)} h; beyond {settings.snapshot_h:g} h stations hardly compare.",
            cause="Oxygen rises and falls with the sun, so the time of day shows as a change along the river.",
            do="Read the first station again. If it moved, plan a second run before dawn.",
        ),
    )


def taken_at(hours_after_now, hours_before_survey, settings):
    """Return a finding when the time of a reading can hardly be right.

    Parameters
    ----------
    hours_after_now : float
        Time of the reading less the clock's time; positive when in the future. [h]
    hours_before_survey : float
        Start of the survey less the time of the reading; positive when before it. [h]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    after_now, before_survey = known(hours_after_now, hours_before_survey)
    if exceeds(60 * after_now, settings.future_min):
        name, says = "time_in_future", f"The time is {_hours(after_now)} in the future."
        cause = "The date or hour is mistyped, or this phone's clock is wrong."
    elif exceeds(before_survey, settings.before_survey_h):
        name, says = "time_before_survey", f"The time is {_hours(before_survey)} before the survey starts."
        cause = "The date is mistyped, or the reading belongs to another survey."
    else:
        return ()
    return (Finding(name, "taken_at", says, cause, "Check the date, the time and the clock of this phone."),)


def _hours(hours):
    if hours < 1:
        return f"{shown(60 * hours, 0)} minutes"
    return f"{shown(hours, 1)} hours" if hours < 48 or not math.isfinite(hours) else f"{shown(hours / 24, 0)} days"
