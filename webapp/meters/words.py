"""What meters, checks and standards are called, and which numbers a form takes of them.

The keys of kinds, parameters and standards are those of calc.quality_meter.
"""

from dataclasses import dataclass

from calc.units import UNITS

METHODS = {
    "optical": "Optical",
    "membrane": "Membrane",
    "titration": "Titration kit",
    "other": "Other",
    "": "Not noted",
}
PERCENT_BASES = {"local": "the air pressure where it is", "760": "760 mmHg"}
KINDS = {
    "as_found": "As found",
    "adjusted": "Adjusted",
    "read_back": "Read back after adjusting",
    "field": "Field check on the way",
    "zero": "Zero check",
    "end_of_day": "End of the day",
    "after_cleaning": "After cleaning",
}
SHORT_KINDS = {
    "as_found": "As found",
    "adjusted": "Adjusted",
    "read_back": "Read back",
    "field": "Field check",
    "zero": "Zero check",
    "end_of_day": "End check",
    "after_cleaning": "After cleaning",
}
# What a button says that leads to a check.
BUTTONS = {
    "as_found": "Check as found",
    "adjusted": "Adjust, then enter it",
    "read_back": "Read back",
    "field": "Field check",
    "zero": "Zero check",
    "end_of_day": "End-of-day check",
    "after_cleaning": "Check after cleaning",
}
ACTIONS = {
    "none": "Nothing",
    "adjusted": "Adjusted",
    "cap_changed": "Cap or membrane changed",
    "withdrawn": "Taken out of use",
}
MADE_WITH_AIR = ("air_saturated_water", "water_saturated_air")
STANDARDS = {
    "air_saturated_water": "Air-saturated water",
    "water_saturated_air": "Water-saturated air",
    "zero_solution": "Zero solution",
    "winkler": "Winkler titration",
    "second_meter": "A second meter",
    "reference_thermometer": "Reference thermometer",
    "conductance_standard": "Conductance standard",
    "ph_buffer": "pH buffer",
}


@dataclass(frozen=True)
class Parameter:
    """What a meter measures: its words, the limits of what it can show (SI), and what it is checked against.

    shows is how many decimals a check is told with, suggests an example of the number.
    """

    words: str
    label: str
    quantity: str
    low: float
    high: float
    standards: tuple
    digits: int


PARAMETERS = {
    "do": Parameter(
        "Oxygen",
        "oxygen",
        "oxygen",
        -0.5,
        30.0,
        (*MADE_WITH_AIR, "zero_solution", "winkler", "second_meter"),
        2,
    ),
    "temperature": Parameter(
        "Temperature", "temperature", "temperature", -5.0, 45.0, ("reference_thermometer", "second_meter"), 2
    ),
    "conductance": Parameter(
        "Conductance", "conductance", "conductance", 0.0, 100000.0, ("conductance_standard", "second_meter"), 0
    ),
    "ph": Parameter("pH", "pH", "plain", 0.0, 14.0, ("ph_buffer", "second_meter"), 2),
}

# What a form asks for, as a check tells what was typed.
TYPED = {
    "value": "shown",
    "water_temp_c": "temperature",
    "compared": "compared",
    "pressure": "pressure",
    "conductance_us_cm": "conductance",
}
FACTS = {
    "method": "Method",
    "maker": "Maker",
    "model": "Model",
    "serial": "Serial number",
    "cap_changed_on": "Cap or membrane changed on",
    "serviced_on": "Factory service",
    "resolution_mg_l": "Smallest step",
    "percent_basis": "Percent refers to",
    "out_of_service": "Out of service",
    "note": "Note",
}


def kinds_for(parameter):
    """Return the kinds of check of a parameter with their words: zero is a check of oxygen only."""
    return {key: words for key, words in KINDS.items() if key != "zero" or (parameter or "do") == "do"}


def standards_for(parameter):
    """Return what a Parameter is checked against, with the words."""
    return {key: STANDARDS[key] for key in parameter.standards}


def verdict_word(verdict):
    """Return whether a check passes, in words; one that ends a day may ask for a correction instead."""
    if verdict.passes is None:
        return "Can't be judged"
    if verdict.passes:
        return "Passes"
    return "Does not pass" if verdict.reportable else "Does not pass: do not report"


def fact(value):
    """Return a fact about a meter as its history tells it."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    return "nothing" if value in (None, "") else str(value)


def unit_words(code):
    """Return a unit as people write it."""
    return UNITS[code].label if code in UNITS else code


def value_text(show, parameter, value):
    """Return a value of a parameter as rounded text with its unit; a dash where there is none."""
    what = PARAMETERS[parameter]
    return show.text(what.quantity, value, what.digits)


def difference_text(show, parameter, difference):
    """Return a difference of a parameter with its sign and unit."""
    what = PARAMETERS[parameter]
    factor = 1.8 if what.quantity == "temperature" and show.unit_system == "us" else 1.0
    unit = show.unit_label(what.quantity)
    if difference is None or difference != difference:
        return "–"
    text = f"{abs(difference) * factor:.{what.digits}f}"
    sign = "" if float(text) == 0 else ("+" if difference > 0 else "\u2212")
    return f"{sign}{text} {unit}".strip()
