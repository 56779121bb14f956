"""Reads a table that somebody pasted or uploaded from a spreadsheet, and writes one that can be read back.

Every bad cell is named by its row as the spreadsheet counts it and by its column, with what was typed and what to do.
"""

import csv
import io
import re
from dataclasses import dataclass, replace

from webapp.display import plain_digits
from webapp.forms import LOOKS_GROUPED, MINUS_SIGNS
from webapp.tablecell import DOTTED_GROUPS, BadText, read_cell, written_cell
from webapp.tablehead import WORDS, UnknownUnit, read_head, written_head

MOST_ROWS = 2000
_COMMA = re.compile(r"[+-]?[0-9]*,[0-9]+")
_DOT = re.compile(r"[+-]?([0-9]*|[0-9]{1,3}(,[0-9]{3})+)\.[0-9]+")


@dataclass(frozen=True)
class BadCell:
    """A cell that can't be taken; row is counted as a spreadsheet does, the header being row 1."""

    row: int
    column_label: str
    typed: str
    message: str


@dataclass(frozen=True)
class TableFile:
    """A table as read: of each row its values in SI, cells as typed and unit codes by column key, and its number."""

    rows: tuple = ()
    columns_found: tuple = ()
    cells: tuple = ()
    units: tuple = ()
    numbers: tuple = ()
    errors: tuple = ()
    header_errors: tuple = ()
    ignored: tuple = ()

    @property
    def good(self):
        """Return whether everything could be taken."""
        return not self.errors and not self.header_errors


def decode(data):
    """Return the text of an uploaded file: UTF-8 or UTF-16 by their marks, else UTF-8, else Western European."""
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        return data.decode("utf-16", errors="replace")
    for encoding in ("utf-8-sig", "cp1252"):
        try:
            return data.decode(encoding)
        except UnicodeDecodeError:
            continue
    return data.decode("latin-1")


def read_table(text, table, show, zone=None):
    """Return the TableFile of a text. zone is that of times without offset, by default the survey's."""
    text = text.removeprefix("\ufeff").replace("\x00", "")
    records, trouble = _records(text, _delimiter(text, table, show))
    lines = [(number, [cell.strip() for cell in record]) for number, record in enumerate(records, start=1)]
    lines = [(number, record) for number, record in lines if any(record)]
    if not lines:
        return TableFile(header_errors=(trouble or "There is nothing in it. Copy the cells with the row of names.",))
    heads, header_errors, ignored = _read_heads(lines[0][1], table, show)
    if trouble:
        header_errors.append(trouble)
    if len(lines) - 1 > MOST_ROWS:
        header_errors.append(f"It has {len(lines) - 1} rows; at most {MOST_ROWS} are taken at once. Split it.")
        lines = lines[: MOST_ROWS + 1]
    reader = _Reader(heads, show, zone or show.time_zone, _decimal_comma(lines[1:], heads, header_errors))
    for number, record in lines[1:]:
        reader.read(number, record)
        reader.nameless(number, record, lines[0][1])
    return TableFile(
        rows=tuple(reader.rows),
        columns_found=tuple(head.column for head in heads.values()),
        cells=tuple(reader.cells),
        units=tuple(reader.units),
        numbers=tuple(number for number, _ in lines[1:]),
        errors=tuple(reader.errors),
        header_errors=tuple(header_errors),
        ignored=tuple(ignored),
    )


def _delimiter(text, table, show):
    """Return the delimiter under which the first line names most columns of the table."""
    first = next((line for line in text.splitlines() if line.strip()), "")
    if marked := re.fullmatch(r"sep=([;,\t])", first.strip(" \r\n")):
        return marked[1]

    def columns_named(delimiter):
        record = next(iter(_records(first, delimiter)[0]), [])
        named = 0
        for cell in record:
            try:
                named += read_head(cell.strip(), table, show) is not None
            except UnknownUnit:
                named += 1
        return named, first.count(delimiter)

    return max("\t;,", key=columns_named)


def _records(text, delimiter):
    """Return the records and None, or those before the trouble and what the trouble is."""
    for strict in (True, False):  # a spreadsheet copies a cell such as 5" pipe as it is; only an open quote is an error
        records = []
        try:
            records.extend(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=strict))
        except csv.Error as error:
            trouble = f"The quotation marks from row {len(records) + 1} on do not pair up; nothing below it was read."
            if not strict or "end of data" in str(error) or "field larger" in str(error):
                return records, trouble
        else:
            return (records[1:] if records and re.fullmatch(r"sep=.?", "".join(records[0])) else records), None
    return [], None


def _read_heads(names, table, show):
    """Return ({position: Head}, messages, names that are ignored)."""
    heads, errors, ignored, taken = {}, [], [], {}
    for position, name in enumerate(names):
        try:
            head = read_head(name, table, show) if name else None
        except UnknownUnit as unknown:
            errors.append(str(unknown))
            continue
        if head is None:
            ignored += [name[:80]] if name else []
        elif head.column.key in taken:
            errors.append(f"“{taken[head.column.key]}” and “{name}” both mean {head.column.label}; take one away.")
        else:
            heads[position] = head
            taken[head.column.key] = name
    if not heads and not errors:
        known = ", ".join(column.label for column in table.columns)
        errors.append(f"Its first row must name the columns; Bankside knows here: {known}.")
    elif not errors:
        missing = [column.label for column in table.columns if column.required and column.key not in taken]
        errors += [f"The column “{label}” is missing." for label in missing]
    return heads, errors, ignored


def _decimal_comma(lines, heads, header_errors):
    """Return whether the file writes decimal commas, None where it does not tell; a file that does both is an error."""
    numeric = [position for position, head in heads.items() if head.column.quantity not in WORDS]
    comma = dot = None
    for number, record in lines:
        for position in numeric:
            text = record[position].translate(MINUS_SIGNS) if position < len(record) else ""
            if DOTTED_GROUPS.fullmatch(text) or (_COMMA.fullmatch(text) and not LOOKS_GROUPED.fullmatch(text)):
                comma = comma or (text, number)
            elif _DOT.fullmatch(text):
                dot = dot or (text, number)
    if comma and dot:
        header_errors.append(
            f"Numbers are written with a comma ({comma[0]} in row {comma[1]}) and with a dot ({dot[0]} in row "
            f"{dot[1]}). Use one decimal mark throughout."
        )
        return None
    return True if comma else False if dot else None


class _Reader:
    """Reads the rows of one file, collecting the bad cells."""

    def __init__(self, heads, show, zone, decimal_comma):
        self.heads, self.decimal_comma = heads, decimal_comma
        self.show = replace(show, time_zone=zone)
        self.rows, self.cells, self.units, self.errors = [], [], [], []

    def read(self, number, record):
        """Take one record."""
        typed = {head.column.key: record[at] if at < len(record) else "" for at, head in self.heads.items()}
        row, units = {}, {}
        for head in self.heads.values():
            text = typed[head.column.key]
            head = self._in_unit_of_row(head, typed)
            units[head.column.key] = head.unit
            try:
                value = read_cell(head, text, self.show, self.decimal_comma)
            except BadText as bad:
                self.errors.append(BadCell(number, head.column.label, text[:100], str(bad)))
            else:
                row |= {} if value is None else {head.column.key: value}
        self.rows.append(row)
        self.cells.append(typed)
        self.units.append(units)

    def nameless(self, number, record, names):
        """Report the cells of a record above which no column name stands."""
        for at, text in enumerate(record):
            if text and (at >= len(names) or not names[at]):
                message = "No column name stands above this cell. Name its column, or empty it."
                self.errors.append(BadCell(number, f"column {letters(at)}", text[:100], message))

    def _in_unit_of_row(self, head, typed):
        """Return the head in the unit that the row's own cell "…_unit" names, where the table has such a column."""
        beside = next((one for one in self.heads.values() if one.column.key == f"{head.column.key}_unit"), None)
        if beside is None or not typed[beside.column.key]:
            return head
        try:
            return replace(head, unit=read_cell(beside, typed[beside.column.key], self.show))
        except BadText:
            return head


def letters(position):
    """Return the letters by which a spreadsheet names a column: A for 0, AA for 26."""
    text = ""
    while position >= 0:
        position, letter = divmod(position, 26)
        text, position = chr(65 + letter) + text, position - 1
    return text


def write_table(rows, table, show):
    """Return rows as CSV text in the units the survey shows, which read_table reads back as the same rows.

    Text that a spreadsheet would take for a formula gets an apostrophe before it, which read_table takes off again.
    """
    text = io.StringIO(newline="")
    writer = csv.writer(text, lineterminator="\r\n")
    with_unit = {column.key for column in table.columns if f"{column.key}_unit" in {one.key for one in table.columns}}
    writer.writerow(
        [column.label if column.key in with_unit else written_head(column, show) for column in table.columns]
    )
    for row in rows:
        writer.writerow([_written(row, column, with_unit, show) for column in table.columns])
    return text.getvalue()


def _written(row, column, with_unit, show):
    value, unit = row.get(column.key), row.get(f"{column.key}_unit")
    if column.key not in with_unit or value is None or not unit:
        return written_cell(column, value, show)
    return plain_digits(show.shown(column.quantity, value, unit))
