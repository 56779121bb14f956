"""Reads the published values beside these tests."""

import csv
from pathlib import Path

_PUBLISHED = Path(__file__).parent / "published"


def rows(name, *columns):
    """Return the table's rows: as dicts, or, where columns are named, as tuples of those columns.

    Lines that start with # name the table's source and are skipped. Text that reads as a number becomes a float.
    """
    lines = (_PUBLISHED / name).read_text(encoding="utf-8").splitlines()
    table = [
        {column: _value(text) for column, text in row.items()}
        for row in csv.DictReader(line for line in lines if not line.startswith("#"))
    ]
    return [tuple(row[column] for column in columns) for row in table] if columns else table


def inputs(text):
    """Return the numbers of a "U=0.15;H=0.3" column as a dict, leaving out parts without a number."""
    pairs = (part.strip().split("=", 1) for part in text.split(";") if "=" in part)
    values = {name.strip(): _value(value) for name, value in pairs}
    return {name: value for name, value in values.items() if isinstance(value, float)}


def _value(text):
    try:
        return float(text)
    except (TypeError, ValueError):
        return text
