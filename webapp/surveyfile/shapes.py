"""What the rows of meters, visits, bottles and reviews may hold, and what stands in their lists and objects.

Each function of SHAPES gives the columns of a row that no form could have stored so: pages and the dataset read them
without another look.
"""

import math
import re
from datetime import datetime

from calc.units import UNITS
from webapp.bottles.words import ANALYSES, CENSORS, CONTROLS, POSITIONS
from webapp.bottles.words import KINDS as BOTTLE_KINDS
from webapp.meters.words import ACTIONS, KINDS, METHODS, PARAMETERS, PERCENT_BASES, STANDARDS
from webapp.readings.columns import PRESSURE_SOURCES
from webapp.visits.layers import TIMES
from webapp.visits.words import CHOICES as FACT_CHOICES
from webapp.visits.words import NUMBERS as FACT_NUMBERS

CHOICES = {
    "meter": {"method": ("", *METHODS), "percent_basis": PERCENT_BASES},
    "meter_check": {
        "kind": KINDS,
        "parameter": PARAMETERS,
        "standard": STANDARDS,
        "pressure_source": PRESSURE_SOURCES,
        "action": ("", *ACTIONS),
    },
    "meter_check_event": {"kind": ("set_aside", "restored")},
    "bottle": {"analysis": ANALYSES, "kind": BOTTLE_KINDS, "position": POSITIONS},
    "lab_result": {"censor": CENSORS},
    "survey_event": {"kind": ("reviewed", "approved", "reopened")},
}
_DAY = re.compile(r"(\d{4}-\d{2}-\d{2})?", re.ASCII)
_ANY_NUMBER = (-1e6, 1e6)
_FLOAT_FACTS = ("float_distance_m", "float_time_s", "surface_velocity_m_s", "velocity_m_s")
_FACT_TEXTS = ("crew", "water_look", "note", "partial_reason")
_SERIES = {"after_s": (0, 1e6), "do_mg_l": (-1, 100), "water_temp_c": (-5, 50)}
# A meter that is further off is not corrected, and its readings are not reported.
_DRIFT = {"scale": (0.01, 100), "shift": (-100, 100)}
_DRIFT_NUMBERS = ("start_h", "end_h", "expected", "read", "error")


def is_number(value, limits=_ANY_NUMBER):
    """Return whether a value is a finite number within limits that are included."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        return False
    return math.isfinite(value) and limits[0] <= value <= limits[1]


def is_time(value):
    """Return whether a value is ISO text of a time with its offset."""
    try:
        instant = datetime.fromisoformat(value)
    except (TypeError, ValueError):
        return False
    return instant.tzinfo is not None and 1990 <= instant.year <= 2200


def is_typed(value, units):
    """Return whether a value is {name: {"text", "unit"}}, the unit one of these."""
    return isinstance(value, dict) and all(
        isinstance(one, dict) and isinstance(one.get("text"), str) and str(one.get("unit")) in units
        for one in value.values()
    )


def is_findings(value):
    """Return whether a value is a list of objects of texts."""
    return isinstance(value, list) and all(
        isinstance(one, dict) and all(isinstance(text, str) for text in one.values()) for one in value
    )


def _texts(value):
    return isinstance(value, list) and all(isinstance(one, str) for one in value)


def _bad(**fits):
    """Return the names of what does not fit."""
    return [name for name, fit in fits.items() if not fit]


def _number_or_none(row, column, limits=_ANY_NUMBER):
    return row.get(column) is None or is_number(row[column], limits)


def _reading(row):
    series = row.get("series", [])
    fits = isinstance(series, list) and all(
        isinstance(one, dict)
        and set(one) <= set(_SERIES)
        and all(value is None or is_number(value, _SERIES[name]) for name, value in one.items())
        for one in series
    )
    return _bad(series=fits, soak_s=_number_or_none(row, "soak_s", (0, 1e6)))


def _reading_event(row):
    told = row.get("particulars", {})
    if not isinstance(told, dict):
        return ["particulars"]
    if row["kind"] != "drift":
        return []
    fits = all(is_number(told.get(name), limits) for name, limits in _DRIFT.items())
    fits = fits and all(told.get(name) is None or is_number(told[name]) for name in _DRIFT_NUMBERS)
    texts = [value for name, value in told.items() if name not in (*_DRIFT, *_DRIFT_NUMBERS)]
    return _bad(particulars=fits and all(isinstance(value, str) for value in texts))


def _meter(row):
    return _bad(
        name=bool(row["name"].strip()),
        cap_changed_on=_DAY.fullmatch(row.get("cap_changed_on", "")),
        serviced_on=_DAY.fullmatch(row.get("serviced_on", "")),
        resolution_mg_l=_number_or_none(row, "resolution_mg_l", (0, 30)),
    )


def _meter_check(row):
    parameter = PARAMETERS[row.get("parameter", "do")]
    judged = row.get("judged", {})
    return _bad(
        standard=row["standard"] in parameter.standards,
        value=is_number(row["value"], (parameter.low, parameter.high)),
        expected=_number_or_none(row, "expected"),
        compared=_number_or_none(row, "compared"),
        water_temp_c=_number_or_none(row, "water_temp_c", (-10, 100)),
        pressure_mmhg=_number_or_none(row, "pressure_mmhg", (0, 1200)),
        conductance_us_cm=_number_or_none(row, "conductance_us_cm", (0, 1e6)),
        expires_on=_DAY.fullmatch(row.get("expires_on", "")),
        entered=is_typed(row.get("entered", {}), ("", *UNITS)),
        judged=isinstance(judged, dict) and _is_judged(judged),
    )


def _is_judged(judged):
    kinds = {"says": str, "grade": str, "passes": bool, "settings": int}
    fits = all(judged.get(name) is None or isinstance(judged[name], kind) for name, kind in kinds.items())
    fits = fits and all(judged.get(name) is None or is_number(judged[name]) for name in ("error", "limit"))
    kept = judged.get("kept") or []
    return fits and is_findings(kept) and all("says" in one for one in kept)


def _visit_entry(row):
    facts = row.get("facts", {})
    return _bad(
        seen=_texts(row.get("seen", [])),
        facts=isinstance(facts, dict) and all(value is None or _is_fact(name, value) for name, value in facts.items()),
        entered=is_typed(row.get("entered", {}), ("", *UNITS)),
    )


def _is_fact(name, value):
    if name in TIMES:
        return is_time(value)
    if name in FACT_NUMBERS:
        return is_number(value, (FACT_NUMBERS[name].low, FACT_NUMBERS[name].high))
    if name in _FLOAT_FACTS:
        return is_number(value)
    if name in FACT_CHOICES:
        return isinstance(value, str) and value in FACT_CHOICES[name]
    # What a newer Bankside may tell is kept, and shown by nobody.
    return isinstance(value, str) if name in _FACT_TEXTS else isinstance(value, str | int | float | bool)


def _bottle(row):
    return _bad(
        code=bool(row["code"].strip()),
        sample_depth_m=_number_or_none(row, "sample_depth_m", (0, 100)),
        volume_ml=_number_or_none(row, "volume_ml", (0, 1e6)),
        entered=is_typed(row.get("entered", {}), ("", *UNITS)),
    )


def _hand_over(row):
    bottles = _texts(row.get("bottles", []))
    return _bad(bottles=bottles, temperature_c=_number_or_none(row, "temperature_c", (-100, 100)))


def _lab_result(row):
    limited = row.get("censor", "none") != "none"
    quality = row.get("quality", {})
    return _bad(
        value=_number_or_none(row, "value") and not (limited and row.get("value") is not None),
        limit_value=_number_or_none(row, "limit_value") and not (limited and row.get("limit_value") is None),
        arrival_temp_c=_number_or_none(row, "arrival_temp_c", (-100, 100)),
        entered=is_typed(row.get("entered", {}), ("", *UNITS)),
        quality=isinstance(quality, dict)
        and set(quality) <= set(CONTROLS)
        and all(one is None or is_number(one) for one in quality.values()),
    )


SHAPES = {
    "reading": _reading,
    "reading_event": _reading_event,
    "meter": _meter,
    "meter_check": _meter_check,
    "visit_entry": _visit_entry,
    "bottle": _bottle,
    "hand_over": _hand_over,
    "lab_result": _lab_result,
}
