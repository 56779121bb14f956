"""Checks on a day's work: replicates, the anchor station, daylight, flow and weather, completeness, clock, position."""

import math
from dataclasses import dataclass

from calc.findings import Finding, exceeds, known, reaches, shown, within


def replicate_due(readings_by_crew_today, replicates_by_crew_today, settings):
    """Return a sentence when the crew's next reading is to be repeated, else an empty one.

    Parameters
    ----------
    readings_by_crew_today, replicates_by_crew_today : float
        How many readings the crew took today, not counting replicates, and how many replicates.
    settings : Settings
        One replicate for each ten readings begun, and at least so many a day.

    Returns
    -------
    str
    """
    readings, replicates = known(readings_by_crew_today, replicates_by_crew_today)
    if not (readings > 0 and replicates >= 0):
        return ""
    every = max(settings.replicate_every, 1.0)
    wanted = max(settings.replicate_per_day, math.ceil(readings / every))
    if not exceeds(wanted, replicates):
        return ""
    many = "1 reading" if readings == 1 else f"{shown(readings, 0)} readings"
    return (
        f"A replicate is due: {shown(replicates, 0)} so far in {many} today. One in "
        f"{settings.replicate_every:g} is wanted, and at least {settings.replicate_per_day:g} a day. Lift the probe, "
        "put it back, let it settle and read again."
    )


def anchor_moved(first_mg_l, again_mg_l, settings):
    """Return a finding when oxygen at the anchor station moved while the others were read. [mg/L]"""
    first, again = known(first_mg_l, again_mg_l)
    if not exceeds(abs(again - first), settings.anchor_mg_l):
        return ()
    return (
        Finding(
            name="diel",
            field="do_mg_l",
            says=f"The anchor station moved from {shown(first, 2)} to {shown(again, 2)} mg/L, by more than "
            f"{settings.anchor_mg_l:g}.",
            cause="Plants make oxygen by day and everything uses it by night, or flow or discharge changed.",
            do="Stations read hours apart don't compare directly. Plan a run before dawn and one in the afternoon.",
        ),
    )


def snapshot_daylight(first_h, last_h, sunrise_h, sunset_h, settings):
    """Return a finding when one snapshot run holds readings from daylight and from before or after it.

    Parameters
    ----------
    first_h, last_h : float
        First and last reading of the run. [h, any common axis]
    sunrise_h, sunset_h : float
        Of the day of the run. Daylight counts from after_sunrise_h past sunrise to sunset. [h]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    first, last, sunrise, sunset = known(first_h, last_h, sunrise_h, sunset_h)
    starts = sunrise + settings.after_sunrise_h
    over_dawn = exceeds(starts, first) and exceeds(last, starts)
    over_dusk = exceeds(sunset, first) and exceeds(last, sunset)
    if not (over_dawn or over_dusk):
        return ()
    when = " and ".join(
        part
        for holds, part in (
            (over_dawn, f"{settings.after_sunrise_h:g} h past sunrise"),
            (over_dusk, "sunset"),
        )
        if holds
    )
    return (
        Finding(
            name="snapshot_daylight",
            field="taken_at",
            says=f"This run goes on across {when}: some stations were read in the dark and some in daylight.",
            cause="Oxygen is lowest near dawn and rises with the sun, which shows as a change along the river.",
            do="Read the anchor station again. If it moved, compare only stations read on one side of it.",
        ),
    )


def stage_changed(first_m, again_m, settings):
    """Return a finding when the water level changed during the survey. [m]"""
    first, again = known(first_m, again_m)
    change = again - first
    if not exceeds(abs(change), settings.stage_change_m):
        return ()
    says = f"The stage {'rose' if change > 0 else 'fell'} by {shown(abs(change), 2)} m."
    return (_flow_changing("stage_m", says, "Ask the plant and the dam, look at the sky, and note the stage again."),)


def flow_changed(before_m3_s, now_m3_s, settings):
    """Return a finding when the flow changed, and a sterner one when the survey is no longer steady. [m³/s]"""
    before, now = known(before_m3_s, now_m3_s)
    percent = 100 * (now / before - 1) if before > 0 else math.nan
    if not exceeds(abs(percent), settings.flow_change_percent):
        return ()
    says = f"The flow {'rose' if percent > 0 else 'fell'} by {shown(abs(percent), 0)} %, to {now:.3g} m³/s."
    if exceeds(abs(percent), settings.flow_stop_percent):
        return (
            _flow_changing(
                "flow_m3_s",
                f"{says} The survey is no longer steady.",
                "Stop and think: go on as a new run, or come back when the flow is steady. Note what was decided.",
            ),
        )
    return (_flow_changing("flow_m3_s", says, "Ask the plant and the dam, and compare stations with care."),)


def _flow_changing(field, says, do):
    return Finding("flow_changing", field, says, "Rain, a release from a dam, or a change at the plant.", do)


def rained(rain_mm, settings):
    """Return a finding when it rained in the reach during the survey or the day before. [mm]"""
    (rain,) = known(rain_mm)
    if not exceeds(rain, settings.rain_mm):
        return ()
    return (
        Finding(
            name="rained",
            field="rain_mm",
            says=f"It rained {shown(rain, 1)} mm in the reach; up to {settings.rain_mm:g} hardly matters.",
            cause="Runoff brings flow, oxygen demand and sometimes untreated sewage.",
            do="Read the stage again, watch for rising or darker water, and note when the rain began.",
        ),
    )


def effluent_changed(before_m3_s, now_m3_s, settings):
    """Return a finding when the discharge's own flow changed. [m³/s]"""
    before, now = known(before_m3_s, now_m3_s)
    percent = 100 * (now / before - 1) if before > 0 else math.nan
    if not exceeds(abs(percent), settings.effluent_change_percent):
        return ()
    return (
        Finding(
            name="effluent_changed",
            field="flow_m3_s",
            says=f"The discharge {'rose' if percent > 0 else 'fell'} by {shown(abs(percent), 0)} %.",
            cause="The time of day, rain in the sewers, or a change at the plant.",
            do="Ask the plant for its log. Note which stations the changed discharge had reached.",
        ),
    )


@dataclass(frozen=True)
class Completeness:
    """How much of what was planned became valid values.

    percent, critical_percent : valid of planned, and at critical stations; NaN where none was planned. [%]
    complete : None where it can't be told.
    """

    percent: float
    critical_percent: float
    complete: bool | None
    says: str


def completeness(planned, valid, critical_planned, critical_valid, settings):
    """Return whether enough of the planned values are there and valid.

    Parameters
    ----------
    planned, valid : float
        Values planned, and of these the valid ones.
    critical_planned, critical_valid : float
        The same at critical stations; where none are planned, they don't count.
    settings : Settings

    Returns
    -------
    Completeness
    """
    planned, valid, critical_planned, critical_valid = known(planned, valid, critical_planned, critical_valid)
    percent = 100 * valid / planned if planned > 0 else math.nan
    critical = 100 * critical_valid / critical_planned if critical_planned > 0 else math.nan
    if math.isnan(percent) or (critical_planned > 0 and math.isnan(critical)):
        return Completeness(percent, critical, None, "Completeness can't be told: nothing planned is known.")
    complete = reaches(percent, settings.complete_percent)
    says = (
        f"{shown(valid, 0)} of {shown(planned, 0)} planned values are valid: {shown(percent, 0)} %, "
        f"{settings.complete_percent:g} % are wanted."
    )
    if critical_planned > 0:
        complete = complete and reaches(critical, settings.complete_critical_percent)
        says += (
            f" At critical stations {shown(critical_valid, 0)} of {shown(critical_planned, 0)}; "
            f"{settings.complete_critical_percent:g} % are wanted."
        )
    return Completeness(percent, critical, complete, says)


def mass_balance(found, expected, settings, *, field="flow_m3_s"):
    """Return a finding when a flow, conductance or temperature is far from what the mass balance gives.

    Parameters
    ----------
    found, expected : float
        Measured below the mixing, and computed from what flows in. [one unit for both]
    settings : Settings
    field : str
        The form field it belongs to.

    Returns
    -------
    tuple of Finding
    """
    found, expected = known(found, expected)
    percent = 100 * abs(found / expected - 1) if expected > 0 else math.nan
    if not exceeds(percent, settings.balance_percent):
        return ()
    return (
        Finding(
            name="mass_balance",
            field=field,
            says=f"{found:.3g} was found where the mass balance gives {expected:.3g}: {shown(percent, 0)} % off.",
            cause="An inflow or withdrawal that is not in the plan, water that is not mixed, or a wrong flow.",
            do="Look for an inflow between the two, and measure the flow or the conductance again.",
        ),
    )


def probe_against_titration(probe_mg_l, titration_mg_l, settings):
    """Return a finding when a probe differs from a titration, or from a second meter, by more than it should. [mg/L]"""
    probe, titration = known(probe_mg_l, titration_mg_l)
    if not exceeds(abs(probe - titration), settings.second_method_mg_l):
        return ()
    return (
        Finding(
            name="probe_against_titration",
            field="do_mg_l",
            says=f"The probe reads {shown(probe, 2)} where the other method gives {shown(titration, 2)} mg/L; within "
            f"{settings.second_method_mg_l:g} is usual.",
            cause="The probe drifted, a bottle took up air, or the two were not in the same water.",
            do="Repeat both side by side. If they stay apart, check the meter as found.",
        ),
    )


def ph_unlikely(ph, settings):
    """Return a finding when the pH is lower or higher than in most rivers."""
    (ph,) = known(ph)
    if math.isnan(ph) or within(ph, settings.ph_low, settings.ph_high):
        return ()
    high = ph > settings.ph_high
    return (
        Finding(
            name="ph_unlikely",
            field="ph",
            says=f"pH {shown(ph, 1)} is {'high' if high else 'low'}: most rivers lie between {settings.ph_low:g} and "
            f"{settings.ph_high:g}.",
            cause="Strong photosynthesis, lime or industrial water, or the electrode."
            if high
            else "Peat, mine or industrial water, or the electrode.",
            do="Check the electrode in a buffer and read again. If it stays, keep it.",
        ),
    )


def position_poor(radius_m, settings):
    """Return a finding when a position is known only within a wide radius. [m]"""
    (radius,) = known(radius_m)
    if not exceeds(radius, settings.position_m):
        return ()
    worst = exceeds(radius, settings.position_worst_m)
    return (
        Finding(
            name="position_poor",
            field="position_radius_m",
            says=f"The position is only known within {shown(radius, 0)} m.",
            cause="Trees, banks or bridges hide the sky, or the phone is allowed an approximate position only.",
            do="Do not take it: mark the place on the map or type it, and allow the precise position."
            if worst
            else "Step into the open and wait a little, or mark the place on the map.",
        ),
    )


def edited_clock(edited_s, clock_off_s, settings):
    """Return findings when a time was changed by hand, or the phone's clock is wrong.

    Parameters
    ----------
    edited_s : float
        Time given less the time the phone noted, either way. [s]
    clock_off_s : float
        The phone's clock less the server's, either way. [s]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    edited, off = (abs(value) for value in known(edited_s, clock_off_s))
    found = []
    if exceeds(edited, settings.clock_s):
        says = f"The time was changed by {_long(edited)}. Both times are kept."
        cause = "The reading was entered later than it was taken, or the time was corrected."
        found.append(Finding("time_edited", "taken_at", says, cause, "Say where the time comes from."))
    if exceeds(off, settings.clock_s):
        says = f"This phone's clock is off by {_long(off)}."
        cause = "The phone does not set its clock from the network, or its time zone is wrong."
        do = "Set the phone to automatic time. Times taken with it can be shifted in the office."
        found.append(Finding("clock_off", "taken_at", says, cause, do))
    return tuple(found)


def _long(seconds):
    return f"{shown(seconds / 60, 0)} minutes" if seconds < 5400 else f"{shown(seconds / 3600, 1)} hours"
