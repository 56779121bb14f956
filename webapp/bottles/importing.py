"""Laboratory results from a table: checked cell by cell, then stored together or not at all."""

import json
import uuid
from collections import Counter
from datetime import UTC

from webapp.bottles import queries, service
from webapp.bottles.columns import RESULTS, read_result
from webapp.bottles.forms import out_of_order
from webapp.bottles.new import NewResult
from webapp.bottles.words import CONTROLS
from webapp.display import Show
from webapp.forms import FURTHEST_AHEAD, NotANumber
from webapp.surveys.service import remember
from webapp.tablefile import BadCell, read_table, write_table
from webapp.tablehead import written_head
from webapp.tablepreview import Preview, in_table_order

_IMPORTED = uuid.UUID("0f0b9a52-6a55-5c11-8d0a-8b1c0e6c6a3e")
_TIMES = ("arrived_at", "started_at", "finished_at")
_TEXTS = ("laboratory", "lab_number", "method", "analyst", "note")


def preview(db, survey, text, now):
    """Return the Preview of a table of results as text: what is wrong or, where nothing is, what would be stored."""
    file = read_table(text, RESULTS, Show.of(survey))
    errors = list(file.errors)
    bottles = {one.code.casefold(): one for one in queries.bottles_of(db, survey.id)}
    if not file.header_errors:
        for number, row, typed in zip(file.numbers, file.rows, file.cells, strict=True):
            errors += _impossible(number, row, typed, bottles, now + FURTHEST_AHEAD)
    found = Preview(file, in_table_order(errors, RESULTS))
    if not found.good:
        return found
    made = _results(survey, file, bottles)
    new = tuple(one for one in made if queries.find_result(db, one[1].id) is None)
    return Preview(file, (), new, len(made) - len(new))


def import_results(db, survey, found, by_id):
    """Store the results of a good Preview in one transaction; return how many. The same rows twice are stored once."""
    if found.new:
        told = {"added": len(found.new), "known": found.known}
        remember(db, survey.id, by_id, "laboratory results imported", particulars=told)
    for _, one in found.new:
        service.put_result(db, survey, one, by_id)
    db.commit()
    return len(found.new)


def columns_in_words(show):
    """Return (name with unit, what it says) of each column an import understands."""
    return [(written_head(column, show), column.help) for column in RESULTS.columns]


def empty_sheet(show, bottles):
    """Return a table as CSV with the right column names and a row for each bottle, to fill in."""
    return write_table([{"code": one.code} for one in bottles], RESULTS, show)


def _impossible(number, row, typed, bottles, latest):
    """Return a BadCell for whatever in a row can't be, as the form refuses it."""

    def bad(key, message):
        return BadCell(number, RESULTS.column(key).label, typed.get(key, "")[:100], message)

    bottle = bottles.get((row.get("code") or "").casefold())
    times = {name: row.get(name) for name in _TIMES}
    if row.get("code") and bottle is None:
        yield bad("code", "This survey has no bottle with this code. Compare it with the label.")
    for name, at in times.items():
        if at is not None and at > latest:
            yield bad(name, "That time is still to come; check the date and the hour.")
    for name, message in (out_of_order(bottle, **times) if bottle else {}).items():
        yield bad(name, message)
    try:
        censor, value, limit = read_result(row.get("result") or "")
    except NotANumber as trouble:
        means = f"Say which you mean: {trouble}." if "two ways" in str(trouble) else "Write a number, or <2, or >300."
        yield bad("result", means)
    else:
        if value is None and limit is None and not any(times.values()):
            yield bad("result", "There is neither a result nor a time in this row. Fill it in, or take the row out.")
        if censor != "none" and row.get("limit_value") not in (None, limit):
            yield bad("limit_value", "The result names another limit; write one of the two.")


def _results(survey, file, bottles):
    """Return (bottle, NewResult) of each row; its id follows from what it says, and how many like it came before."""
    made, seen = [], Counter()
    for row, cells, units in zip(file.rows, file.cells, file.units, strict=True):
        content = json.dumps([survey.id, row], sort_keys=True, default=lambda at: at.astimezone(UTC).isoformat())
        bottle = bottles[row["code"].casefold()]
        entered = {
            key: {"text": text, "unit": units.get(key) or "1"} for key, text in cells.items() if _typed(key, text)
        }
        censor, value, limit = read_result(row.get("result") or "")
        new = NewResult(
            id=str(uuid.uuid5(_IMPORTED, f"{content}#{seen[content]}")),
            bottle_id=bottle.id,
            **{name: row.get(name) for name in (*_TIMES, "arrival_temp_c")},
            **{name: row.get(name) or "" for name in _TEXTS},
            censor=censor,
            value=value,
            limit_value=limit if limit is not None else row.get("limit_value"),
            quality={name: row[name] for name in CONTROLS if row.get(name) is not None},
            entered=entered,
        )
        made.append((bottle, new))
        seen[content] += 1
    return made


def _typed(key, text):
    """Return whether a cell holds a number as it was typed."""
    return bool(text) and (key in ("result", "limit_value", "arrival_temp_c") or key in CONTROLS)
