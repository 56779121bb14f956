"""A dataset's files as the rows of the survey they tell of: what webapp.dataset.keeping wrote, taken back."""

import hashlib
import json

from webapp.dataset.cells import BadDataset, Reader, any_number, as_json_value, way_of, whole_number, yes_no
from webapp.dataset.fields import as_written
from webapp.dataset.keeping import SERIES
from webapp.dataset.kept import kept
from webapp.dataset.package import LAYOUT
from webapp.surveyfile import archive, checks
from webapp.surveyfile.tables import CARRIED, carried

_NAMED_FIRST = ("person", "station", "plan_version")
_NEWER = "Update Bankside on this server, then import the dataset again."
MOST_FILES = 80


def read(content):
    """Return ({table: stored rows}, its version, files that were changed since they were made) of a dataset's zip.

    Raises BadDataset, with the cells that can't be read, or BadSurveyFile where the rows are not those of a survey.
    """
    files = _files(content)
    version = _version(files)
    tables = _tables(Reader(files))
    checks.check(tables)
    return tables, version, _changed(files)


def _files(content):
    try:
        files = archive.files_of(content, MOST_FILES, "dataset")
    except archive.BadSurveyFile as bad:
        raise BadDataset(str(bad)) from bad
    inside = {name for name in files if not name.endswith("/")}
    at = next((name for name in sorted(inside, key=len) if name.rsplit("/", 1)[-1] == "datapackage.json"), "")
    folder = at[: -len("datapackage.json")] if at else ""
    return {name.removeprefix(folder): files[name] for name in inside if name.startswith(folder)}


def _version(files):
    try:
        package = json.loads(files["datapackage.json"].decode("utf-8"))
        layout = package.get("bankside_layout", 0)
    except (KeyError, ValueError, AttributeError, RecursionError) as wrong:
        raise BadDataset("This zip is no dataset that Bankside made: its datapackage.json can't be read.") from wrong
    if not isinstance(layout, int) or layout > LAYOUT:
        raise BadDataset(f"A newer Bankside made this dataset. {_NEWER}")
    if layout < LAYOUT:
        raise BadDataset(
            "An older Bankside made this dataset, without all that an import needs. Make it again with a newer one, or "
            "import the survey file instead."
        )
    return str(package.get("version", ""))[:80]


def _changed(files):
    """Return the names of the files that do not fit checksums.txt, sorted."""
    lines = files.get("checksums.txt", b"").decode("utf-8", "replace").splitlines()
    told = {name: mark for mark, _, name in (line.partition("  ") for line in lines)}
    names = {name for name in files if name.endswith(".csv")} | {name for name in told if name.endswith(".csv")}
    return tuple(
        name for name in sorted(names) if name not in files or told.get(name) != hashlib.sha256(files[name]).hexdigest()
    )


def _tables(reader):
    """Return {stored table: rows}; the tables that others point at by name come first."""
    people = _people(reader)
    named = {"person": people}
    tables = {"survey": _rows(reader, "survey", named, {})}
    reader.stop()
    if len(tables["survey"]) != 1:
        raise BadDataset("survey.csv holds one row, the survey; this one has another number of them.")
    survey_id = tables["survey"][0]["id"]
    for name in (*_NAMED_FIRST, *CARRIED):
        if name not in tables and name != "survey_member":
            tables[name] = _rows(reader, name, named, {"survey_id": survey_id})
            if (column := {"station": "code", "plan_version": "number"}.get(name)) is not None:
                named[name] = {str(row[column]): row["id"] for row in tables[name]}
    tables["survey_member"] = _members(reader, named, survey_id)
    _thresholds(reader, tables["settings_version"])
    _plans(reader, tables["plan_version"])
    _series(reader, tables["reading"])
    reader.stop()
    return {name: sorted(tables[name], key=carried()[name].key_of) for name in CARRIED}


def _people(reader):
    """Return {label: id}."""
    found, column = {}, carried()["person"].columns["id"]
    way = way_of(column)
    for number, cells in reader.rows("people", ("person", "person_id")):
        label = as_written(cells["person"])
        if not label or label in found:
            reader.refuse("people.csv", number, "person", label, "a label that is empty or stands twice")
        found[label] = reader.value("people", number, "person_id", cells["person_id"], way)
    return found


def _rows(reader, stored, named, more):
    """Return the rows of a stored table; what stands in other tables of the dataset is added later."""
    one, own, table = carried()[stored], kept()[stored].fields, kept()[stored].table
    ways = [
        (column, field.name, way_of(one.columns[column], named.get(one.parents.get(column))))
        for column, field in own.items()
    ]
    more = {name: value for name, value in more.items() if name in one.columns}
    rows, seen = [], set()
    for number, cells in reader.rows(table, [field.name for field in own.values()]):
        row = {column: reader.value(table, number, here, cells[here], way) for column, here, way in ways}
        if row["id"] in seen:
            reader.refuse(f"{table}.csv", number, own["id"].name, str(row["id"]), "stands twice")
        seen.add(row["id"])
        rows.append({**row, **more})
    return rows


def _members(reader, named, survey_id):
    rows = []
    for number, cells in reader.rows("people", ("person", "on_survey")):
        if reader.value("people", number, "on_survey", cells["on_survey"], yes_no):
            rows.append({"survey_id": survey_id, "person_id": named["person"][as_written(cells["person"])]})
    return rows


def _thresholds(reader, versions):
    by_number = {row["number"]: row for row in versions}
    for row in versions:
        row["thresholds"] = {}
    for number, cells in reader.rows("settings", ("settings_version", "key", "value", "said")):
        version = reader.value("settings", number, "settings_version", cells["settings_version"], whole_number)
        value = reader.value("settings", number, "value", cells["value"], any_number)
        if version not in by_number:
            reader.refuse("settings.csv", number, "settings_version", cells["settings_version"], "there is no such one")
        elif cells["said"] == "survey":
            by_number[version]["thresholds"][as_written(cells["key"])] = value


def _plans(reader, versions):
    by_number = {row["number"]: row for row in versions}
    for number, cells in reader.rows("plan_versions", ("plan_version", "tables")):
        row = by_number.get(reader.value("plan_versions", number, "plan_version", cells["plan_version"], whole_number))
        if row is not None:
            row["tables"] = {key: [] for key in as_written(cells["tables"]).split(";") if key}
    for number, cells in reader.rows("plan_rows", ("plan_version", "table", "values")):
        version = reader.value("plan_rows", number, "plan_version", cells["plan_version"], whole_number)
        values = reader.value("plan_rows", number, "values", cells["values"] or "{}", as_json_value)
        rows = by_number.get(version, {}).get("tables", {}).get(as_written(cells["table"]))
        if rows is None:
            reader.refuse(
                "plan_rows.csv", number, "table", cells["table"], "that version of the plan has no such table"
            )
        else:
            rows.append(values)


def _series(reader, readings):
    by_id = {row["id"]: row for row in readings}
    for row in readings:
        row["series"] = []
    for number, cells in reader.rows("reading_values", ("reading_id", *SERIES)):
        values = {
            name: reader.value("reading_values", number, name, cells[name], any_number) if cells[name] else None
            for name in SERIES
        }
        if (row := by_id.get(cells["reading_id"])) is None:
            reader.refuse("reading_values.csv", number, "reading_id", cells["reading_id"], "there is no such reading")
        else:
            row["series"].append(values)
