"""The tables of a dataset that say what was read: readings, decisions about them, and a wide table for people."""

from decimal import ROUND_HALF_EVEN, Decimal

from webapp.dataset.fields import DataTable, Field, decimal, from_column, moment, number, text, unit_of, whole
from webapp.dataset.reasons import QUALITIES, reasons_of
from webapp.readings.columns import READINGS
from webapp.review.numbers import CORRECTABLE, as_typed

_AS_TYPED = "In the unit beside it, with the decimal mark that was typed."
_TYPED = {
    "pressure_mmhg": f"{_AS_TYPED} A weather report's is still reduced to sea level here, and no longer in the next.",
    "velocity_m_s": f"{_AS_TYPED} A float's is that of the surface here, and the mean in the next.",
}
_KINDS = {"corrected": "a number was corrected", "set_aside": "it is not used", "restored": "it is used again"}
_WORDS = ("position", "percent_basis", "pressure_source", "velocity_method", "meter", "replicate", "note")
_PLACE = ("latitude", "longitude", "position_radius_m")
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


def layers_of(name):
    """Return the fields of one number: as typed, raw, corrected, final."""
    column = CORRECTABLE[name]
    unit, title = unit_of(column), column.label
    # A percent typed alone gives oxygen beyond what a form takes for mg/L, so oxygen has no limits here.
    limits = {} if name == "do_mg_l" else from_column(column).constraints
    return (
        text(f"{name}_as_typed", f"{title}, as typed", _TYPED.get(name, _AS_TYPED)),
        text(f"{name}_typed_unit", f"{title}, unit typed in", "UCUM code."),
        number(f"{name}_raw", f"{title}, as recorded", unit, constraints=limits),
        number(f"{name}_corrected", f"{title}, corrected", unit, "Empty where nothing was.", constraints=limits),
        number(f"{name}_final", f"{title}, to use", unit, constraints=limits),
    )


def readings_table(lines, zone_says):
    """Return one row per reading, with raw, corrected and final numbers side by side."""
    fields = (
        text("reading_id", "Reading's id", "The same in every export.", constraints={"required": True}),
        text("station_code", "Station", constraints={"required": True}),
        moment("taken_at", "Time at the water", zone_says, constraints={"required": True}),
        moment("received_at", "Stored on the server", zone_says),
        text("author", "Who recorded it"),
        whole("plan_version", "Plan version at the time"),
        text("quality", "Quality", choices=QUALITIES),
        text("reasons", "Reasons", "Plain words, separated by semicolons; empty where there is none."),
        text("findings", "Checks that found it odd", "Separated by semicolons."),
        text("set_aside_reason", "Why it is set aside"),
        text("do_censor", "Oxygen is", choices={"none": "a number", "less_than": "below the reporting limit"}),
        number("do_reporting_limit_mg_l", "Reporting limit of oxygen", "mg/L", "do_mg_l_final is empty below it."),
        text("do_source", "Oxygen comes from", choices={"read": "the meter's mg/L", "percent": "the meter's percent"}),
        *(field for name in CORRECTABLE for field in layers_of(name)),
        *(from_column(READINGS.column(key)) for key in (*_WORDS, *_PLACE)),
        *(number(name, title, unit, says) for name, title, unit, says in _DERIVED),
    )
    says = (
        "One row for each reading. Raw is what was recorded, corrected what it was corrected to, final what to use. "
        "Computed numbers rest on the final ones, and on the measured oxygen where do_censor says less_than."
    )
    foreign = {"station_code": ("stations", "code"), "plan_version": ("plan_versions", "plan_version")}
    return DataTable("readings", "Readings", says, fields, ("reading_id",), [_row(one) for one in lines], foreign)


def _row(line):
    reading, final = line.reading, line.final
    quality, reasons = reasons_of(line)
    row = {
        "reading_id": reading.id,
        "station_code": final.station_code,
        "taken_at": final.taken_at,
        "received_at": reading.received_at,
        "author": reading.author.name,
        "plan_version": line.plan_number,
        "quality": quality,
        "reasons": ";".join(reasons),
        "findings": ";".join(line.findings),
        "set_aside_reason": final.reason,
        "do_censor": line.censor,
        "do_reporting_limit_mg_l": line.limit_mg_l if line.censor == "less_than" else None,
        "do_source": _do_source(reading),
    }
    corrected = {event.field for event in final.corrections}
    for name in CORRECTABLE:
        row[f"{name}_as_typed"], row[f"{name}_typed_unit"] = as_typed(reading, name)
        row[f"{name}_raw"] = final.raw[name]
        row[f"{name}_corrected"] = getattr(final, name) if name in corrected else None
        row[f"{name}_final"] = getattr(final, name)
    if line.censor == "less_than":
        row["do_mg_l_final"] = None
    row |= {key: getattr(reading, key) for key in _WORDS} | {key: getattr(final, key) for key in _PLACE}
    return row | {name: _rounded(getattr(line.derived, name)) for name, *_ in _DERIVED}


def _do_source(reading):
    if reading.do_mg_l is None:
        return None
    return "percent" if reading.do_percent is not None and not as_typed(reading, "do_mg_l")[0] else "read"


def _rounded(value):
    # Four decimals are far more than was measured, and the same on every machine.
    return None if value is None else round(value, 4)


def corrections_table(lines, zone_says):
    """Return everything decided about readings afterwards, in the order it was."""
    fields = (
        text("event_id", "Decision's id", constraints={"required": True}),
        text("reading_id", "Reading's id", constraints={"required": True}),
        text("kind", "What was decided", choices=_KINDS),
        text("field", "Number corrected"),
        number("old_value", "It was"),
        number("new_value", "It became", says="Empty where the number was taken away."),
        text("unit", "Unit", "UCUM code."),
        text("reason", "Why", constraints={"required": True}),
        text("made_by", "Who"),
        moment("made_at", "When", zone_says),
    )
    events = [(event.made_at, event.id, event) for line in lines for event in line.reading.events]
    rows = [
        {
            "event_id": event.id,
            "reading_id": event.reading_id,
            "kind": event.kind,
            "field": event.field,
            "old_value": event.old_value,
            "new_value": event.new_value,
            "unit": unit_of(CORRECTABLE[event.field]) if event.field in CORRECTABLE else "",
            "reason": event.reason,
            "made_by": event.made_by.name,
            "made_at": event.made_at,
        }
        for *_, event in sorted(events, key=lambda one: one[:2])
    ]
    says = "Corrections, and readings set aside or used again: all of them, in the order they were made."
    foreign = {"reading_id": ("readings", "reading_id")}
    return DataTable("corrections", "Corrections", says, fields, ("event_id",), rows, foreign)


# Name, title, unit, decimals; negative decimals are significant figures.
_SUMMARY = (
    ("distance_km", "Distance below the outfall", "km", 2),
    ("travel_time_h", "Travel time", "h", 1),
    ("hours_late", "Hours after the parcel", "h", 1),
    ("depth_m", "Depth", "m", 2),
    ("water_temp_c", "Water temperature", "Cel", 1),
    ("do_mg_l", "Oxygen", "mg/L", 1),
    ("pressure_mmhg", "Air pressure at the station", "mm[Hg]", 0),
    ("conductance_us_cm", "Specific conductance", "uS/cm", -3),
    ("saturation_mg_l", "Saturation", "mg/L", 1),
    ("percent_saturation", "Percent saturation", "%", 0),
    ("deficit_mg_l", "Deficit", "mg/L", 1),
    ("predicted_do_mg_l", "Predicted oxygen", "mg/L", 1),
    ("difference_mg_l", "Measured less predicted", "mg/L", 1),
)


def summary_table(lines, zone_says):
    """Return a wide table for people: one row per reading, each number rounded once."""
    fields = (
        text("reading_id", "Reading's id", constraints={"required": True}),
        text("station_code", "Station"),
        moment("observed_at", "Time at the water", zone_says),
        text("position", "Position across the river", choices=READINGS.column("position").choices),
        *(number(name, title, unit) for name, title, unit, _ in _SUMMARY),
        Field("do_censor", "Oxygen is", choices={"none": "a number", "less_than": "below the reporting limit"}),
        number("do_reporting_limit_mg_l", "Reporting limit of oxygen", "mg/L"),
        text("quality", "Quality", choices=QUALITIES),
        text("reasons", "Reasons"),
        text("author", "Who recorded it"),
        text("note", "Note"),
    )
    says = (
        "For people: final numbers, rounded once, half to even, to what can be measured: oxygen 0.1 mg/L, percent 1, "
        "temperature 0.1 °C, pressure 1 mmHg, conductance 3 significant figures, distance 0.01 km, travel time 0.1 h. "
        "Deficit and difference are computed before rounding. Readings set aside are here too: see quality."
    )
    foreign = {"reading_id": ("readings", "reading_id"), "station_code": ("stations", "code")}
    rows = [_summary_row(one) for one in lines]
    return DataTable("station_summary", "Readings for people", says, fields, ("reading_id",), rows, foreign)


def _summary_row(line):
    quality, reasons = reasons_of(line)
    row = {
        "reading_id": line.reading.id,
        "station_code": line.final.station_code,
        "observed_at": line.final.taken_at,
        "position": line.reading.position,
        "do_censor": line.censor,
        "do_reporting_limit_mg_l": line.limit_mg_l if line.censor == "less_than" else None,
        "quality": quality,
        "reasons": ";".join(reasons),
        "author": line.reading.author.name,
        "note": line.reading.note,
    }
    for name, _, _, digits in _SUMMARY:
        source = line.final if name in CORRECTABLE else line.derived
        row[name] = rounded(getattr(source, name), digits)
    if line.censor == "less_than":
        row["do_mg_l"] = None
    return row


def rounded(value, digits):
    """Return a number rounded half to even to so many decimals, or to significant figures where digits is negative."""
    if value is None:
        return None
    exact = Decimal(decimal(value) or "0")
    places = digits if digits >= 0 else -digits - 1 - exact.adjusted()
    result = exact.quantize(Decimal(1).scaleb(-places), ROUND_HALF_EVEN)
    return abs(result) if result == 0 else result
