"""What a survey file would add to a server, and where the two differ. Rows are matched by id; what is here stays."""

import hashlib
import json
from dataclasses import dataclass
from datetime import datetime

from webapp.surveyfile.tables import CARRIED, NOT_COMPARED, NUMBERED, carried

_LONGEST_CODE = 12
# Rows that nobody knows by a name or a number, and everybody by when they were.
_TIMED = {"meter_check", "meter_check_event", "reading_event", "visit_entry", "hand_over", "lab_result", "survey_event"}


@dataclass(frozen=True)
class Difference:
    """A row that is here and in the file, but not alike: lines of (column, here, in the file), as text."""

    title: str
    lines: tuple


@dataclass(frozen=True)
class Outcome:
    """What importing a file does: rows to add by table, how many are here already, and all that needs a word."""

    survey_id: str
    name: str
    new: bool
    added: dict
    known: dict
    differences: tuple
    notes: tuple

    @property
    def total(self):
        """Return how many rows it adds."""
        return sum(len(rows) for rows in self.added.values())

    @property
    def counts(self):
        """Return (what the rows are called, to add, here already) of each table that the file has rows for."""
        return tuple(
            (CARRIED[name][1], len(self.added[name]), self.known[name])
            for name in CARRIED
            if self.added[name] or self.known[name]
        )

    @property
    def mark(self):
        """Return a mark of what was decided, so that a person who agreed to it agrees to nothing else."""
        told = {
            "added": {name: [carried()[name].key_of(row) for row in rows] for name, rows in self.added.items()},
            "differences": [(one.title, one.lines) for one in self.differences],
            "notes": self.notes,
        }
        return hashlib.sha256(json.dumps(told, sort_keys=True).encode()).hexdigest()[:16]


def merged(file, here):
    """Return the Outcome of a file's tables for a server that holds the rows here of that survey, if any."""
    survey = file["survey"][0]
    renumbered, notes = _renumbered(file, here)
    tables, renamed = _renamed(renumbered, here)
    notes += renamed
    added, known, differences = {}, {}, []
    codes = {row["id"]: row["code"] for row in here["station"]}
    for name in CARRIED:
        one = carried()[name]
        stored = {one.key_of(row): row for row in here[name]}
        fresh = [row for row in tables[name] if one.key_of(row) not in stored]
        both = [(stored[one.key_of(row)], row) for row in tables[name] if one.key_of(row) in stored]
        added[name], known[name] = fresh, len(both)
        differences += [found for pair in both if (found := _difference(one, *pair, codes)) is not None]
    added["survey_member"], kept_off = _members(added, here, {row["id"]: row["name"] for row in file["person"]})
    return Outcome(
        survey_id=survey["id"],
        name=here["survey"][0]["name"] if here["survey"] else survey["name"],
        new=not here["survey"],
        added=added,
        known=known,
        differences=tuple(differences),
        notes=tuple(notes + kept_off),
    )


def _renumbered(file, here):
    """Return the tables with the file's versions numbered as they are, or would be, here; and what to say of it.

    Where both sides made a version of the same number, all that is new in the file comes after the newest here, in
    its own order: no number is ever given twice, and the file's last version stays the last of the file's.
    """
    tables, notes = dict(file), []
    for name in NUMBERED:
        here_by_id = {row["id"]: row["number"] for row in here[name]}
        newest = max(here_by_id.values(), default=0)
        fresh = sorted((row for row in file[name] if row["id"] not in here_by_id), key=lambda row: row["number"])
        if fresh and fresh[0]["number"] <= newest:
            here_by_id |= {row["id"]: newest + place for place, row in enumerate(fresh, 1)}
            notes.append(
                f"{CARRIED[name][1]} were made on both sides. What is here keeps its number; the file's new ones come "
                f"after it, so that version {newest + len(fresh)}, the file's last, is the one in use afterwards."
            )
        tables[name] = [{**row, "number": here_by_id.get(row["id"], row["number"])} for row in file[name]]
        moved = sorted((told["number"], row["number"]) for told, row in zip(file[name], tables[name], strict=True))
        notes += [f"{CARRIED[name][0]} {told} of the file is version {number} here." for told, number in moved
                  if told != number]  # fmt: skip
    return tables, notes


def _renamed(file, here):
    """Return the tables with each station's code as it is, or would be, here; and what to say of it.

    A code is for one station for ever. Where each side gave the same code to a station of its own, the file's gets a
    further one here, also in the plans that came with it.
    """
    codes = _codes(file, here)
    if not codes:
        return file, []
    tables = dict(file)
    tables["station"] = [{**row, "code": codes.get(row["code"], row["code"])} for row in file["station"]]
    tables["plan_version"] = [{**row, "tables": _plan(row["tables"], codes)} for row in file["plan_version"]]
    tables["decision"] = [
        {**row, "chosen": codes.get(row["chosen"], row["chosen"])} if row["kind"] == "station" else row
        for row in file["decision"]
    ]
    notes = [
        f"Station {told} of the file is {code} here, since {told} is another station here. What people wrote about "
        "it keeps the old code."
        for told, code in sorted(codes.items())
    ]
    return tables, notes


def _codes(file, here):
    """Return {code in the file: code here} of the stations whose codes differ."""
    here_by_id = {row["id"]: row["code"] for row in here["station"]}
    taken = {code.casefold() for code in here_by_id.values()}
    avoid = taken | {row["code"].casefold() for row in file["station"]}
    codes = {}
    for row in file["station"]:
        code = here_by_id.get(row["id"])
        if code is None:
            code = row["code"]
            if code.casefold() in taken:
                code = _free_code(code, avoid)
                avoid.add(code.casefold())
        if code != row["code"]:
            codes[row["code"]] = code
    return codes


def _free_code(code, avoid):
    number = 2
    while True:
        end = f"-{number}"
        if (free := code[: _LONGEST_CODE - len(end)] + end).casefold() not in avoid:
            return free
        number += 1


def _plan(tables, codes):
    if "stations" not in tables:
        return tables
    rows = [{**row, "code": codes.get(row["code"], row["code"])} for row in tables["stations"]]
    return {**tables, "stations": rows}


def _members(added, here, names):
    """Return the members to add, without those whom this server took off the survey; and what to say of them."""
    off = {row["entity_id"] for row in here["history"] if row["what"] == "person removed"}
    kept_off = [row["person_id"] for row in added["survey_member"] if row["person_id"] in off]
    notes = [f"{names[one]} was taken off the survey here, and stays off it." for one in kept_off]
    return [row for row in added["survey_member"] if row["person_id"] not in off], notes


def _difference(one, here, told, codes):
    skipped = NOT_COMPARED.get(one.name, set())
    lines = tuple(
        line
        for name, value in told.items()
        if name not in skipped and value != here[name]
        for line in _lines(name, here[name], value)
    )
    return Difference(_title(one, here, codes), lines) if lines else None


def _lines(name, here, told):
    """Return what differs, part by part where both are objects."""
    if isinstance(here, dict) and isinstance(told, dict):
        parts = sorted(set(here) | set(told))
        return [(f"{name}, {part}", _text(here.get(part)), _text(told.get(part))) for part in parts
                if here.get(part) != told.get(part)]  # fmt: skip
    return [(name, _text(here), _text(told))]


def _title(one, row, codes):
    if one.name == "reading":
        return f"Reading at {codes[row['station_id']]}, {row['taken_at']:%Y-%m-%d %H:%M} UTC"
    if instant := next(
        (row[name] for name in ("checked_at", "at", "made_at") if one.name in _TIMED and name in row), None
    ):
        return f"{one.one}, {instant:%Y-%m-%d %H:%M} UTC"
    named = next((str(row[name]) for name in ("name", "code", "number", "what") if row.get(name)), "")
    return f"{one.one} {named or one.key_of(row)[0]}"


def _text(value):
    if value is None or value == "":
        return "nothing"
    if isinstance(value, dict) and set(value) == {"text", "unit"}:
        return f"{value['text']} {value['unit']}"  # a number as it was typed
    if isinstance(value, str):
        return value
    return json.dumps(value, ensure_ascii=False, sort_keys=True, default=_plain)


def _plain(value):
    return value.isoformat() if isinstance(value, datetime) else str(value)
