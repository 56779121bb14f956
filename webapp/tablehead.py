"""Reads the header row of a table file: which column each name means, and the unit its numbers are in.

A name that is a column's own key ("depth_m", "from_km") is in SI whatever the survey shows. A name with a unit behind
it ("Depth (ft)", "depth, ft", "DO mg/L") is in that unit. Any other name is in the unit the survey shows.
"""

import re
from dataclasses import dataclass

from calc.units import UNITS
from webapp.columns import Column
from webapp.display import QUANTITIES, Show

WORDS = {"text", "choice", "yes_no", "time"}
BY_OTHER_NAMES = {
    "[ft_i]": "feet foot",
    "[mi_i]": "mile miles",
    "[in_i]": "inch inches",
    "m": "metre metres meter meters",
    "km": "kilometre kilometres kilometer kilometers",
    "Cel": "c degc celsius",
    "[degF]": "f degf fahrenheit",
    "[ft_i]/s": "fps ftpersecond",
    "[ft_i]3/s": "cfs cuft/s",
    "m3/s": "cms cumecs",
    "10*6.[gal_us]/d": "mgd",
    "mg/L": "ppm mgo2/l",
    "/d": "perday /day 1/day d-1 day-1",
    "/h": "perhour /hour h-1",
    "%": "percent %sat",
    "1": "m/m ft/ft fraction -",
    "hPa": "mb millibar",
    "h": "hr hrs hour hours",
    "min": "minutes mins",
    "uS/cm": "umho/cm",
}
PLACE_UNITS = {
    "km below the outfall": ("downstream", "km"),
    "mi below the outfall": ("downstream", "[mi_i]"),
    "river km": ("river_km", "km"),
    "river mile": ("river_mile", "[mi_i]"),
    "river kilometre": ("river_km", "km"),
    "rkm": ("river_km", "km"),
    "rm": ("river_mile", "[mi_i]"),
}
_IN_BRACKETS = re.compile(r"(?P<name>.*?)\s*(?:\((?P<round>[^()]*(?:\([^()]*\))?[^()]*)\)|\[(?P<square>[^][]+)\])\s*")
_BEHIND = re.compile(r"(?P<name>.+?)(?:,\s*|\s+in\s+|\s+|_)(?P<unit>[^\s,_]+)")


@dataclass(frozen=True)
class Head:
    """A column as a file has it: unit is the code its numbers are in, rule how its distances count. None: text."""

    column: Column
    name: str
    unit: str | None = None
    rule: str | None = None


class UnknownUnit(ValueError):
    """The name is known, its unit is not; the message says so."""


def plain_name(name):
    """Return a name without what does not matter: capitals, blanks, punctuation."""
    return re.sub(r"[\W_]+", "", name.replace("%", " percent ").casefold())


def plain_unit(name):
    """Return a unit as written, without what does not matter."""
    text = name.casefold().translate(str.maketrans("³²µμ·", "32uu.")).replace("°", "").replace("deg ", "deg")
    return re.sub(r"[\s^]+", "", text)


def _unit_names():
    names = {}
    for code, unit in UNITS.items():
        for name in (code, unit.label, *BY_OTHER_NAMES.get(code, "").split()):
            if name:
                names.setdefault(plain_unit(name), code)
    return names


UNIT_NAMES = _unit_names()


def read_head(name, table, show):
    """Return the Head for a header name, or None where the table has no such column. Raises UnknownUnit."""
    for column in table.columns:
        if name.strip().casefold() == column.key:
            return _own_key(column, name)
    if (bracketed := _IN_BRACKETS.fullmatch(name)) and (columns := _named(bracketed["name"], table)):
        unit = bracketed["round"] or bracketed["square"] or ""
        return _head(columns, name, unit.strip() or None, show)
    for column in table.columns:
        if plain_name(name) == plain_name(column.key) and column.quantity != "place":
            return _own_key(column, name)
    if columns := _named(name, table):
        return _head(columns, name, name if _place_unit(name) else None, show)
    behind = _BEHIND.fullmatch(name.strip())
    if behind and plain_unit(behind["unit"]) in UNIT_NAMES and (columns := _named(behind["name"], table)):
        return _head(columns, name, behind["unit"], show)
    return None


def _named(name, table):
    """Return the columns a name may mean, that of a full label first."""
    plain = plain_name(name)
    by_label = [column for column in table.columns if plain and plain == plain_name(column.label)]
    others = [column for column in table.columns if plain in {plain_name(also) for also in column.also}]
    return [*by_label, *(column for column in others if column not in by_label)]


def _own_key(column, name):
    if column.quantity in WORDS:
        return Head(column, name)
    return Head(column, name, QUANTITIES[column.quantity][0], "downstream" if column.quantity == "place" else None)


def _head(columns, name, unit, show):
    """Return the Head of the first of the columns that the unit fits."""
    for column in columns:
        if (head := _fitting(column, name, unit, show)) is not None:
            return head
    shown = sorted({show.unit_label(column.quantity) for column in columns if column.quantity not in WORDS} - {""})
    use = f"; use {' or '.join(shown)}, or leave the unit out" if shown else "; leave the brackets out"
    raise UnknownUnit(f"“{name}”: “{unit}” is no unit that Bankside can take here{use}.")


def _fitting(column, name, unit, show):
    if column.quantity in WORDS:
        return Head(column, name) if unit is None else None
    if column.quantity == "place":
        return _place_head(column, name, unit, show)
    if unit is None:
        return Head(column, name, show.unit_code(column.quantity))
    if column.quantity == "plain" and plain_unit(unit) in _unitless(column):
        return Head(column, name, "1")
    code = UNIT_NAMES.get(plain_unit(unit))
    if code is None or UNITS[code].quantity != UNITS[QUANTITIES[column.quantity][0]].quantity:
        return None
    return Head(column, name, code)


def _unitless(column):
    """Return the words that may stand in brackets behind a plain number."""
    if column.key.endswith("_min"):
        return {"min", "minutes"}
    return {"", "degrees", "deg", "decimaldegrees"} if column.key in {"latitude", "longitude"} else {""}


def _place_unit(name):
    """Return (rule, unit) where a name says how a place is counted; the rule is None where it gives the unit alone."""
    if (known := PLACE_UNITS.get(re.sub(r"[\s_]+", " ", name.casefold()).strip())) is not None:
        return known
    code = UNIT_NAMES.get(plain_unit(name))
    return (None, code) if code is not None and UNITS[code].quantity == "length" else None


def _place_head(column, name, unit, show):
    if unit is None:
        return Head(column, name, show.unit_code("place"), show.distance_rule)
    if (known := _place_unit(unit)) is None:
        return None
    rule, code = known
    if rule not in (None, "downstream", show.distance_rule):
        raise UnknownUnit(f"“{name}”: this survey does not count its distances by {unit}; see the survey's facts.")
    return Head(column, name, code, rule or show.distance_rule)


def place_words(show: Show):
    """Return the unit of a place as a file's header names it, for example "km below the outfall"."""
    return next(words for words, (rule, code) in PLACE_UNITS.items()
                if rule == show.distance_rule and code == show.unit_code("place"))  # fmt: skip


def written_head(column, show):
    """Return the header name that read_head reads back without doubt."""
    if column.quantity == "place":
        return f"{column.label} ({place_words(show)})"
    unit = "" if column.quantity in WORDS else show.unit_label(column.quantity)
    return f"{column.label} ({unit})" if unit else column.label


def shown_head(column, show):
    """Return the Head of a column in the unit and distance rule that the survey shows, as in its forms."""
    return _fitting(column, column.label, None, show)
