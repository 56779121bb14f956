"""Codes for stations added on site: next to their neighbours' in the order of the river, and never renumbering one."""

import re
import string

from webapp.plan.rows import next_codes

_NUMBERED = re.compile(r"(.*?)(\d+)([A-Z]*)")
_LONGEST = 12


def code_for(distance_km, stations, known):
    """Return a code for a new station: D10 below D9, D6A between D6 and D7, D0 above D1 below the outfall.

    stations are the plan's rows, known every code that the survey ever had.
    """
    used = {code.casefold() for code in (*known, *(row["code"] for row in stations))}
    below_outfall = [row for row in stations if (row["distance_km"] >= 0) == (distance_km >= 0)]
    ordered = sorted(below_outfall, key=lambda row: row["distance_km"])
    before = [row["code"] for row in ordered if row["distance_km"] <= distance_km]
    after = [row["code"] for row in ordered if row["distance_km"] > distance_km]
    found = next((code for code in _ways(before, after) if code.casefold() not in used and len(code) <= _LONGEST), None)
    return found or next_codes(used, 1)[0]


def _ways(before, after):
    """Yield codes in the order they suit, from the codes of the stations above and below."""
    if before and not after and (match := _NUMBERED.fullmatch(before[-1])):
        number = int(match[2])
        yield from (f"{match[1]}{number + step:0{len(match[2])}d}" for step in range(1, 100))
    elif before and (match := _NUMBERED.fullmatch(before[-1])):
        letters = string.ascii_uppercase
        last = letters.find(match[3]) if len(match[3]) == 1 else -1
        yield from (f"{match[1]}{match[2]}{letter}" for letter in letters[last + 1 :])
    elif after and (match := _NUMBERED.fullmatch(after[0])):
        yield f"{match[1]}{0:0{len(match[2])}d}"
        yield from (f"{match[1]}{0:0{len(match[2])}d}{letter}" for letter in string.ascii_uppercase)
