"""What is typed about meters and their checks, into values or a message beside each field."""

import uuid
from datetime import date, timedelta

from webapp.forms import Fields, whole_number
from webapp.meters.new import NewCheck, NewMeter, Standard, find_meter
from webapp.meters.words import (
    ACTIONS,
    KINDS,
    MADE_WITH_AIR,
    METHODS,
    PARAMETERS,
    PERCENT_BASES,
    STANDARDS,
)
from webapp.readings.columns import PRESSURE_UNITS
from webapp.readings.pressure import pressure_of

# The names that calc uses for a field of the form.
FIELD_OF = {"pressure_value": "pressure", "standard": "expires_on"}
KNOWN_BY_THEMSELVES = (*MADE_WITH_AIR, "zero_solution")
# What the form asks for under "More about this check".
MORE = ("conductance_us_cm", "lot", "expires_on", "place", "action", "note")
# As found, adjusted and read back follow each other within this.
AT_ONCE = timedelta(minutes=30)


def parse_meter(source, show, name=None):
    """Return (NewMeter, {}) or (None, {field: message}); name is that of a meter which is changed: it stays."""
    fields = Fields(source, show)
    meter = NewMeter(
        id=fields.uuid("submission_id"),
        name=name or _one_line(fields.text("name", "name of the meter", 60)),
        method=fields.choice("method", "way it measures", METHODS, ""),
        maker=fields.text("maker", "maker", 60, required=False),
        model=fields.text("model", "model", 60, required=False),
        serial=fields.text("serial", "serial number", 60, required=False),
        cap_changed_on=_day(fields, "cap_changed_on", "day the cap or membrane was changed"),
        serviced_on=_day(fields, "serviced_on", "day of the factory service"),
        resolution_mg_l=fields.number("resolution_mg_l", "smallest step of the display", 0.001, 1, "oxygen", False),
        percent_basis=fields.choice("percent_basis", "basis of the percent", PERCENT_BASES, "local"),
        out_of_service=fields.ticked("out_of_service"),
        note=fields.text("note", "note", 2000, required=False),
    )
    return (None, fields.errors) if fields.errors else (meter, {})


def fresh_meter(name=""):
    """Return the texts of a form for a new meter."""
    return {"submission_id": str(uuid.uuid4()), "name": name[:60]}


def form_of_meter(meter, show):
    """Return a meter as its form shows it."""
    names = ("name", "method", "maker", "model", "serial", "cap_changed_on", "serviced_on", "percent_basis", "note")
    return {
        **{name: getattr(meter, name) for name in names},
        "submission_id": meter.id,
        "resolution_mg_l": show.typed("oxygen", meter.resolution_mg_l),
        "out_of_service": "yes" if meter.out_of_service else "",
    }


def parse_check(source, show, meters, now):
    """Return (NewCheck, errors); the check is None where the errors leave nothing to judge. meters may be checked."""
    fields = Fields(source, show)
    parameter = fields.choice("parameter", "value to be checked", PARAMETERS, "do") or "do"
    kind = fields.choice("kind", "kind of check", KINDS, "as_found")
    standard = _standard(fields, parameter, kind)
    new = NewCheck(
        id=fields.uuid("submission_id"),
        meter_id=_meter(fields, meters),
        checked_at=fields.past_time("taken_at", "time of the check", now),
        kind=kind,
        parameter=parameter,
        standard=standard,
        **_conditions(fields, standard in MADE_WITH_AIR),
        compared=_compared(fields, parameter, standard),
        value=fields.number("value", "value the meter shows", *_limits(parameter)),
        place=fields.text("place", "place", 60, required=False),
        lot=fields.text("lot", "standard's lot", 60, required=False),
        expires_on=_day(fields, "expires_on", "standard's expiry date"),
        action=fields.choice("action", "thing that was done", ACTIONS, _usual_action(kind)),
        note=fields.text("note", "note", 2000, required=False),
        entered=fields.entered,
    )
    return (None if fields.errors else new), fields.errors


def parse_standard(source, show):
    """Return the Standard that a form describes so far; what can't be read yet counts as not known."""
    fields = Fields(source, show)
    parameter = fields.choice("parameter", "value to be checked", PARAMETERS, "do") or "do"
    kind = fields.choice("kind", "kind of check", KINDS, "as_found") or "as_found"
    standard = _standard(fields, parameter, kind) or usual_standard(parameter, kind)
    return Standard(
        standard, **_conditions(fields, standard in MADE_WITH_AIR), compared=_compared(fields, parameter, standard)
    )


def _usual_action(kind):
    return "adjusted" if kind == "adjusted" else "none"


def _meter(fields, meters):
    wanted = fields.text("meter", "meter", 60)
    if wanted is None:
        return None
    found = find_meter(meters, wanted)
    return found.id if found else fields.refuse("meter", "Choose the meter from the list.")


def usual_standard(parameter, kind):
    """Return what a check of this kind is usually made against."""
    if parameter == "do" and kind == "zero":
        return "zero_solution"
    return PARAMETERS[parameter].standards[0]


def _standard(fields, parameter, kind):
    """Return the standard; a zero check is one in zero solution, whatever the list still says."""
    if kind == "zero" and parameter != "do":
        fields.refuse("kind", "A zero check is one of oxygen. Choose another kind here.")
    if parameter == "do" and kind == "zero":
        return "zero_solution"
    options = {key: STANDARDS[key] for key in PARAMETERS[parameter].standards}
    return fields.choice("standard", "standard it is checked against", options, usual_standard(parameter, kind))


def _limits(parameter):
    """Return lowest and highest value of a parameter, and its quantity."""
    what = PARAMETERS[parameter]
    return what.low, what.high, what.quantity


def _compared(fields, parameter, standard):
    """Return the other value, where the expected one is not computed."""
    if standard is None or standard in KNOWN_BY_THEMSELVES:
        return None
    return fields.number("compared", "value it is compared with", *_limits(parameter))


def _conditions(fields, with_air):
    """Return temperature, conductance and air pressure: asked for where the standard is made with air.

    Elsewhere nothing rests on them, and a page may not even show them: they are kept where they can be read.
    """
    own = fields if with_air else Fields(fields.source, fields.show)
    found = {
        # saturation is known between 0 and 40 °C
        "water_temp_c": own.number("water_temp_c", "temperature of the water", 0, 40, "temperature", with_air),
        "conductance_us_cm": own.number("conductance_us_cm", "conductance", 0, 70000, "conductance", False),
        **pressure_of(own),
    }
    if not with_air:
        fields.entered.update({name: typed for name, typed in own.entered.items() if name not in own.errors})
    return found


def _day(fields, name, label):
    """Return a date as its ISO text, empty where none was typed."""
    text = fields.text(name, label, 40, required=False)
    if not text:
        return ""
    try:
        day = date.fromisoformat(text)
    except ValueError:
        return fields.refuse(name, f"Enter the {label} as year, month and day, for example 2026-08-14.")
    return day.isoformat() if 1990 <= day.year <= 2200 else fields.refuse(name, f"Check the year of the {label}.")


def _one_line(text):
    return " ".join(text.split()) if text else text


def fresh_check(show, last, now, meter_id, kind, parameter):
    """Return the texts of a fresh form: what is proposed, the time, and the pressure's unit and source as last time.

    A check that follows another of the same meter at once is made beside it: it begins with its place and air pressure.
    """
    pressure = (last.entered.get("pressure") or {}) if last else {}
    follows = last is not None and last.meter_id == meter_id and abs(now - last.checked_at) <= AT_ONCE
    return {
        "submission_id": str(uuid.uuid4()),
        "taken_at": show.typed_time(now),
        "units": show.unit_system,
        "meter": meter_id,
        "kind": kind,
        "parameter": parameter,
        # Of a zero check the list is hidden and does not count: it waits with what another kind is made against.
        "standard": PARAMETERS[parameter].standards[0],
        "place": last.place if follows else "",
        "action": _usual_action(kind),
        "pressure": pressure.get("text", "") if follows else "",
        "pressure_source": last.pressure_source if last else "standard",
        "pressure_unit": pressure.get("unit") or ("[in_i'Hg]" if show.unit_system == "us" else "mm[Hg]"),
    }


def unfolded(form, errors, findings):
    """Return whether something under "More about this check" needs to be seen."""
    touched = set(errors) | {FIELD_OF.get(one.field, one.field) for one in findings}
    return bool(touched & set(MORE)) or any(form.get(name) for name in ("note", "lot", "conductance_us_cm"))


def with_suggestion(source, findings):
    """Return the form's texts with the suggestion that was taken, None where none was."""
    taken = next((one for one in findings if one.name == source.get("use") and one.suggestion), None)
    return {**source, **suggested_texts(taken)} if taken else None


def suggested_texts(finding):
    """Return what a finding suggests, as somebody would type it into the form: all of it is about air pressure."""
    return {
        FIELD_OF.get(key, key): value if isinstance(value, str) else f"{value:.10g}"
        for key, value in (finding.suggestion or {}).items()
    }


def suggestion_words(finding):
    """Return what a finding suggests as a button says it; nothing where it suggests nothing."""
    texts = suggested_texts(finding)
    if not texts:
        return ""
    if "pressure_unit" in texts:
        return f"{texts['pressure']} {PRESSURE_UNITS.get(texts['pressure_unit'], texts['pressure_unit'])}"
    return "it as a weather value"


def parse_reason(source):
    """Return (reason, {}) or (None, {field: message})."""
    fields = Fields(source)
    reason = fields.text("reason", "reason: whoever reads this later must see why", 500)
    return (None, fields.errors) if fields.errors else (reason, {})


def based_on(source):
    """Return how many decisions the form's page knew of; -1, which never fits, where it does not say."""
    return whole_number(source.get("based_on"), -1)
