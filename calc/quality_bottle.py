"""Checks on bottles and laboratory results: hold times, receipt, replicates, and the controls of the BOD test."""

import math
from dataclasses import dataclass

from calc.errors import CalcError
from calc.findings import Finding, exceeds, known, reaches, shown, within

ANALYSES = ("bod5", "cbod5", "ubod", "nh3_n", "chlorophyll_a", "winkler_do", "conductance_lab")

_BOD = ("bod5", "cbod5", "ubod")


@dataclass(frozen=True)
class Hold:
    """How long a bottle waited.

    hours, limit_h : waited, and allowed to wait. [h]
    state : "ok", "soon" (most of the limit, or the project's own limit, is used up) or "past"; empty where it can't be
    told.
    """

    hours: float
    limit_h: float
    state: str
    says: str


def hold(collected_h, started_h, analysis, settings):
    """Return how long a bottle waited, or has waited until now, against what its analysis allows.

    Parameters
    ----------
    collected_h : float
        When it was filled; for a composite, when compositing ended. [h, any common axis]
    started_h : float
        When the analysis began (set up, fixed bottle titrated, filtered), or the time now. [h]
    analysis : str
        One of ANALYSES.
    settings : Settings

    Returns
    -------
    Hold

    Raises
    ------
    CalcError
        If the analysis is another.
    """
    if analysis not in ANALYSES:
        raise CalcError(f"analysis must be one of {', '.join(ANALYSES)}, got {analysis!r}")
    collected, started = known(collected_h, started_h)
    hours, limit = started - collected, _hold_limit(analysis, settings)
    if math.isnan(hours):
        return Hold(hours, limit, "", "A time is missing.")
    if exceeds(0, hours):
        return Hold(hours, limit, "", "The analysis began before the bottle was filled: one of the times is wrong.")
    waited = f"{shown(hours, 1)} h of {limit:g} h"
    if exceeds(hours, limit):
        return Hold(hours, limit, "past", f"Past its hold time: {waited}.")
    if analysis in _BOD and exceeds(hours, settings.bod_caution_h):
        return Hold(hours, limit, "soon", f"Past the project's own {settings.bod_caution_h:g} h: {waited}.")
    if reaches(hours, settings.hold_soon_percent / 100 * limit):
        return Hold(hours, limit, "soon", f"Soon past its hold time: {waited}.")
    return Hold(hours, limit, "ok", f"Within its hold time: {waited}.")


def _hold_limit(analysis, settings):
    return {
        "nh3_n": settings.ammonia_h,
        "chlorophyll_a": settings.chlorophyll_h,
        "winkler_do": settings.winkler_h,
        "conductance_lab": settings.conductance_lab_h,
    }.get(analysis, settings.bod_h)


def past_hold_time(hold):
    """Return a finding when a bottle waited longer than its analysis allows; none for None."""
    if hold is None or hold.state != "past":
        return ()
    return (
        Finding(
            name="past_hold_time",
            field="started_at",
            says=hold.says,
            cause="The bottle came late, waited at the laboratory, or a time is mistyped.",
            do="Check both times. The result is kept and delivered with this note.",
        ),
    )


def receipt_warm(receipt_c, settings):
    """Return a finding when a bottle reached the laboratory warm, or frozen. [°C]"""
    (receipt,) = known(receipt_c)
    if exceeds(receipt, settings.receipt_c):
        name, says = "warm_on_receipt", f"{shown(receipt, 1)} °C on receipt: warmer than {settings.receipt_c:g} °C."
        cause = "Too little ice, a long way, or a bottle packed on top."
    elif exceeds(settings.receipt_frozen_c, receipt):
        name, says = "frozen_on_receipt", f"{shown(receipt, 1)} °C on receipt: the bottle may have frozen."
        cause = "Dry ice, frozen packs against the glass, or frost on the way."
    else:
        return ()
    return (Finding(name, "receipt_c", says, cause, "Note it with the result, and tell the crew for the next day."),)


def not_on_ice(minutes, settings):
    """Return a finding when a bottle was put on ice late. [min since it was filled]"""
    (waited,) = known(minutes)
    if not exceeds(waited, settings.on_ice_min):
        return ()
    return (
        Finding(
            name="not_on_ice",
            field="on_ice_at",
            says=f"{shown(waited, 0)} minutes until it was on ice; {settings.on_ice_min:g} are allowed.",
            cause="The cooler was left in the car, or the time was entered later.",
            do="Put it on ice now, in the dark, and note why it was late.",
        ),
    )


def bottle_without_reading(minutes, settings):
    """Return a finding when the nearest oxygen reading at the bottle's point is too long before or after it. [min]"""
    (apart,) = known(minutes)
    if not exceeds(abs(apart), settings.bottle_reading_min):
        return ()
    return (
        Finding(
            name="bottle_without_reading",
            field="collected_at",
            says=f"The nearest oxygen reading at this point is {shown(abs(apart), 0)} minutes away.",
            cause="The reading was skipped, taken at another point, or a time is mistyped.",
            do="Read oxygen and temperature here now.",
        ),
    )


def bottle_replicate(first, second, reporting_limit, settings):
    """Return a finding when a bottle and its replicate differ by more than they should.

    Parameters
    ----------
    first, second : float
        The two results. [one unit for all three]
    reporting_limit : float
        Of the laboratory. Low results may instead differ by a multiple of it.
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    first, second, limit = known(first, second, reporting_limit)
    mean, apart = (first + second) / 2, abs(first - second)
    percent = 100 * apart / mean if mean > 0 else math.nan
    if not exceeds(percent, settings.bottle_rpd_percent):
        return ()
    low = exceeds(settings.bottle_low_below_multiple * limit, mean)
    if low and reaches(settings.bottle_low_multiple * limit, apart):
        return ()
    return (
        Finding(
            name="bottle_replicate",
            field="result",
            says=f"The replicates, {first:g} and {second:g}, differ by {shown(percent, 0)} % of their mean; up to "
            f"{settings.bottle_rpd_percent:g} % is usual.",
            cause="The water was not the same, a bottle was mixed up, or a dilution was wrong.",
            do="Ask the laboratory to look at both. If they stay, keep both and say so.",
        ),
    )


def bottle_counts(bottles, replicates, blanks, settings):
    """Return findings when a survey holds too few bottle replicates or blanks for its bottles."""
    bottles, replicates, blanks = known(bottles, replicates, blanks)
    if not bottles > 0:
        return ()
    found = []
    for name, count, percent in (
        ("replicates", replicates, settings.bottle_replicates_percent),
        ("blanks", blanks, settings.bottle_blanks_percent),
    ):
        wanted = percent / 100 * bottles
        if exceeds(wanted, count):
            says = f"{_many(count, name)} for {_many(bottles, 'bottles')}; {percent:g} % are wanted."
            cause = "They were not planned, or not yet collected."
            found.append(
                Finding(f"too_few_{name}", "bottles", says, cause, "Collect the missing ones on the next run.")
            )
    return tuple(found)


def _many(count, name):
    return f"1 {name.removesuffix('s')}" if count == 1 else f"{shown(count, 0)} {name}"


def blank(depletion_mg_l, settings):
    """Return a finding when the dilution water of a BOD test used up oxygen by itself. [mg/L]"""
    (used,) = known(depletion_mg_l)
    if not exceeds(used, settings.blank_mg_l):
        return ()
    says = f"The blank used up {shown(used, 2)} mg/L; up to {settings.blank_mg_l:g} passes."
    return (_control("blank_mg_l", says, "Dilution water or glass that is not clean."),)


def gga(result_mg_l, settings):
    """Return a finding when the glucose-glutamic acid check of a BOD test is off. [mg/L]"""
    (result,) = known(result_mg_l)
    low, high = settings.gga_mg_l - settings.gga_tolerance_mg_l, settings.gga_mg_l + settings.gga_tolerance_mg_l
    if math.isnan(result) or within(result, low, high):
        return ()
    says = f"The glucose-glutamic acid check gave {shown(result, 1)} mg/L; {low:g} to {high:g} passes."
    return (_control("gga_mg_l", says, "Seed that is too weak or too strong, or the solution was not made right."),)


def _control(field, says, cause):
    do = "Ask the laboratory what it did. The results of this batch are kept and delivered with this note."
    return Finding("lab_control_failed", field, says, cause, do)


def depletion(initial_mg_l, final_mg_l, settings):
    """Return findings when a bottle of a BOD test used up too little oxygen, or left too little, to count.

    Parameters
    ----------
    initial_mg_l, final_mg_l : float
        Oxygen in the diluted bottle at set-up and when read. [mg/L]
    settings : Settings

    Returns
    -------
    tuple of Finding
    """
    initial, final = known(initial_mg_l, final_mg_l)
    used = initial - final
    found = []
    if exceeds(settings.depletion_mg_l, used):
        says = f"The bottle used up {shown(used, 2)} mg/L; at least {settings.depletion_mg_l:g} is needed."
        cause = "The sample was diluted too much, is toxic or chlorinated, or had no seed."
        found.append(Finding("depletion_low", "final_mg_l", says, cause, "Use a stronger dilution of this sample."))
    if exceeds(settings.residual_mg_l, final):
        says = f"{shown(final, 2)} mg/L was left in the bottle; at least {settings.residual_mg_l:g} is needed."
        cause = "The sample was diluted too little: oxygen ran short."
        found.append(Finding("residual_low", "final_mg_l", says, cause, "Use a weaker dilution of this sample."))
    return tuple(found)


def incubation(days, temp_c, settings):
    """Return findings when a BOD test was read too early or too late, or kept too cold or too warm. [days, °C]"""
    days, temp = known(days, temp_c)
    found = []
    if exceeds(24 * abs(days - settings.incubation_days), settings.incubation_tolerance_h):
        says = (
            f"Read after {shown(days, 2)} days; {settings.incubation_days:g} days, give or take "
            f"{settings.incubation_tolerance_h:g} h, is the method."
        )
        cause = "The bottles were read on another day, or a time is mistyped."
        found.append(Finding("incubation_time", "read_at", says, cause, "Check both times, and note it."))
    if exceeds(abs(temp - settings.incubation_c), settings.incubation_tolerance_c):
        low, high = (settings.incubation_c + sign * settings.incubation_tolerance_c for sign in (-1, 1))
        says = f"Kept at {shown(temp, 1)} °C; {low:g} °C to {high:g} °C is the method."
        cause = "The incubator was set wrong, was open for long, or failed."
        found.append(Finding("incubation_temperature", "incubation_c", says, cause, "Note it with the results."))
    return tuple(found)
