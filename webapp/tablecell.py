"""One cell of a table file: its text into a value in SI, and a value into the text that reads back as the same."""

import re
from datetime import datetime
from math import isclose

from calc.units import convert
from webapp.display import QUANTITIES
from webapp.forms import Fields, NotANumber, read_number
from webapp.tablehead import WORDS, plain_name

LONGEST_CELL = 2000
FORMULA_STARTS = ("=", "+", "-", "@")
YES = {"yes", "y", "true", "1", "x"}
NO = {"no", "n", "false", "0"}
DOTTED_GROUPS = re.compile(r"[+-]?[0-9]{1,3}(\.[0-9]{3})+,[0-9]+")
_POWER = re.compile(r"(?P<digits>[^eE]+)[eE](?P<power>[+-]?[0-9]{1,2})")
_DAY_FIRST = re.compile(r"([0-9]{1,2})\.([0-9]{1,2})\.([0-9]{4})(.*)", re.DOTALL)


class BadText(ValueError):
    """A cell's text can't be taken; the message says what to do."""


def read_cell(head, text, show, decimal_comma=None):
    """Return the value of a cell's text, None where an empty one may be. Raises BadText."""
    column = head.column
    if len(text) > LONGEST_CELL:
        raise BadText(f"Shorten it to {LONGEST_CELL} characters or fewer; it has {len(text)}.")
    if not text:
        if column.required:
            raise BadText("It is empty; fill it in.")
        return None
    if column.quantity in WORDS:
        return {"text": _text, "choice": _choice, "yes_no": _yes_no, "time": _time}[column.quantity](column, text, show)
    return _in_range(head, _number(text, decimal_comma), show)


def _in_range(head, number, show):
    column = head.column
    # Twelve digits, and a rounded end of the range is that end: 104 °F is 40 °C, not a hair above it.
    value = float(f"{_to_si(head, number, show):.12g}")
    value = next((end for end in (column.low, column.high) if isclose(value, end, rel_tol=1e-9)), value)
    if not column.low <= value <= column.high:
        ends = sorted(_from_si(head, end, show) for end in (column.low, column.high))
        unit = show.unit_label(column.quantity, head.unit)
        raise BadText(f"It must lie between {ends[0]:.6g} and {ends[1]:.6g} {unit}".rstrip() + "; check it.")
    return value


def _to_si(head, number, show):
    stored_unit = QUANTITIES[head.column.quantity][0]
    if head.rule in (None, "downstream"):
        return float(convert(number, head.unit, stored_unit))
    return show.to_si("place", float(convert(number, head.unit, show.unit_code("place"))))


def _from_si(head, value, show):
    if head.rule in (None, "downstream"):
        return float(convert(value, QUANTITIES[head.column.quantity][0], head.unit))
    return float(convert(show.shown("place", value), show.unit_code("place"), head.unit))


def _number(text, decimal_comma):
    """Return a number as spreadsheets write it: with groups, or with a power of ten for the very small."""
    if decimal_comma and DOTTED_GROUPS.fullmatch(text):
        text = text.replace(".", "")
    power = _POWER.fullmatch(text)
    try:
        if decimal_comma and re.fullmatch(r"[+-]?[1-9][0-9]{0,2}\.[0-9]{3}", text):
            raise BadText(
                f"The other numbers have decimal commas: write {text.replace('.', ',')} or {text.replace('.', '')}."
            )
        number = read_number(power["digits"] if power else text, decimal_comma)
    except NotANumber as trouble:
        if "two ways" in str(trouble):
            raise BadText(f"Say which you mean: {trouble}.") from trouble
        raise BadText("Enter a number, for example 12.4.") from trouble
    return number * 10.0 ** int(power["power"]) if power else number


def _text(column, text, _show):
    if text.startswith("'") and text.lstrip("'").startswith(FORMULA_STARTS):
        text = text[1:]
    if len(text) > column.longest:
        raise BadText(f"Shorten it to {column.longest} characters or fewer; it has {len(text)}.")
    return text


def _choice(column, text, _show):
    """Return the key of a choice, typed as key or words, or as the beginning of words that fits no other."""
    plain = plain_name(text)
    options = {key: {plain_name(key), plain_name(words)} for key, words in column.choices.items()}
    exact = [key for key, names in options.items() if plain and plain in names]
    begun = [key for key, names in options.items() if len(plain) >= 3 and any(name.startswith(plain) for name in names)]
    found = exact or begun
    if len(found) != 1:
        raise BadText("Write one of: " + "; ".join(words for words in column.choices.values() if words) + ".")
    return found[0]


def _yes_no(_column, text, _show):
    if (plain := text.casefold()) in YES | NO:
        return plain in YES
    raise BadText("Write yes or no.")


def _time(_column, text, show):
    written = text
    if day_first := _DAY_FIRST.fullmatch(text):
        day, month, year, rest = day_first.groups()
        written = f"{year}-{int(month):02d}-{int(day):02d}{rest}"
    written = re.sub(r"^(\S{10})[ T]([0-9]):", r"\1T0\2:", written)
    fields = Fields({"time": written}, show)
    instant = fields.local_time("time", "time") if ":" in written else None
    if instant is None:
        default = "Write date and time as 2026-08-14 05:42."
        message = fields.errors.get("time", default)
        raise BadText(default if message.startswith("Enter") else message)
    return instant


def written_cell(column, value, show):
    """Return a value as text that read_cell reads back as the same value."""
    if value is None or value == "":
        return ""
    if column.quantity == "text":
        value = str(value)
        return f"'{value}" if value.lstrip("'").startswith(FORMULA_STARTS) else value
    if column.quantity == "choice":
        return column.choices.get(value, str(value))
    if column.quantity == "yes_no":
        return "yes" if value else "no"
    if column.quantity == "time":
        return show.iso(value) if isinstance(value, datetime) else str(value)
    return show.typed(column.quantity, value)
