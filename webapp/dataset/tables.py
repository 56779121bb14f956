"""The tables of a dataset that say what was planned and by which rules: survey, plan, prediction, settings."""

from dataclasses import replace
from datetime import datetime

from calc.settings import SETTINGS
from calc.units import UNITS
from webapp.dataset.fields import DataTable, from_column, number, text, whole
from webapp.dataset.keeping import fields_of, kept_rows, kept_table
from webapp.dataset.private import LEFT_OUT
from webapp.plan.tables import ALL_TABLES, STATIONS

_ROW = whole("row", "Row", "Counts the rows of the plan's table.", constraints={"required": True})
_VERSION = whole("plan_version", "Plan version", constraints={"required": True})
_TO_VERSION = {"plan_version": ("plan_versions", "plan_version")}


def survey_table(rows, names, plan, settings, state):
    """Return the survey's own facts, in one row."""
    further = (
        whole("plan_version", "Plan version used here"),
        whole("settings_version", "Settings version used here"),
        text("state", "State", choices={"draft": "not reviewed", "reviewed": "reviewed", "approved": "approved"}),
    )
    told = {"plan_version": plan.number if plan else None, "settings_version": settings.number, "state": state}
    made = kept_rows("survey", rows, names)
    return kept_table("survey", "Survey", "The survey's own facts.", [{**made[0], **told}], further)


def settings_versions_table(rows, names):
    """Return who made which version of the settings, and why."""
    told = sorted(kept_rows("settings_version", rows, names), key=lambda row: row["settings_version"])
    says = "Versions of the settings: settings.csv has their numbers. The newest judges."
    made = kept_table("settings_version", "Settings versions", says, told)
    return replace(made, key=("settings_version",))


def plan_tables(plan, stations, names):
    """Return the plan's tables in its newest version; stations are the rows of all that the survey ever had."""
    made = [_plan_table(table, plan) for key, table in ALL_TABLES.items() if key != STATIONS.key]
    return [*made, _station_table(plan, kept_rows("station", stations, names))]


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


def _station_table(plan, known):
    table = STATIONS
    states = {**table.column("state").choices, "not_in_plan": "left out of the newest plan"}
    fields = [replace(from_column(column), constraints={}) for column in table.columns]
    fields = [replace(one, choices=states) if one.name == "state" else one for one in fields]
    fields = [replace(one, constraints={"required": True}) if one.name == "code" else one for one in fields]
    fields.append(fields_of("station")[0])
    planned = {row["code"]: row for row in (plan.tables.get("stations") or []) if row.get("code")} if plan else {}
    by_code = {row["code"]: row for row in known}
    rows = [{**row, "state": row.get("state") or "planned", **by_code.get(code, {})} for code, row in planned.items()]
    rows += [{**by_code[code], "state": "not_in_plan"} for code in sorted(by_code) if code not in planned]
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


def settings_table(versions):
    """Return every threshold in every version of the survey's settings, with the trade's default and its source."""
    codes = {unit.label: unit.code for unit in UNITS.values() if unit.label}
    fields = (
        whole("settings_version", "Settings version", constraints={"required": True}),
        text("key", "Key", constraints={"required": True}),
        text("label", "What it is"),
        number("value", "Value"),
        text(
            "said", "Who says so", choices={"survey": "this version of the survey's settings", "default": "the trade"}
        ),
        text("unit", "Unit as written"),
        text("unit_ucum", "Unit as UCUM code"),
        number("default", "The trade's default"),
        text("source", "Source of the default"),
    )
    rows = [
        {
            "settings_version": version["number"],
            "key": one.key,
            "label": one.label,
            "value": float(version["thresholds"].get(one.key, one.default)),
            "said": "survey" if one.key in version["thresholds"] else "default",
            "unit": one.unit,
            "unit_ucum": codes.get(one.unit, ""),
            "default": float(one.default),
            "source": one.source,
        }
        for version in sorted(versions, key=lambda version: version["number"])
        for one in SETTINGS
    ]
    says = "Every threshold that the checks use, in every version. The newest judges; its number is in survey.csv."
    foreign = {"settings_version": ("settings_versions", "settings_version")}
    return DataTable("settings", "Settings", says, fields, ("settings_version", "key"), rows, foreign)


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
