"""The tables of a dataset that say what was planned and by which rules: survey, plan, prediction, settings, history."""

from dataclasses import replace
from datetime import datetime

from calc.settings import SETTINGS
from calc.units import UNITS
from webapp.dataset.fields import DataTable, from_column, moment, number, text, whole
from webapp.plan.tables import ACCESS, ALL_TABLES, STATIONS

# What stays out wherever it stands, and why. The keys are those of plan columns, survey facts and history particulars.
LEFT_OUT = (
    (ACCESS.key, "contact", "Owners' contacts are for the crew only."),
    ("survey", "safety_note", "It holds telephone numbers and names for emergencies."),
    ("person", "sign_in", "Names stand beside what people did; how they sign in is nobody's business."),
)
_PRIVATE = frozenset(key for _, key, _ in LEFT_OUT) | {
    column.key for table in ALL_TABLES.values() for column in table.columns if column.private
}
_ROW = whole("row", "Row", "Counts the rows of the plan's table.", constraints={"required": True})
_VERSION = whole("plan_version", "Plan version", constraints={"required": True})
_TO_VERSION = {"plan_version": ("plan_versions", "plan_version")}


def survey_table(survey, who, plan, settings):
    """Return the survey's own facts, in one row."""
    fields = (
        text("survey_id", "Survey's id", constraints={"required": True}),
        text("name", "Name"),
        text("river", "River"),
        text("purpose", "What it must decide"),
        text("time_zone", "Time zone", "IANA name; every time in the dataset has its offset."),
        text("unit_system", "Units on screen", "What people saw and typed; the dataset is in SI."),
        text("distance_rule", "Distances on screen", "The dataset counts downstream of the outfall."),
        number("outfall_mark", "The outfall's own river kilometre or mile"),
        number("elevation_m", "Elevation of the water", "m", "Above sea level."),
        number("do_criterion_mg_l", "Oxygen criterion", "mg/L"),
        text("criterion_basis", "Basis of the criterion"),
        text("sampling", "Way of sampling", "same_parcel: the water was followed down; snapshot: it was not."),
        moment("release_at", "The parcel leaves the outfall"),
        moment("created_at", "Survey made"),
        text("created_by", "Survey made by"),
        whole("plan_version", "Plan version used here"),
        whole("settings_version", "Settings version used here"),
    )
    row = {field.name: getattr(survey, field.name, None) for field in fields}
    row |= {
        "survey_id": survey.id,
        "created_by": who.get(survey.created_by_id, ""),
        "plan_version": plan.number if plan else None,
        "settings_version": settings.number,
    }
    return DataTable("survey", "Survey", "The survey's own facts.", fields, ("survey_id",), [row])


def plan_version_table(versions):
    """Return who made which version of the plan, and why."""
    fields = (
        _VERSION,
        moment("made_at", "Made"),
        text("made_by", "Made by"),
        text("reason", "Reason"),
    )
    rows = [
        {"plan_version": one.number, "made_at": one.made_at, "made_by": one.made_by.name, "reason": one.reason}
        for one in sorted(versions, key=lambda one: one.number)
    ]
    says = "Versions of the plan. The plan's tables here are those of the newest."
    return DataTable("plan_versions", "Plan versions", says, fields, ("plan_version",), rows)


def plan_tables(plan, known_codes):
    """Return the plan's tables in its newest version; known_codes are all stations the survey ever had."""
    made = [_plan_table(table, plan) for key, table in ALL_TABLES.items() if key != STATIONS.key]
    return [*made, _station_table(plan, known_codes)]


def _plan_table(table, plan):
    columns = [column for column in table.columns if not column.private]
    # A limit may have moved since, or a row be unfinished: what was planned is told as it is.
    fields = (_VERSION, _ROW, *(replace(from_column(column), constraints={}) for column in columns))
    rows = [
        {"plan_version": plan.number, "row": number, **{column.key: _planned(column, row) for column in columns}}
        for number, row in enumerate((plan.tables.get(table.key) or []) if plan else [], start=1)
    ]
    return DataTable(table.key, table.title, table.says, fields, ("row",), rows, _TO_VERSION)


def _planned(column, row):
    """Return a value of a plan; its times are kept as text in ISO 8601."""
    value = row.get(column.key)
    if column.quantity == "time" and isinstance(value, str) and value:
        return datetime.fromisoformat(value)
    return value


def _station_table(plan, known_codes):
    table = STATIONS
    states = {**table.column("state").choices, "not_in_plan": "left out of the newest plan"}
    fields = [replace(from_column(column), constraints={}) for column in table.columns]
    fields = [replace(one, choices=states) if one.name == "state" else one for one in fields]
    fields = [replace(one, constraints={"required": True}) if one.name == "code" else one for one in fields]
    planned = {row["code"]: row for row in (plan.tables.get("stations") or []) if row.get("code")} if plan else {}
    rows = [{**row, "state": row.get("state") or "planned"} for row in planned.values()]
    rows += [{"code": code, "state": "not_in_plan"} for code in sorted(known_codes) if code not in planned]
    return DataTable("stations", table.title, table.says, tuple(fields), ("code",), rows)


def prediction_table(plan, prediction):
    """Return the predicted sag of the newest plan; prediction is None where the plan is not complete."""
    columns = (
        ("distance_km", "Distance below the outfall", "km", ""),
        ("travel_time_h", "Travel time from the outfall", "h", "Negative above it."),
        ("do_mg_l", "Predicted oxygen", "mg/L", ""),
        ("low_mg_l", "Low end of the band", "mg/L", "90 % of the plausible rivers lie within the band."),
        ("high_mg_l", "High end of the band", "mg/L", ""),
        ("deficit_mg_l", "Predicted deficit", "mg/L", "Saturation less oxygen."),
        ("saturation_mg_l", "Saturation", "mg/L", "At the planned temperature and the standard pressure."),
    )
    fields = (
        _VERSION,
        whole("point", "Point", "Counts the points down the river.", constraints={"required": True}),
        *(number(name, title, unit, says) for name, title, unit, says in columns),
    )
    rows = []
    if prediction is not None:
        distances = prediction.grid_km
        lines = [distances, *(getattr(prediction, name) for name, *_ in columns[1:])]
        for point, values in enumerate(zip(*lines, strict=True), start=1):
            row = {name: round(float(value), 4) for (name, *_), value in zip(columns, values, strict=True)}
            rows.append({"plan_version": plan.number, "point": point, **row})
    says = "The sag that the newest plan predicts, with its band. Empty where the plan is not complete."
    return DataTable("predictions", "Predicted sag", says, fields, ("point",), rows, _TO_VERSION)


def settings_table(settings):
    """Return every threshold of the survey, with the trade's default and where that comes from."""
    codes = {unit.label: unit.code for unit in UNITS.values() if unit.label}
    fields = (
        whole("settings_version", "Settings version", constraints={"required": True}),
        text("key", "Key", constraints={"required": True}),
        text("label", "What it is"),
        number("value", "Value"),
        text("unit", "Unit as written"),
        text("unit_ucum", "Unit as UCUM code"),
        number("default", "The trade's default"),
        text("source", "Source of the default"),
    )
    rows = [
        {
            "settings_version": settings.number,
            "key": one.key,
            "label": one.label,
            "value": float(settings.thresholds.get(one.key, one.default)),
            "unit": one.unit,
            "unit_ucum": codes.get(one.unit, ""),
            "default": float(one.default),
            "source": one.source,
        }
        for one in SETTINGS
    ]
    says = "Every threshold that the checks on readings use."
    return DataTable("settings", "Settings", says, fields, ("settings_version", "key"), rows)


def audit_table(history, who):
    """Return every change to the survey, in the order it happened."""
    fields = (
        whole("line", "Line", constraints={"required": True}),
        moment("at", "When"),
        text("person", "Who"),
        text("what", "What"),
        text("entity", "Kind of thing changed"),
        text("entity_id", "Its id"),
        text("particulars", "Particulars", "As JSON, without private fields."),
    )
    rows = [
        {
            "line": line,
            "at": change.at,
            "person": who.get(change.person_id, ""),
            "what": change.what,
            "entity": change.entity,
            "entity_id": change.entity_id,
            "particulars": public(change.particulars) or "",
        }
        for line, change in enumerate(history, start=1)
    ]
    says = "Every change to the survey, in the order it happened."
    return DataTable("audit", "History", says, fields, ("line",), rows)


def decisions_table(decisions, numbers):
    """Return what was decided on site, with what was on the screen; numbers are those of plan versions by id."""
    fields = (
        text("decision_id", "Decision's id", constraints={"required": True}),
        moment("made_at", "When"),
        text("made_by", "Who"),
        text(
            "kind",
            "What about",
            "station: where to read next; declined, offered: a place refused or offered again; leave: left or stayed.",
        ),
        text("chosen", "What was chosen", "A station's code, a place, or whether the crew left or stayed."),
        text("reason", "Reason"),
        whole("plan_version", "Plan version then", constraints={"required": True}),
        text("screen", "What was on the screen", "As JSON: numbers in SI, sentences as they were read."),
    )
    rows = [
        {
            "decision_id": one.id,
            "made_at": one.made_at,
            "made_by": one.made_by.name,
            "kind": one.kind,
            "chosen": one.chosen,
            "reason": one.reason,
            "plan_version": numbers.get(one.plan_version_id),
            "screen": public(one.screen) or "",
        }
        for one in decisions
    ]
    says = "What was decided on site, in the order it was."
    return DataTable("decisions", "Decisions on site", says, fields, ("decision_id",), rows, _TO_VERSION)


def public(value):
    """Return particulars without what stays out of a dataset."""
    if isinstance(value, dict):
        return {key: public(one) for key, one in value.items() if key not in _PRIVATE}
    return [public(one) for one in value] if isinstance(value, list) else value


def left_out_table():
    """Return what was left out on purpose."""
    fields = (text("table", "Table"), text("column", "Column"), text("why", "Why"))
    rows = [{"table": table, "column": column, "why": why} for table, column, why in LEFT_OUT]
    says = "What was left out on purpose."
    return DataTable("left_out", "Left out", says, fields, ("table", "column"), rows)


def dictionary_table(tables):
    """Return every column of every table: what it is, its type, unit and limits."""
    fields = (
        text("table", "Table", constraints={"required": True}),
        text("column", "Column", constraints={"required": True}),
        text("title", "What it is"),
        text("type", "Type"),
        text("unit", "Unit", "UCUM code."),
        number("minimum", "Lowest"),
        number("maximum", "Highest"),
        text("description", "More"),
    )
    rows = [
        {
            "table": table.name,
            "column": one.name,
            "title": one.title,
            "type": one.type,
            "unit": one.unit,
            "minimum": one.constraints.get("minimum"),
            "maximum": one.constraints.get("maximum"),
            "description": one.description(),
        }
        for table in tables
        for one in table.fields
    ]
    says = "Every column of every table."
    return DataTable("dictionary", "Dictionary", says, fields, ("table", "column"), rows)
