"""Cells of a dataset's CSV files back into values; each that can't be read is named by file, row and column."""

import csv
import io
import json
import re
from dataclasses import dataclass, field

from webapp.dataset.fields import as_written
from webapp.dataset.kept import holds_json, kind_of
from webapp.surveyfile.archive import LARGEST_UNPACKED, MOST_ROWS, BadSurveyFile
from webapp.surveyfile.rows import default_of, taken
from webapp.surveyfile.shapes import is_time

MOST_BAD = 50
_NUMBER = re.compile(r"-?\d+(\.\d+)?([eE][+-]?\d+)?", re.ASCII)
_YES_NO = {"true": True, "false": False}
# What was on a screen may be longer than the csv module takes for a cell by itself; the whole file is limited before.
csv.field_size_limit(max(csv.field_size_limit(), LARGEST_UNPACKED))


@dataclass(frozen=True)
class BadCell:
    """A cell that can't be read: row counts as a spreadsheet does, the header being row 1."""

    file: str
    row: int
    column: str
    typed: str
    message: str


class BadDataset(BadSurveyFile):
    """This is no dataset that can be imported; cells are those that can't be read."""

    def __init__(self, message, cells=()):
        super().__init__(message)
        self.cells = tuple(cells)


@dataclass
class Reader:
    """Reads the CSV files of a dataset and gathers what is bad about them."""

    files: dict
    bad: list = field(default_factory=list)

    def rows(self, table, wanted):
        """Return [(row number, {column: cell})] of a table. Raises BadDataset where it, or a column, is missing."""
        name = f"{table}.csv"
        if name not in self.files:
            raise BadDataset(
                f"{name} is missing. This zip is no dataset, or one of an older Bankside, which can't be read back."
            )
        try:
            lines = list(csv.reader(io.StringIO(self.files[name].decode("utf-8-sig"), newline=""), strict=True))
        except (UnicodeDecodeError, csv.Error) as wrong:
            raise BadDataset(f"{name} is no CSV file in UTF-8: {str(wrong)[:120]}") from wrong
        if len(lines) > MOST_ROWS:
            raise BadDataset(f"{name} has more than {MOST_ROWS} rows.")
        header = lines[0] if lines else []
        if absent := [column for column in wanted if column not in header]:
            raise BadDataset(f"{name} lacks the column {absent[0]}.")
        return [
            (number, dict(zip(header, cells, strict=True)))
            for number, cells in enumerate(lines[1:], start=2)
            if self._fits(name, number, header, cells)
        ]

    def _fits(self, name, number, header, cells):
        if len(cells) != len(header):
            self.refuse(name, number, "", "", f"the row has {len(cells)} cells, the header {len(header)}")
        return len(cells) == len(header)

    def refuse(self, name, number, column, cell, message):
        """Remember a bad cell, and give up where there are many."""
        self.bad.append(BadCell(name, number, column, cell[:60], message[:120]))
        if len(self.bad) >= MOST_BAD:
            self.stop()

    def stop(self):
        """Raise BadDataset if any cell was bad."""
        if self.bad:
            more = "at least " if len(self.bad) >= MOST_BAD else ""
            cells = "cell" if len(self.bad) == 1 else "cells"
            raise BadDataset(f"The dataset has {more}{len(self.bad)} {cells} that can't be read.", self.bad)

    def value(self, table, number, column, cell, way):
        """Return what way makes of a cell, or None where it is bad."""
        try:
            return way(cell)
        except (ValueError, TypeError, OverflowError, RecursionError) as wrong:
            self.refuse(f"{table}.csv", number, column, cell, str(wrong))
            return None


def way_of(column, named=None):
    """Return a function from a cell to the value of a stored column; it raises ValueError.

    named is {name: id} where the column points at rows that the dataset calls by a name.
    """
    if named is not None:
        return lambda cell: _named(column, as_written(cell), named)
    if holds_json(column):
        return lambda cell: _checked(column, cell, as_json_value)
    told = {"boolean": yes_no, "integer": whole_number, "number": any_number, "datetime": a_time}.get(kind_of(column))
    return lambda cell: _checked(column, cell, told or as_written)


def _named(column, name, named):
    if not name and column.nullable:
        return None
    if name not in named:
        raise ValueError("a value is missing" if not name else "the dataset does not say what that is")
    return named[name]


def _checked(column, cell, told):
    if cell == "":
        return _empty(column)
    return taken(column, told(cell))


def _empty(column):
    if column.nullable:
        return None
    if holds_json(column):
        return default_of(column)
    if kind_of(column) == "string" and not (column.primary_key or column.foreign_keys):
        return ""
    raise ValueError("a value is missing")


def a_time(cell):
    """Return the text of a time with its offset."""
    if not is_time(cell):
        raise ValueError("a time with its offset is wanted here, like 2026-08-12T06:30:00+02:00")
    return cell


def yes_no(cell):
    """Return true or false; spreadsheets write them in capitals."""
    if (value := _YES_NO.get(cell.casefold())) is None:
        raise ValueError("true or false is wanted here")
    return value


def whole_number(cell):
    """Return a whole number."""
    if not re.fullmatch(r"-?\d{1,10}", cell, re.ASCII):
        raise ValueError("a whole number is wanted here")
    return int(cell)


def any_number(cell):
    """Return a number with a decimal point."""
    if not _NUMBER.fullmatch(cell):
        raise ValueError("a number with a decimal point is wanted here")
    return float(cell)


def as_json_value(cell):
    """Return the object or list that a cell holds as JSON."""
    try:
        return json.loads(cell, parse_constant=_no_number)
    except ValueError as wrong:
        raise ValueError("JSON is wanted here") from wrong


def _no_number(_text):
    raise ValueError("no number")
