"""Stored rows as rows of the dataset: people by a label, stations by code, plan versions by number."""

from dataclasses import dataclass

from webapp.dataset.fields import DataTable, Field, number, text, whole, yes_no
from webapp.dataset.kept import holds_json, kept
from webapp.dataset.private import public
from webapp.surveyfile.tables import carried

# Of the tables that others point at by something kinder than an id: the column here that holds it.
KINDER = {"person": "person", "station": "code", "plan_version": "plan_version"}
_TIMES = ("taken_at", "checked_at", "collected_at", "at", "made_at")
SERIES = ("after_s", "do_mg_l", "water_temp_c")


@dataclass(frozen=True)
class Names:
    """What rows are called instead of by their ids, by stored table."""

    people: dict
    stations: dict
    plans: dict

    @classmethod
    def of(cls, rows):
        """Return the Names of a survey's stored rows."""
        return cls(
            people=labels(rows["person"]),
            stations={row["id"]: row["code"] for row in rows["station"]},
            plans={row["id"]: row["number"] for row in rows["plan_version"]},
        )

    def of_table(self, stored):
        """Return {id: name} of a stored table, or None where its rows are called by their ids."""
        return {"person": self.people, "station": self.stations, "plan_version": self.plans}.get(stored)


def labels(people):
    """Return {id: label}: the name, with the beginning of the id where two people share one. No two are alike."""
    names = [row["name"].strip() for row in people]
    found = {}
    for row, name in zip(people, names, strict=True):
        alone = name and names.count(name) == 1
        found[row["id"]] = name if alone else f"{name} ({row['id'][:8]})".strip()
    if len({label.casefold() for label in found.values()}) == len(found):
        return found
    return {row["id"]: f"{name} ({row['id']})".strip() for row, name in zip(people, names, strict=True)}


def kept_rows(stored, rows, names):
    """Return rows of a stored table as rows of the dataset, in the order that they happened."""
    columns, fields = carried()[stored].columns, kept()[stored].fields
    ways = [(one.name, column, _way(columns[column], carried()[stored].parents.get(column), names))
            for column, one in fields.items()]  # fmt: skip
    time = next((name for name in _TIMES if name in columns), "id")
    ordered = sorted(rows, key=lambda row: (row[time], row["id"]))
    return [{here: way(row[column]) for here, column, way in ways} for row in ordered]


def _way(column, parent, names):
    known = names.of_table(parent)
    if known is not None:
        return known.get
    return _or_none if holds_json(column) else _same


def _or_none(value):
    return public(value) or None


def _same(value):
    return value


def fields_of(stored):
    """Return the fields that keep a stored table."""
    return tuple(kept()[stored].fields.values())


def foreign_of(stored):
    """Return {field: (table, field)} of what a stored table points at within the dataset."""
    found = {}
    for column, parent in carried()[stored].parents.items():
        if column in kept()[stored].fields:
            here = kept()[stored].fields[column].name
            found[here] = (kept()[parent].table, KINDER.get(parent) or kept()[parent].fields["id"].name)
    return found


def kept_table(stored, title, says, rows, further=()):
    """Return a table of rows that keep a stored table, with further fields after those."""
    own = kept()[stored]
    key = (own.fields["id"].name,)
    return DataTable(own.table, title, says, (*fields_of(stored), *further), key, rows, foreign_of(stored))


def people_table(rows, names):
    """Return who is named anywhere, and who is on the survey."""
    on_it = {row["person_id"] for row in rows["survey_member"]}
    told = [
        {"person": names.people[row["person_id"]], **row, "on_survey": row["person_id"] in on_it}
        for row in kept_rows("person", rows["person"], names)
    ]
    told.sort(key=lambda row: row["person"])
    fields = (
        text("person", "Label", "What every other table calls this person.", constraints={"required": True}),
        *fields_of("person"),
        yes_no("on_survey", "On the survey"),
    )
    says = "Everybody who is named in the dataset. How they sign in is left out."
    return DataTable("people", "People", says, fields, ("person",), told)


def values_table(readings):
    """Return the several raw values of readings, in the order that they were read."""
    fields = (
        text("reading_id", "Reading's id", constraints={"required": True}),
        whole("value", "Value", "Counts the values of a reading.", constraints={"required": True}),
        number("after_s", "After", "s", "Since the probe went in."),
        number("do_mg_l", "Oxygen", "mg/L"),
        number("water_temp_c", "Water temperature", "Cel"),
    )
    rows = [
        {"reading_id": row["id"], "value": place, **{name: one.get(name) for name in SERIES}}
        for row in sorted(readings, key=lambda row: (row["taken_at"], row["id"]))
        for place, one in enumerate(row["series"] or (), start=1)
    ]
    says = "The raw values that readings are the medians of, where more than one was noted."
    foreign = {"reading_id": ("readings", "reading_id")}
    return DataTable("reading_values", "Raw values", says, fields, ("reading_id", "value"), rows, foreign)


def plan_rows_table(plans):
    """Return every row of every version of the plan."""
    fields = (
        whole("plan_version", "Plan version", constraints={"required": True}),
        text("table", "Table of the plan", constraints={"required": True}),
        whole("row", "Row", "Counts the rows of the table.", constraints={"required": True}),
        text("values", "What it says", "As JSON, in SI, by the column names of that table; without private fields."),
    )
    rows = [
        {"plan_version": plan["number"], "table": key, "row": place, "values": public(row) or None}
        for plan in sorted(plans, key=lambda plan: plan["number"])
        for key in sorted(plan["tables"])
        for place, row in enumerate(plan["tables"][key] or (), start=1)
    ]
    says = "Every row of every version of the plan. The newest also stands in tables of its own, column by column."
    foreign = {"plan_version": ("plan_versions", "plan_version")}
    return DataTable(
        "plan_rows", "All versions of the plan", says, fields, ("plan_version", "table", "row"), rows, foreign
    )


def plan_versions_table(plans, names):
    """Return who made which version of the plan, and why."""
    tables_in = {plan["id"]: ";".join(sorted(plan["tables"])) for plan in plans}
    rows = kept_rows("plan_version", plans, names)
    rows = [{**row, "tables": tables_in[row["plan_version_id"]]} for row in rows]
    rows.sort(key=lambda row: row["plan_version"])
    says = "Versions of the plan. The plan's own tables here are those of the newest; plan_rows.csv has all."
    made = kept_table("plan_version", "Plan versions", says, rows, (Field("tables", "Tables it has"),))
    return DataTable(made.name, made.title, made.says, made.fields, ("plan_version",), rows, made.foreign)
