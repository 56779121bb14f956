"""A wide table of readings for people: final numbers, each rounded once."""

from datetime import UTC
from decimal import ROUND_HALF_EVEN, Decimal

from webapp.dataset.fields import DataTable, Field, decimal, moment, number, text, whole, yes_no
from webapp.dataset.readings import BRACKETS, LAYERED
from webapp.readings.columns import READINGS
from webapp.readings.quality_words import QUALITIES

# Name, title, unit, decimals; negative decimals are significant figures.
_NUMBERS = (
    ("distance_km", "Distance below the outfall", "km", 2),
    ("travel_time_h", "Travel time", "h", 1),
    ("hours_late", "Hours after the parcel", "h", 1),
    ("depth_m", "Depth", "m", 2),
    ("water_temp_c", "Water temperature", "Cel", 1),
    ("do_mg_l", "Oxygen", "mg/L", 1),
    ("pressure_mmhg", "Air pressure at the station", "mm[Hg]", 0),
    ("conductance_us_cm", "Specific conductance", "uS/cm", -3),
    ("ph", "pH", "[pH]", 1),
    ("saturation_mg_l", "Saturation", "mg/L", 1),
    ("percent_saturation", "Percent saturation", "%", 0),
    ("deficit_mg_l", "Deficit", "mg/L", 1),
    ("predicted_do_mg_l", "Predicted oxygen", "mg/L", 1),
    ("difference_mg_l", "Measured less predicted", "mg/L", 1),
)
_OF_THE_VISIT = (
    number("section_spread_mg_l", "Spread across the section", "mg/L", "Of the visit; highest less lowest."),
    yes_no("mixed", "Mixed across the section", "Of the visit; empty where too little is known."),
    yes_no("stratified", "Layered", "Of the visit; empty where too little is known."),
    number("replicate_difference_mg_l", "Differs from what it repeats by", "mg/L"),
    number(
        "mean_solar_time_h",
        "Mean solar time",
        "h",
        "From the longitude of the reading, else of its station's access point; without the equation of time.",
    ),
    text("bracket", "Between two checks of its meter", choices=BRACKETS),
    text("platform", "How they read"),
)


def summary_table(lines, zone_says, longitudes):
    """Return a wide table for people: one row per reading, each number rounded once; longitudes are by station."""
    fields = (
        text("reading_id", "Reading's id", constraints={"required": True}),
        text("station_code", "Station"),
        whole("visit_no", "Visit"),
        moment("observed_at", "Time at the water", zone_says),
        text("position", "Position across the river", choices=READINGS.column("position").choices),
        *(number(name, title, unit) for name, title, unit, _ in _NUMBERS),
        Field("do_censor", "Oxygen is", choices={"none": "a number", "less_than": "below the reporting limit"}),
        number("do_reporting_limit_mg_l", "Reporting limit of oxygen", "mg/L"),
        *_OF_THE_VISIT,
        text("quality", "Quality", choices=QUALITIES),
        text("reasons", "Reasons", "Separated by semicolons: see reasons.csv."),
        text("author", "Who recorded it"),
        text("note", "Note"),
    )
    says = (
        "For people: final numbers, rounded once, half to even, to what can be measured: oxygen 0.1 mg/L, percent 1, "
        "temperature 0.1 °C, pressure 1 mmHg, pH 0.1, conductance 3 significant figures, distance 0.01 km, travel time "
        "0.1 h; differences between readings, and solar time, to 0.01. Deficit and difference are computed before "
        "rounding. Readings set aside are here too: see quality."
    )
    foreign = {"reading_id": ("readings", "reading_id"), "station_code": ("stations", "code")}
    finals = {one.reading.id: one.final for one in lines}
    rows = [_row(one, finals, longitudes.get(one.final.station_code)) for one in lines]
    return DataTable("station_summary", "Readings for people", says, fields, ("reading_id",), rows, foreign)


def _row(line, finals, longitude):
    row = {
        "reading_id": line.reading.id,
        "station_code": line.final.station_code,
        "visit_no": line.judged.visit_no,
        "observed_at": line.final.taken_at,
        "position": line.reading.position,
        "do_censor": line.censor,
        "do_reporting_limit_mg_l": line.limit_mg_l if line.censor == "less_than" else None,
        "quality": line.judged.quality,
        "reasons": ";".join(line.judged.reasons),
        "author": line.stored["author"],
        "note": line.reading.note,
        "bracket": line.judged.bracket.state,
        "mean_solar_time_h": _solar_time_h(line.final, longitude),
        **_of_the_visit(line, finals),
    }
    for name, _, _, digits in _NUMBERS:
        source = line.final if name in LAYERED else line.derived
        row[name] = rounded(getattr(source, name), digits)
    if line.censor == "less_than":
        row["do_mg_l"] = None
    return row


def _of_the_visit(line, finals):
    judged, final = line.judged, line.final
    repeated = finals.get(judged.repeats_id)
    both = repeated is not None and None not in (repeated.do_mg_l, final.do_mg_l)
    visit = judged.occasion.visit
    return {
        "section_spread_mg_l": rounded(judged.section.do_spread, 2) if judged.section.points > 1 else None,
        "mixed": judged.section.mixed,
        "stratified": judged.layers.stratified,
        "replicate_difference_mg_l": rounded(final.do_mg_l - repeated.do_mg_l, 2) if both else None,
        "platform": visit.facts.get("platform") if visit is not None else None,
    }


def _solar_time_h(final, longitude):
    if final.longitude is not None:
        longitude = final.longitude
    if longitude is None:
        return None
    utc = final.taken_at.astimezone(UTC)
    return rounded((utc.hour + utc.minute / 60 + utc.second / 3600 + longitude / 15) % 24, 2)


def rounded(value, digits):
    """Return a number rounded half to even to so many decimals, or to significant figures where digits is negative."""
    if value is None or not (digits_of := decimal(value)):
        return None
    exact = Decimal(digits_of)
    places = digits if digits >= 0 else -digits - 1 - exact.adjusted()
    result = exact.quantize(Decimal(1).scaleb(-places), ROUND_HALF_EVEN)
    return abs(result) if result == 0 else result
