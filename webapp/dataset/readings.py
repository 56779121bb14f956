"""The tables of a dataset that say what was read: readings, and decisions about them."""

from dataclasses import replace

from webapp.dataset.fields import DataTable, from_column, number, text, unit_of, whole
from webapp.dataset.keeping import foreign_of, kept_rows, kept_table
from webapp.dataset.kept import kept
from webapp.dataset.line import rounded_off
from webapp.readings.columns import READINGS
from webapp.readings.quality_words import QUALITIES
from webapp.review.numbers import CORRECTABLE, as_typed

_AS_TYPED = "In the unit beside it, with the decimal mark that was typed."
_TYPED = {
    "pressure_mmhg": f"{_AS_TYPED} A weather report's is still reduced to sea level here, and no longer in the next.",
    "velocity_m_s": f"{_AS_TYPED} A float's is that of the surface here, and the mean in the next.",
    "do_mg_l": f"{_AS_TYPED} Of several raw values, their median.",
}
KINDS = {
    "corrected": "a number was corrected",
    "set_aside": "it is not used",
    "restored": "it is used again",
    "kept": "a reviewer looked and found it good",
    "asked": "a reviewer asked the crew",
    "answered": "the crew answered",
    "drift": "it was corrected for the drift of its meter",
    "drift_undone": "the correction for drift was taken back",
}
STATUSES = {
    "draft": "nobody but its author has decided about it",
    "reviewed": "a reviewer has",
    "approved": "the survey is approved",
}
BRACKETS = {
    "bracketed": "between two passing checks of its meter",
    "drift": "the check after it asks for a correction",
    "not_reportable": "the check after it is too far off",
    "no_check_before": "no check of its meter before it",
    "check_before_failed": "the check before it did not pass",
    "no_check_after": "no check of its meter after it",
    "check_after_failed": "the check after it did not pass",
}
LAYERED = {**CORRECTABLE, "ph": READINGS.column("ph")}
_DERIVED = (
    ("distance_km", "Distance below the outfall", "km", "In the newest plan; negative above the outfall."),
    ("saturation_mg_l", "Saturation", "mg/L", "At the temperature, pressure and conductance measured."),
    ("percent_saturation", "Percent saturation", "%", "At the station's pressure."),
    ("deficit_mg_l", "Deficit", "mg/L", "Saturation less oxygen; negative when supersaturated."),
    ("travel_time_h", "Travel time from the outfall", "h", "With the newest plan and what the day showed; else empty."),
    ("hours_late", "Hours after the parcel", "h", "Negative when the reading came before it."),
    (
        "predicted_do_mg_l",
        "Predicted oxygen",
        "mg/L",
        "Saturation as measured less the deficit of the newest plan with what the day showed.",
    ),
    ("predicted_low_mg_l", "Low end of the band", "mg/L", ""),
    ("predicted_high_mg_l", "High end of the band", "mg/L", ""),
    ("difference_mg_l", "Measured less predicted", "mg/L", ""),
)
# Columns of READINGS whose limits and choices hold for what is kept.
_LIMITED = (
    "position",
    "percent_basis",
    "pressure_source",
    "velocity_method",
    "distance_left_m",
    "latitude",
    "longitude",
    "position_radius_m",
)


def _stored_fields(zone_says):
    """Return the field of each kept column of a reading by its name in the dataset."""
    fields = {one.name: one for one in kept()["reading"].fields.values()}
    for name in _LIMITED:
        column = from_column(READINGS.column(name))
        fields[name] = replace(fields[name], constraints=column.constraints, choices=column.choices)
    for name in ("station_code", "taken_at"):
        fields[name] = replace(fields[name], constraints={"required": True})
    for name in ("taken_at", "received_at"):
        fields[name] = replace(fields[name], says=zone_says)
    return fields


def layers_of(name, stored):
    """Return the fields of one number: as typed, raw, corrected, for oxygen also without drift, and final."""
    column = LAYERED[name]
    unit, title = "[pH]" if name == "ph" else unit_of(column), column.label
    # A percent typed alone gives oxygen beyond what a form takes for mg/L, so oxygen has no limits here.
    limits = {} if name == "do_mg_l" else from_column(column).constraints
    drift = number(
        "do_mg_l_drift_corrected", "Oxygen, corrected for drift", unit, "Empty where the meter's drift was not."
    )
    return (
        text(f"{name}_as_typed", f"{title}, as typed", _TYPED.get(name, _AS_TYPED)),
        text(f"{name}_typed_unit", f"{title}, unit typed in", "UCUM code."),
        replace(stored[f"{name}_raw"], constraints=limits, unit=unit),
        number(f"{name}_corrected", f"{title}, corrected", unit, "Empty where nothing was.", constraints=limits),
        *((drift,) if name == "do_mg_l" else ()),
        number(f"{name}_final", f"{title}, to use", unit, constraints=limits),
    )


def readings_table(lines, zone_says):
    """Return one row per reading, with raw, corrected and final numbers side by side."""
    stored = _stored_fields(zone_says)
    first = ("reading_id", "station_code", "taken_at", "received_at", "author", "plan_version")
    layered = [field for name in LAYERED for field in layers_of(name, stored)]
    used = {*first, *(field.name for field in layered)}
    fields = (
        *(stored[name] for name in first),
        whole("visit_no", "Visit", "Counts the occupations of the station."),
        text("visit_id", "Visit's id", "Empty where nobody opened one."),
        text("replicate_of", "Repeats", "Id of the reading that it repeats."),
        *_JUDGED_FIELDS,
        *layered,
        *(field for name, field in stored.items() if name not in used),
        *(number(name, title, unit, says) for name, title, unit, says in _DERIVED),
    )
    says = (
        "One row for each reading. Raw is what was recorded, corrected what it was corrected to, drift_corrected what "
        "that is without the drift of the meter, final what to use. Computed numbers rest on the final ones, and on "
        "the measured oxygen where do_censor says less_than."
    )
    foreign = {
        **foreign_of("reading"),
        "visit_id": ("visits", "visit_id"),
        "replicate_of": ("readings", "reading_id"),
        "meter_id": ("meters", "meter_id"),
        "check_before": ("meter_checks", "check_id"),
        "check_after": ("meter_checks", "check_id"),
        "drift_event_id": ("corrections", "event_id"),
    }
    return DataTable("readings", "Readings", says, fields, ("reading_id",), [_row(one) for one in lines], foreign)


_JUDGED_FIELDS = (
    text("status", "Status", choices=STATUSES),
    text("reviewed_by", "Reviewed by"),
    text("quality", "Quality", choices=QUALITIES),
    text("reasons", "Reasons", "Plain words, separated by semicolons; empty where there is none: see reasons.csv."),
    text("findings", "Checks that find it odd today", "Separated by semicolons."),
    text("set_aside_reason", "Why it is set aside"),
    text("meter_id", "Meter's id", "Empty where its name is that of no meter in meters.csv."),
    text("bracket", "Between two checks of its meter", choices=BRACKETS),
    text("check_before", "Check before it", "Id of the meter check."),
    text("check_after", "Check after it", "Id of the meter check."),
    text("drift_grade", "Grade of the check after it", "excellent, good, fair, poor or do not report."),
    text("correction_ids", "Corrections", "Ids in corrections.csv, separated by semicolons."),
    text("drift_event_id", "Correction for drift", "Its id in corrections.csv."),
    whole("n", "Raw values it is the median of"),
    number("spread_mg_l", "Spread of the raw values", "mg/L", "Highest less lowest."),
    number(
        "do_uncertainty_mg_l",
        "How far oxygen may be off",
        "mg/L",
        "The largest of the errors of the checks before and after and of how far a repeat may differ, and half the "
        "spread of the raw values, added in quadrature; empty where a check is missing or drift was corrected.",
    ),
    text("do_censor", "Oxygen is", choices={"none": "a number", "less_than": "below the reporting limit"}),
    number("do_reporting_limit_mg_l", "Reporting limit of oxygen", "mg/L", "do_mg_l_final is empty below it."),
    text("do_source", "Oxygen comes from", choices={"read": "the meter's mg/L", "percent": "the meter's percent"}),
)


def _row(line):
    final, row = line.final, dict(line.stored)
    corrected = {event.field for event in final.corrections}
    for name in LAYERED:
        row[f"{name}_as_typed"], row[f"{name}_typed_unit"] = as_typed(line.reading, name)
        row[f"{name}_corrected"] = getattr(final, name) if name in corrected else None
        row[f"{name}_final"] = getattr(final, name)
    if "do_mg_l" in corrected:
        row["do_mg_l_corrected"] = final.before_drift_mg_l
    if final.drift is not None:
        row["do_mg_l_drift_corrected"] = rounded_off(final.do_mg_l)
    row["do_mg_l_final"] = line.final_do_mg_l
    return {
        **row,
        **judged_cells(line),
        **{name: rounded_off(getattr(line.derived, name)) for name, *_ in _DERIVED},
    }


def judged_cells(line):
    """Return what is said of a reading, by column."""
    judged, final = line.judged, line.final
    return {
        "visit_no": judged.visit_no,
        "visit_id": judged.visit_id,
        "replicate_of": judged.repeats_id,
        "status": line.status,
        "reviewed_by": line.reviewer,
        "quality": judged.quality,
        "reasons": ";".join(judged.reasons),
        "findings": ";".join(sorted({one.name for one in judged.findings})),
        "set_aside_reason": final.reason,
        "meter_id": line.meter_id,
        "bracket": judged.bracket.state,
        "check_before": _id(judged.check_before),
        "check_after": _id(judged.check_after),
        "drift_grade": judged.grade,
        "correction_ids": ";".join(event.id for event in final.corrections),
        "drift_event_id": final.drift.id if final.drift is not None else "",
        "n": line.values,
        "spread_mg_l": rounded_off(line.spread_mg_l),
        "do_uncertainty_mg_l": rounded_off(line.uncertainty_mg_l),
        "do_censor": line.censor,
        "do_reporting_limit_mg_l": line.limit_mg_l if line.censor == "less_than" else None,
        "do_source": _do_source(line.reading),
    }


def _id(judged_check):
    return "" if judged_check is None else judged_check.check.id


def _do_source(reading):
    if reading.do_mg_l is None:
        return None
    if any(one.get("do_mg_l") is not None for one in reading.series or ()):
        return "read"
    return "percent" if reading.do_percent is not None and not as_typed(reading, "do_mg_l")[0] else "read"


def corrections_table(events, names):
    """Return everything decided about readings afterwards, in the order it was."""
    rows = kept_rows("reading_event", events, names)
    for row in rows:
        row["unit"] = unit_of(LAYERED[row["field"]]) if row["field"] in LAYERED else ""
    says = "Corrections, drift, readings set aside or used again, and what reviewers said: all, in order."
    made = kept_table("reading_event", "Corrections", says, rows, (text("unit", "Unit", "UCUM code."),))
    return replace(
        made, fields=tuple(replace(one, choices=KINDS) if one.name == "kind" else one for one in made.fields)
    )


def reasons_table(**words):
    """Return what the reasons of readings and of bottles mean; words are those of each, by what they are about."""
    fields = (
        text("about", "About", constraints={"required": True}, choices={name: name for name in words}),
        text("reason", "Reason", constraints={"required": True}),
        text("meaning", "What it means", constraints={"required": True}),
    )
    rows = [
        {"about": about, "reason": key, "meaning": says} for about, some in words.items() for key, says in some.items()
    ]
    says = "What the reasons of readings and bottles mean."
    return DataTable("reasons", "Reasons", says, fields, ("about", "reason"), rows)
