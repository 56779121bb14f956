"""The quality of a reading in plain words, and the reasons for it."""

import uuid

QUALITIES = {
    "good": "reviewed and found good",
    "not_checked": "nobody has reviewed it; no check found it odd",
    "questionable": "a check found it odd, and it was kept",
    "bad": "set aside: kept in the record, not used",
    "missing": "no oxygen was recorded",
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
    "conductance_high": "out_of_range",
    "supersaturation": "diel",
    "air_signature": "in_air",
    "replicate_spread": "replicate_differs",
    "replicate_temperature": "replicate_differs",
    "replicate_conductance": "replicate_differs",
    "late_for_parcel": "late_for_parcel",
    "early_for_parcel": "early_for_parcel",
}
_OF_PRESSURE = {"standard": {"pressure_assumed"}, "weather": {"pressure_sea_level_converted"}}


def findings_of(reading):
    """Return the names of the checks that found a reading odd when it was recorded."""
    return tuple(sorted({str(one.get("name")) for one in reading.kept_findings or () if one.get("name")}))


def from_paper(reading):
    """Return whether a reading was imported: the ids of those are made from their content (UUID version 5)."""
    try:
        return uuid.UUID(reading.id).version == 5
    except ValueError:
        return False


def reasons_of(line):
    """Return (quality, reasons) of a reading of the dataset."""
    final = line.final
    reasons = {REASON_OF.get(name, "other") for name in line.findings}
    if "pressure_mmhg" not in {event.field for event in final.corrections}:
        reasons |= _OF_PRESSURE.get(line.reading.pressure_source, set())
    if line.censor == "less_than":
        reasons.add("below_limit")
    if from_paper(line.reading):
        reasons.add("transcribed_from_paper")
    if final.set_aside:
        quality = "bad"
    elif final.do_mg_l is None:
        quality = "missing"
    else:
        quality = "questionable" if line.findings else "not_checked"
    return quality, sorted(reasons)
