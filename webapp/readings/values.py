"""The several raw values of a timed reading as a crew types them: "6.1 6.3 6.2".

A value may carry the seconds since the probe went in and the temperature then, as the form's script writes them:
"6.1@75/20.3".
"""

import re

from webapp.forms import NotANumber, read_number
from webapp.readings.columns import READINGS

MOST_VALUES = 60
LONGEST_SOAK_S = 4 * 3600.0
_ENTRY = re.compile(r"(?P<value>[^@/]+)(@(?P<after_s>[^@/]+))?(/(?P<temp>[^@/]+))?")


class BadValues(ValueError):
    """The text can't be read; the message says what to do."""


def read_values(text, show):
    """Return the raw values of a text in their order, each {"after_s", "do_mg_l", "water_temp_c"}. Raises BadValues.

    Values are separated by blanks, semicolons or lines; temperatures are in the unit that the survey shows.
    """
    words = [word for word in (one.strip(",") for one in re.split(r"[\s;]+", text)) if word]
    if not words:
        raise BadValues(_unreadable(text))
    if len(words) > MOST_VALUES:
        raise BadValues(f"These are {len(words)} values; {MOST_VALUES} are the most for one reading.")
    return tuple(_value(word, show) for word in words)


def _value(word, show):
    found = _ENTRY.fullmatch(word)
    if found is None:
        raise BadValues(_unreadable(word))
    value = _number(word, found["value"])
    after_s, temp = (None if part is None else _number(word, part) for part in (found["after_s"], found["temp"]))
    column = READINGS.column("do_mg_l")
    if not column.low <= value <= column.high:
        raise BadValues(f"Oxygen must lie between {column.low:g} and {column.high:g} mg/L; check “{word}”.")
    if after_s is not None and not 0 <= after_s <= LONGEST_SOAK_S:
        raise BadValues(f"A probe soaks for up to {LONGEST_SOAK_S / 3600:g} hours; check “{word}”.")
    return {"after_s": after_s, "do_mg_l": value, "water_temp_c": _temperature(word, temp, show)}


def _temperature(word, temp, show):
    if temp is None:
        return None
    column = READINGS.column("water_temp_c")
    water_temp_c = show.to_si("temperature", temp)
    if not column.low <= water_temp_c <= column.high:
        raise BadValues(f"No river has that temperature; check “{word}”.")
    return water_temp_c


def _number(word, text):
    try:
        return read_number(text)
    except NotANumber as trouble:
        if "two ways" in str(trouble):
            raise BadValues(f"Say which you mean: {trouble}.") from None
        raise BadValues(_unreadable(word)) from None


def _unreadable(word):
    return f"Enter numbers with blanks between them, for example 6.1 6.3 6.2; “{word[:20]}” is none."
