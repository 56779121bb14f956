"""The reading form: what a crew typed, into a NewReading or a message beside each field."""

import uuid

from webapp import answers
from webapp.forms import Fields
from webapp.readings.columns import (
    PERCENT_BASES,
    POSITIONS,
    PRESSURE_UNITS,
    READINGS,
    VELOCITY_METHODS,
)
from webapp.readings.new import NewReading
from webapp.readings.pressure import pressure_of
from webapp.readings.values import LONGEST_SOAK_S, BadValues, read_values

# Beyond what can be measured, but a slip that is worth an offer: °F in the °C box, percent in the mg/L box.
WIDE = {"do_mg_l": 400.0, "water_temp_c": 113.0}
# What the form asks for under each of its folds, by the fold's name, and what opens it once it is filled in.
FOLDS = {
    "timed": ("values", "soak_s", "unstable_reason"),
    "point": ("position", "distance_left_m", "sensor_depth_m"),
    "more": (
        "do_percent",
        "percent_basis",
        "conductance_us_cm",
        "ph",
        "pressure",
        "pressure_unit",
        "pressure_source",
        "velocity_m_s",
        "velocity_method",
        "float_distance",
        "float_time_s",
        "meter",
        "meter_other",
        "replicate",
        "note",
        "latitude",
        "longitude",
        "position_radius_m",
    ),
}
OPENS = {"timed": ("values",), "point": (), "more": ("do_percent", "note", "velocity_m_s")}
# What a link to the form of the next point or of a repeat may set: never a measured value.
GIVEN = ("position", "distance_left_m", "sensor_depth_m", "meter", "replicate")
UNSTABLE = "unstable"
WEATHER = "a weather value"
# The names that calc.quality uses for two of the fields.
FIELD_OF = {"do_percent_meter": "do_percent", "pressure_value": "pressure"}


def parse_reading(source, show, station_code, now):
    """Return (NewReading, errors); the reading is None where the errors leave no numbers to check."""
    fields = Fields(source, show)
    otherwise = fields.holds("do_percent") or fields.holds("values")
    oxygen = _measured(fields, "do_mg_l", "oxygen", required=not otherwise)
    series = _series(fields, oxygen)
    new = NewReading(
        id=fields.uuid("submission_id"),
        station_code=station_code,
        taken_at=fields.past_time("taken_at", "time of the reading", now),
        do_mg_l=series[-1]["do_mg_l"] if series else oxygen,
        series=series,
        soak_s=fields.number("soak_s", "seconds in the water", 0, LONGEST_SOAK_S, "plain", False),
        water_temp_c=_measured(fields, "water_temp_c", "water temperature", required=True),
        **_velocity(fields),
        **{name: _measured(fields, name, label) for name, label in _PLAIN},
        **pressure_of(fields),
        **_words(fields),
        entered=fields.entered,
    )
    if new.sensor_depth_m is not None and new.depth_m is not None and new.sensor_depth_m > new.depth_m:
        fields.refuse("sensor_depth_m", "The sensor would be under the bed. Check this and the depth of the water.")
    oxygen = new.do_mg_l if new.do_mg_l is not None else new.do_percent  # none at all is a reading too: 0 mg/L
    usable = set(fields.errors) <= set(WIDE) and None not in (new.water_temp_c, oxygen)
    return (new if usable else None), fields.errors


def fresh_form(show, last, now, meters=(), given=None):
    """Return the texts of a fresh form: the time, and what a crew sets once a day, as in their last reading.

    meters are those of the survey, given what the link to the form says of the next point.
    """
    pressure = (last.entered.get("pressure") or {}) if last else {}
    return {
        "submission_id": str(uuid.uuid4()),
        "taken_at": show.typed_time(now),
        "units": show.unit_system,
        "meter": _usual_meter(last, meters),
        "pressure_source": last.pressure_source if last else "standard",
        "pressure_unit": pressure.get("unit") or ("[in_i'Hg]" if show.unit_system == "us" else "mm[Hg]"),
        **{name: text[:60] for name in GIVEN if (text := (given or {}).get(name))},
    }


def meter_choices(meters, form):
    """Return (name, words) of the meters to choose from: those in service, and whatever the form names already."""
    if not meters:
        return []
    names = [one.name for one in meters if not one.out_of_service]
    named = form.get("meter") or ""
    if named and named not in names:
        names.append(named)
    return [("", "Not noted"), *((one, one) for one in names)]


def _usual_meter(last, meters):
    """Return the name of the meter that was used last, else of the only one in service."""
    in_service = [one.name for one in meters if not one.out_of_service]
    withdrawn = {one.name.casefold() for one in meters if one.out_of_service} - {one.casefold() for one in in_service}
    if last and last.meter and last.meter.casefold() not in withdrawn:
        return last.meter
    return in_service[0] if len(in_service) == 1 else ""


_PLAIN = (
    ("depth_m", "depth of the water"),
    ("do_percent", "saturation the meter shows"),
    ("conductance_us_cm", "specific conductance"),
    ("ph", "pH"),
    ("distance_left_m", "distance from the left edge"),
    ("sensor_depth_m", "depth of the sensor"),
    ("latitude", "latitude"),
    ("longitude", "longitude"),
    ("position_radius_m", "radius of the position"),
)


def _measured(fields, name, label, required=False):
    """Return a number within its column's limits; one of WIDE beyond them comes back with its message set."""
    column = READINGS.column(name)
    high = WIDE.get(name, column.high)
    value = fields.number(name, label, column.low, high, column.quantity, required)
    if value is not None and value > column.high:
        fields.refuse(name, _TOO_HIGH[name])
    return value


_TOO_HIGH = {
    "do_mg_l": "That is too much for mg/L, and looks like percent. Put it under “Saturation the meter shows”, "
    "and leave this box empty if the meter can't show mg/L.",
    "water_temp_c": "No river is that warm. Check the unit that the meter shows.",
}


def _series(fields, do_mg_l):
    """Return the several raw values; a number in the oxygen box that is none of them is one more, the last."""
    text = fields.text("values", "values", 2000, required=False)
    if not text:
        return ()
    try:
        series = read_values(text, fields.show)
    except BadValues as trouble:
        fields.refuse("values", str(trouble))
        return ()
    fields.entered["values"] = {"text": text, "unit": "mg/L"}
    if do_mg_l is None or "do_mg_l" in fields.errors or any(one["do_mg_l"] == do_mg_l for one in series):
        return series
    return (*series, {"after_s": None, "do_mg_l": do_mg_l, "water_temp_c": None})


def _velocity(fields):
    """Return the velocity of a current meter, or that of a float at the surface, which is not yet the mean."""
    method = fields.choice("velocity_method", "way the velocity was measured", VELOCITY_METHODS, "")
    column = READINGS.column("velocity_m_s")
    velocity = fields.number("velocity_m_s", "velocity", column.low, column.high, "velocity", False)
    run_m = fields.number("float_distance", "distance of the float", 0.1, 1000, "depth", False)
    run_s = fields.number("float_time_s", "time of the float", 1, 3600, "plain", False)
    if run_m is not None or run_s is not None:
        if velocity is not None:
            fields.refuse("velocity_m_s", "Enter the velocity, or the float's time and distance, not both.")
        if run_m is None:
            fields.refuse("float_distance", "Enter how far the float went.")
        if run_s is None:
            fields.refuse("float_time_s", "Enter how long the float took.")
        if not fields.errors:
            velocity, method = run_m / run_s, "float"
    if velocity is None:
        return {"velocity_method": ""}
    if method == "float":
        if not 0 <= velocity <= column.high:
            fields.refuse("velocity_m_s", "A float's velocity lies between 0 and 6 m/s (20 ft/s); check it.")
        return {"surface_velocity_m_s": velocity, "velocity_method": method}
    if not method:
        fields.refuse("velocity_method", "Say how the velocity was measured: a float runs faster than the water.")
    return {"velocity_m_s": velocity, "velocity_method": method or ""}


def _words(fields):
    longest = READINGS.column("meter").longest
    other = fields.text("meter_other", "meter's name", longest, required=False)
    return {
        "percent_basis": fields.choice("percent_basis", "basis of the percent", PERCENT_BASES, "local"),
        "position": fields.choice("position", "position across the river", POSITIONS, ""),
        "meter": other or fields.text("meter", "meter's name", longest, required=False),
        "unstable_reason": fields.text("unstable_reason", "reason", 300, required=False),
        "replicate": fields.ticked("replicate"),
        "note": fields.text("note", "note", READINGS.column("note").longest, required=False),
    }


def unanswered(findings, source):
    """Return the findings that the crew has not yet answered with "keep it".

    Values that had not settled are answered by the reason why they are saved, and by nothing else.
    """
    why = (source.get("unstable_reason") or "").strip()
    not_kept = {one.name for one in answers.unanswered(findings, source, FIELD_OF)}
    return [one for one in findings if (not why if one.name == UNSTABLE else one.name in not_kept)]


def without_reason(findings, source):
    """Return the message for values that had not settled and were kept without saying why; none for others."""
    kept = source.get("keep") and any(one.name == UNSTABLE for one in findings)
    return {"unstable_reason": "Say why it is saved although it had not settled."} if kept else {}


def unfolded(form, errors, findings):
    """Return the names of the folds with something that needs to be seen."""
    touched = set(errors) | {FIELD_OF.get(one.field, one.field) for one in findings}
    return {
        fold for fold, names in FOLDS.items() if touched & set(names) or any(form.get(name) for name in OPENS[fold])
    }


def with_suggestion(source, findings, show):
    """Return the form's texts with the suggestion that the crew took, None where they took none."""
    wanted = source.get("use")
    taken = next((one for one in findings if one.name == wanted and one.suggestion), None)
    return {**source, **suggested_texts(taken, show)} if taken else None


def suggested_texts(finding, show):
    """Return what a finding suggests, as somebody would type it into the form."""
    texts = {}
    for key, value in (finding.suggestion or {}).items():
        name = FIELD_OF.get(key, key)
        if key in ("pressure_source", "pressure_unit"):
            texts[name] = value
        elif key == "pressure_value":
            texts[name] = f"{value:.10g}"
        else:
            texts[name] = show.typed(READINGS.column(name).quantity, value)
    return texts


def suggestion_words(finding, show):
    """Return what a finding suggests as a button says it; nothing where it suggests nothing."""
    if not finding.suggestion:
        return ""
    words = []
    for name, text in suggested_texts(finding, show).items():
        if name == "pressure_source":
            words.append(f"it as {WEATHER}")
        elif name == "pressure_unit":
            words.append(PRESSURE_UNITS.get(text, text))
        elif name == "pressure":
            words.append(text)
        else:
            words.append(f"{text} {show.unit_label(READINGS.column(name).quantity)}")
    return " ".join(words) if "pressure_unit" in finding.suggestion else " and ".join(words)
