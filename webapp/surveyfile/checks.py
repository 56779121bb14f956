"""Whether the rows of a survey file fit together, and hold only what Bankside's own forms could have stored."""

import math
from zoneinfo import available_timezones

from calc.errors import CalcError
from calc.settings import Settings
from calc.units import UNITS
from webapp.people.access import ROLES
from webapp.plan.rows import refused_code
from webapp.plan.tables import ALL_TABLES
from webapp.readings.columns import PERCENT_BASES, POSITIONS, PRESSURE_SOURCES, READINGS, VELOCITY_METHODS
from webapp.readings.layers import EVENTS, NUMBERS
from webapp.surveyfile import shapes
from webapp.surveyfile.archive import BadSurveyFile
from webapp.surveyfile.tables import CARRIED, NUMBERED, STAYS_HERE, carried

_CHOICES = {
    "person": {"role": ROLES},
    "survey": {
        "unit_system": ("si", "us"),
        "distance_rule": ("downstream", "river_km", "river_mile"),
        "sampling": ("same_parcel", "snapshot"),
    },
    "reading": {
        "percent_basis": PERCENT_BASES,
        "pressure_source": PRESSURE_SOURCES,
        "position": POSITIONS,
        "velocity_method": VELOCITY_METHODS,
    },
    "reading_event": {"kind": EVENTS},
    **shapes.CHOICES,
}
_LIMITS = {
    column.key: (column.low, column.high)
    for column in READINGS.columns
    if column.quantity not in ("text", "choice", "time", "yes_no")
} | {"pressure_mmhg": (0, 1200), "do_mg_l": (-1, 100)}  # oxygen may come from a percentage
_SURVEY_LIMITS = {"elevation_m": (-430, 6000), "do_criterion_mg_l": (0, 20), "outfall_mark": (0, 10000)}


def check(tables):
    """Raise BadSurveyFile where the rows are not those of one survey, or hold what no form would have taken."""
    _one_survey(tables)
    _parents(tables)
    _choices(tables)
    _survey(tables["survey"][0])
    _numbers(tables)
    _stations_and_plans(tables)
    for name, look in _LOOKS.items():
        for row in tables[name]:
            look(row)
    for name, shape in shapes.SHAPES.items():
        for row in tables[name]:
            for column in shape(row):
                _want(False, name, row, column)


def _choices(tables):
    for name, choices in _CHOICES.items():
        for row in tables[name]:
            for column, allowed in choices.items():
                _want(row.get(column, next(iter(allowed))) in allowed, name, row, column)


def _numbers(tables):
    for name in NUMBERED:
        numbers = [row["number"] for row in tables[name]]
        if len(set(numbers)) != len(numbers) or min(numbers, default=1) < 1:
            raise BadSurveyFile(f"{CARRIED[name][1]} of the file are not numbered one by one.")


def _want(fits, name, row, column):
    if not fits:
        where = ", ".join(str(row.get(key)) for key in carried()[name].key)
        raise BadSurveyFile(f"{CARRIED[name][0]} {where} of the file has a “{column}” that Bankside can't take.")


def _one_survey(tables):
    if len(tables["survey"]) != 1:
        raise BadSurveyFile("A survey file holds one survey; this one holds another number of them.")
    survey_id = tables["survey"][0]["id"]
    for name, rows in tables.items():
        if "survey_id" in carried()[name].columns and any(row.get("survey_id") != survey_id for row in rows):
            raise BadSurveyFile(f"{CARRIED[name][1]} of the file belong to another survey.")


def _parents(tables):
    ids = {name: {row["id"] for row in rows} for name, rows in tables.items() if "id" in carried()[name].columns}
    for name, rows in tables.items():
        for column, parent in carried()[name].parents.items():
            for row in rows:
                _want(row.get(column) is None or row[column] in ids[parent], name, row, column)


def _survey(row):
    _want(row["time_zone"] in available_timezones(), "survey", row, "time_zone")
    _within(_SURVEY_LIMITS, "survey", row)
    counted_up = row.get("distance_rule", "downstream") != "downstream"
    _want(not counted_up or row.get("outfall_mark") is not None, "survey", row, "outfall_mark")


def _within(limits, name, row):
    for column, (low, high) in limits.items():
        value = row.get(column)
        _want(value is None or low <= value <= high, name, row, column)


def _stations_and_plans(tables):
    codes = {row["code"] for row in tables["station"]}
    if len({code.casefold() for code in codes}) != len(tables["station"]):
        raise BadSurveyFile("Two stations of the file have the same code.")
    ever = set()
    for version in tables["plan_version"]:
        plan = version["tables"]
        _want(isinstance(plan, dict) and set(plan) <= set(ALL_TABLES), "plan_version", version, "tables")
        for key, rows in plan.items():
            _want(isinstance(rows, list), "plan_version", version, key)
            for row in rows:
                _plan_row(version, ALL_TABLES[key], row)
        planned = {row["code"] for row in plan.get("stations", [])}
        _want(planned <= codes, "plan_version", version, "stations")
        ever |= planned
    for row in tables["station"]:  # every code was planned once, and stands in the address of pages
        _want(row["code"] in ever and refused_code(row["code"]) is None, "station", row, "code")


def _plan_row(version, table, row):
    columns = {column.key: column for column in table.columns}
    _want(isinstance(row, dict) and set(row) <= set(columns), "plan_version", version, table.key)
    for key, column in columns.items():
        fits = not column.required if row.get(key) is None else _fits(column, row[key])
        _want(fits, "plan_version", version, f"{table.key}, {key}")


def _fits(column, value):
    """Return whether a value is of the kind that a plan's column holds. Limits may have changed since it was typed."""
    if column.quantity == "text":
        return isinstance(value, str)
    if column.quantity == "choice":
        return value in column.choices if isinstance(value, str) else False
    if column.quantity == "yes_no":
        return isinstance(value, bool)
    if column.quantity == "time":
        return shapes.is_time(value)
    return isinstance(value, int | float) and not isinstance(value, bool) and abs(value) <= 1e6


def _settings(row):
    try:
        Settings.from_dict(row["thresholds"])
    except (CalcError, TypeError, ValueError, AttributeError) as wrong:
        raise BadSurveyFile(
            f"Settings version {row['number']} of the file can't be used: {str(wrong)[:120]}"
        ) from wrong


def _reading(row):
    _within(_LIMITS, "reading", row)
    entered, kept = row.get("entered", {}), row.get("kept_findings", [])
    _want(shapes.is_typed(entered, UNITS), "reading", row, "entered")
    _want(shapes.is_findings(kept), "reading", row, "kept_findings")


def _event(row):
    if row["kind"] == "corrected":
        _want(row.get("field") in NUMBERS, "reading_event", row, "field")
        low, high = _LIMITS.get(row["field"], (-math.inf, math.inf))
        value = row.get("new_value")
        _want(value is None or low <= value <= high, "reading_event", row, "new_value")


def _decision(row):
    screen = row.get("screen", {})
    _want(isinstance(screen, dict), "decision", row, "screen")
    for part, kind in _READ_FROM_SCREEN.items():  # what pages read from it; the rest is only kept
        _want(screen.get(part) is None or isinstance(screen[part], kind), "decision", row, f"screen, {part}")


def _history(row):
    _want(isinstance(row.get("particulars", {}), dict), "history", row, "particulars")
    _want(row["what"] not in STAYS_HERE, "history", row, "what")


_READ_FROM_SCREEN = {"place": str, "ticked": list, "answer": dict}
_LOOKS = {
    "settings_version": _settings,
    "reading": _reading,
    "reading_event": _event,
    "decision": _decision,
    "history": _history,
}
