"""Rows to lines of JSON and back; every value that comes in is checked against its column."""

import json
import math
import re
from datetime import UTC, datetime

from sqlalchemy import JSON, Boolean, Float, Integer, String

from webapp.models import UtcDateTime
from webapp.surveyfile.archive import MOST_ROWS, BadSurveyFile

_ID = re.compile(r"[0-9A-Za-z-]{1,36}")
NO_DEFAULT = object()
_NEWEST = "Update Bankside on this server, then import the file again."


def lines_of(rows):
    """Return rows as JSON Lines in UTF-8; the same rows give the same bytes."""
    return b"".join(_line(row) for row in rows)


def _line(row):
    told = {name: value.isoformat() if isinstance(value, datetime) else value for name, value in row.items()}
    text = json.dumps(told, ensure_ascii=False, sort_keys=True, separators=(",", ":"), allow_nan=False)
    return text.encode("utf-8") + b"\n"


def rows_in(one, content):
    """Return the rows of a carried table, each value as its column holds it. Raises BadSurveyFile."""
    lines = content.split(b"\n")
    if lines.pop() or len(lines) > MOST_ROWS:
        raise BadSurveyFile(f"{one.name}.jsonl ends in the middle of a row, or has more than {MOST_ROWS} of them.")
    rows = [_row(one, line, f"{one.name}.jsonl, row {number}") for number, line in enumerate(lines, 1)]
    if len({one.key_of(row) for row in rows}) != len(rows):
        raise BadSurveyFile(f"{one.name}.jsonl holds a row twice.")
    return rows


def _row(one, line, where):
    try:
        told = json.loads(line.decode("utf-8"), parse_constant=_no_number)
    except (ValueError, RecursionError) as wrong:
        raise BadSurveyFile(f"{where} can't be read.") from wrong
    if not isinstance(told, dict):
        raise BadSurveyFile(f"{where} is no row.")
    if further := sorted(set(told) - set(one.columns)):
        raise BadSurveyFile(f"{where} has “{further[0][:40]}”, which this Bankside does not know. {_NEWEST}")
    for name, column in one.columns.items():
        if name not in told:
            _default(column, where)
    return {name: _value(one.columns[name], value, f"{where}, {name}") for name, value in told.items()}


def _no_number(text):
    raise ValueError(f"{text} is no number")


def complete(one, row):
    """Return a row with what the Bankside that wrote it did not have yet."""
    return {name: row[name] if name in row else _default(column, "") for name, column in one.columns.items()}


def _default(column, where):
    if (value := default_of(column)) is NO_DEFAULT:
        raise BadSurveyFile(f"{where} lacks {column.name}.")
    return value


def default_of(column):
    """Return what a column holds where nothing was said, or NO_DEFAULT."""
    if column.default is not None and column.default.is_scalar:
        return column.default.arg
    if column.default is not None and column.default.is_callable and isinstance(column.type, JSON):
        return column.default.arg(None)
    return None if column.nullable else NO_DEFAULT


def _value(column, told, where):
    if told is None and column.nullable:
        return None
    try:
        return taken(column, told)
    except (ValueError, TypeError, OverflowError, RecursionError) as wrong:
        raise BadSurveyFile(f"{where}: {str(wrong)[:120]}") from wrong


def taken(column, told):
    """Return a value as its column holds it. Raises ValueError, TypeError, OverflowError or RecursionError."""
    return _reader(column)(column, told)


def _reader(column):
    kinds = ((UtcDateTime, _time), (JSON, _json), (Boolean, _boolean), (Integer, _whole), (Float, _number))
    for kind, reader in kinds:
        if isinstance(column.type, kind):
            return reader
    assert isinstance(column.type, String), f"no reader for {column}"
    return _id if column.primary_key or column.foreign_keys else _text


def _id(_column, told):
    if not isinstance(told, str) or not _ID.fullmatch(told):
        raise ValueError("this is no id")
    return told


def _text(column, told):
    if not isinstance(told, str):
        raise ValueError("text is wanted here")
    if column.type.length is not None and len(told) > column.type.length:
        raise ValueError(f"the text is longer than {column.type.length} characters")
    return _storable(told)


def _time(_column, told):
    instant = datetime.fromisoformat(told) if isinstance(told, str) else None
    if instant is None or instant.tzinfo is None or not 1990 <= instant.year <= 2200:
        raise ValueError("a time with its offset is wanted here")
    return instant.astimezone(UTC)


def _boolean(_column, told):
    if not isinstance(told, bool):
        raise ValueError("true or false is wanted here")
    return told


def _whole(_column, told):
    if isinstance(told, bool) or not isinstance(told, int) or abs(told) >= 2**31:
        raise ValueError("a whole number is wanted here")
    return told


def _number(_column, told):
    if isinstance(told, bool) or not isinstance(told, int | float) or not math.isfinite(told):
        raise ValueError("a number is wanted here")
    return float(told)


def _json(_column, told):
    if not isinstance(told, dict | list):
        raise ValueError("a list or an object is wanted here")
    _walk(told)
    return told


def _walk(told):
    """Refuse texts that no database takes, and numbers that are none, however deep they stand."""
    if isinstance(told, str):
        _storable(told)
    elif isinstance(told, float | int):
        _number(None, told if not isinstance(told, bool) else 0)
    elif isinstance(told, dict):
        for key, value in told.items():
            _storable(key)
            _walk(value)
    elif isinstance(told, list):
        for value in told:
            _walk(value)


def _storable(text):
    if "\x00" in text:
        raise ValueError("the text holds a NUL")
    text.encode("utf-8")  # half a surrogate pair raises
    return text
