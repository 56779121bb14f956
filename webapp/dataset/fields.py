"""What a column of the dataset is: its name, type, unit and meaning, and how its values are written.

Columns that forms and imports know are taken from webapp.columns, so that no unit, limit or list is written twice.
"""

import json
import math
import re
from dataclasses import dataclass, field
from datetime import UTC, datetime
from decimal import Decimal
from functools import cached_property
from zoneinfo import ZoneInfo

from webapp.display import QUANTITIES

PLAIN_NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)")
FORMULA_STARTS = tuple("=+-@\t\r\n\uff1d\uff0b\uff0d\uff20")
APOSTROPHE = "'"
# Plain numbers that have a unit all the same.
_UNITS = {"latitude": "deg", "longitude": "deg"}
_ENDINGS = {"min": "min", "h": "h"}
_DECIMALS = 9
_WHOLE = datetime(2000, 1, 1, tzinfo=UTC)
_TYPES = {"text": "string", "choice": "string", "yes_no": "boolean", "time": "datetime"}


@dataclass(frozen=True)
class Field:
    """A column as the Table Schema has it; unit is a UCUM code, choices maps what may stand here to its words."""

    name: str
    title: str
    type: str = "string"
    unit: str = ""
    says: str = ""
    constraints: dict = field(default_factory=dict)
    choices: dict = field(default_factory=dict)

    def descriptor(self, fine=False):
        """Return the field as Table Schema writes it; fine says that its times are told to the microsecond."""
        parts = {"name": self.name, "type": self.type, "title": self.title}
        if says := self.description():
            parts["description"] = says
        if self.type == "datetime":
            parts["format"] = "%Y-%m-%dT%H:%M:%S.%f%z" if fine else "%Y-%m-%dT%H:%M:%S%z"
        if self.unit:
            parts["unit"] = self.unit
        constraints = dict(self.constraints)
        if self.choices:
            constraints["enum"] = [key for key in self.choices if key]
        return {**parts, "constraints": constraints} if constraints else parts

    def description(self):
        """Return what the column means, with the words of its choices."""
        words = "; ".join(f"{key}: {words}" for key, words in self.choices.items() if key)
        return " ".join(part for part in (self.says, f"One of: {words}." if words else "") if part)


@dataclass(frozen=True)
class DataTable:
    """One CSV file: its rows are dictionaries by field name; foreign maps a field to (table, field) it points at."""

    name: str
    title: str
    says: str
    fields: tuple
    key: tuple
    rows: list
    foreign: dict = field(default_factory=dict)

    @cached_property
    def fine(self):
        """Return the names of the time columns that need more than seconds: such a column is told so all through."""
        names = [one.name for one in self.fields if one.type == "datetime"]
        return {name for name in names if any((row.get(name) or _WHOLE).microsecond for row in self.rows)}


def text(name, title, says="", **more):
    """Return a text field."""
    return Field(name, title, "string", "", says, **more)


def number(name, title, unit="", says="", **more):
    """Return a number field."""
    return Field(name, title, "number", unit, says, **more)


def whole(name, title, says="", **more):
    """Return a field of whole numbers."""
    return Field(name, title, "integer", "", says, **more)


def yes_no(name, title, says="", **more):
    """Return a field that is true or false."""
    return Field(name, title, "boolean", "", says, **more)


def moment(name, title, says="", **more):
    """Return a field of times with their offset."""
    return Field(name, title, "datetime", "", says, **more)


def from_column(column):
    """Return the field that a column of webapp.columns becomes, with the limits that its forms hold it to."""
    kind = _TYPES.get(column.quantity, "number")
    constraints = {"required": True} if column.required else {}
    if kind == "number":
        if math.isfinite(column.low):
            constraints["minimum"] = column.low
        if math.isfinite(column.high):
            constraints["maximum"] = column.high
    says = column.help
    if column.quantity == "place":
        says = f"{says} Distance downstream of the outfall; negative above it.".strip()
    return Field(column.key, column.label, kind, unit_of(column), says, constraints, column.choices)


def unit_of(column):
    """Return the UCUM code of a column's numbers, empty where they have none."""
    if column.quantity in _TYPES:
        return ""
    code = QUANTITIES[column.quantity][0]
    if code != "1":
        return code
    return _UNITS.get(column.key) or _ENDINGS.get(column.key.rsplit("_", 1)[-1], "")


def written(value, zone, timespec="seconds"):
    """Return a value as it stands in a CSV cell; zone is the survey's and timespec how fine, for times."""
    if value is None or value == "":
        return ""
    if isinstance(value, str):
        return harmless(value)
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, datetime):
        return iso(value, zone, timespec)
    if isinstance(value, int):
        return str(value)
    if isinstance(value, float):
        return exact(value)
    if isinstance(value, Decimal):
        return f"{value:f}"
    return harmless(as_json(value))


def as_json(value):
    """Return an object or a list as JSON: the same value, the same text."""
    return json.dumps(value, ensure_ascii=False, sort_keys=True, allow_nan=False)


def exact(value):
    """Return the shortest digits that read back as the same number, with a decimal point and without an exponent."""
    if not math.isfinite(value):
        return ""
    digits = repr(value)
    if "e" in digits:
        digits = f"{Decimal(digits):f}"
    digits = digits.removesuffix(".0")
    return "0" if digits == "-0" else digits


def decimal(value):
    """Return a computed number with a decimal point and without the digits that conversion invents."""
    if not math.isfinite(value):
        return ""
    digits = f"{round(value, _DECIMALS):.{_DECIMALS}f}".rstrip("0").rstrip(".")
    return "0" if digits == "-0" else digits


def iso(instant, zone, timespec="seconds"):
    """Return an instant in ISO 8601, with the offset the zone had then."""
    return instant.astimezone(ZoneInfo(zone)).isoformat(timespec=timespec) if instant else ""


def harmless(words):
    """Return text that no spreadsheet takes for a formula.

    An apostrophe goes before a text that begins like a formula and is no plain number, and before one that begins with
    an apostrophe itself, so that as_written can take exactly one away again.
    """
    plain = words.replace("\x00", "")
    if plain.startswith(APOSTROPHE) or (plain.startswith(FORMULA_STARTS) and not PLAIN_NUMBER.fullmatch(plain)):
        return APOSTROPHE + plain
    return plain


def as_written(cell):
    """Return the text that a cell was before harmless."""
    return cell.removeprefix(APOSTROPHE)
