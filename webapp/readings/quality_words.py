"""The quality of a reading in plain words, and the reasons for it."""

import uuid

QUALITIES = {
    "good": "a reviewer looked and found it good",
    "not_checked": "nothing is odd, and no reviewer has looked",
    "questionable": "something is odd or not shown: see the reasons",
    "bad": "set aside, or not to be reported: kept in the record, not used",
    "missing": "no oxygen was recorded",
}
REASONS = {
    "not_reportable": "the meter check after it is too far off for it to be reported",
    "drift_uncorrected": "the meter drifted, and nobody corrected it",
    "in_air": "the probe may have been in the air",
    "out_of_range": "a value is unlikely",
    "step": "it differs from its neighbours or the prediction by more than usual",
    "replicate_differs": "a repeat differs by more than usual",
    "unstable": "the values had not settled",
    "not_bracketed": "it does not lie between two passing meter checks",
    "other": "another check found it odd",
    "not_mixed": "the water is not mixed across the section",
    "stratified": "the water is layered",
    "diel": "the time of day may explain it",
    "late_for_parcel": "late for the parcel",
    "early_for_parcel": "early for the parcel",
    "position_poor": "the position is rough",
    "drift_corrected": "corrected for the drift of the meter",
    "below_limit": "below the reporting limit",
    "pressure_assumed": "no air pressure was read: standard for the elevation",
    "pressure_sea_level_converted": "air pressure from a weather report, converted",
    "salinity_ignored": "saltier than fresh water, and no conductance was read",
    "transcribed_from_paper": "typed from paper",
}
# What a check is called in the code, and the reason it gives here. Any other finding is "other".
REASON_OF = {
    "step_against_neighbour": "step",
    "step_against_prediction": "step",
    "temperature_step": "step",
    "conductance_step": "step",
    "oxygen_unlikely": "out_of_range",
    "temperature_unlikely": "out_of_range",
    "depth_unlikely": "out_of_range",
    "velocity_unlikely": "out_of_range",
    "ph_unlikely": "out_of_range",
    "conductance_high": "out_of_range",
    "supersaturation": "diel",
    "snapshot_long": "diel",
    "air_signature": "in_air",
    "replicate_spread": "replicate_differs",
    "replicate_temperature": "replicate_differs",
    "replicate_conductance": "replicate_differs",
} | {name: name for name in REASONS}
# What a reviewer's word does not mend.
STANDING = ("not_reportable", "drift_uncorrected", "not_bracketed")
# What says where a number comes from, and nothing against it.
TELLING = (
    "drift_corrected",
    "below_limit",
    "pressure_assumed",
    "pressure_sea_level_converted",
    "transcribed_from_paper",
)
# How much each reason wants a look; the worst of a reading counts most.
WEIGHTS = {
    "not_reportable": 100,
    "drift_uncorrected": 80,
    "in_air": 75,
    "out_of_range": 70,
    "step": 70,
    "replicate_differs": 60,
    "unstable": 55,
    "not_bracketed": 50,
    "other": 40,
    "not_mixed": 30,
    "stratified": 30,
    "diel": 25,
    "late_for_parcel": 20,
    "early_for_parcel": 20,
    "position_poor": 10,
    "salinity_ignored": 10,
}
ANSWERED_WEIGHT, NOBODY_LOOKED, WAITS_FOR_THE_CREW = 90, 2, 1
_OF_PRESSURE = {"standard": {"pressure_assumed"}, "weather": {"pressure_sea_level_converted"}}


def from_paper(reading):
    """Return whether a reading was imported: the ids of those are made from their content (UUID version 5)."""
    if reading.id[14:15] != "5":  # where a UUID has its version: parsing each id of a survey takes long
        return False
    try:
        return uuid.UUID(reading.id).version == 5
    except ValueError:
        return False


def reasons_of(reading, now, names, limit_mg_l):
    """Return the reasons of a Reading, in the order of REASONS; now is it as it stands, names those of its findings."""
    reasons = {REASON_OF.get(name, "other") for name in names}
    if now.drift is not None:
        reasons = (reasons - {"drift_uncorrected"}) | {"drift_corrected"}
    if now.stable is False and not now.series:  # raw values are judged anew
        reasons.add("unstable")
    if all(event.field != "pressure_mmhg" for event in now.corrections):
        reasons |= _OF_PRESSURE.get(reading.pressure_source, set())
    if now.do_mg_l is not None and now.do_mg_l < limit_mg_l:
        reasons.add("below_limit")
    if from_paper(reading):
        reasons.add("transcribed_from_paper")
    return tuple(reason for reason in REASONS if reason in reasons)


def quality_of(now, reasons):
    """Return the quality of a FinalReading with these reasons."""
    if now.set_aside:
        return "bad"
    if now.do_mg_l is None:
        return "missing"
    if "not_reportable" in reasons:
        return "bad"
    kept = now.review == "kept"
    odd = [reason for reason in reasons if reason not in TELLING and not (kept and reason not in STANDING)]
    if odd:
        return "questionable"
    return "good" if kept else "not_checked"


def severity_of(now, reasons):
    """Return how much a FinalReading wants a look, 0 where it wants none."""
    if now.review == "asked":
        return WAITS_FOR_THE_CREW
    if now.review == "answered":
        return ANSWERED_WEIGHT
    kept = now.review == "kept"
    if now.set_aside and kept:
        return 0
    open_ones = [reason for reason in reasons if not kept or reason in STANDING[:2]]
    weights = sorted((WEIGHTS.get(reason, 0) for reason in open_ones), reverse=True)
    # The worst reason decides; each further one moves it up among its likes.
    found = sum(weight / 10**place for place, weight in enumerate(weights[:3]))
    return found + (0 if kept else NOBODY_LOOKED)
