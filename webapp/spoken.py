"""calc speaks SI; this puts the numbers of its sentences into the units that a survey shows.

Air pressure stays as it is: it is typed in the unit that the barometer shows, whatever the survey's units are.
"""

import re

from calc.units import convert, convert_difference

NUMBER = r"([+\-\u2212]?\d+(?:\.\d+)?)"
BOTH = re.compile(rf" {NUMBER}(?: m²/s)? \({NUMBER} ft²/s\)")
WARMER = re.compile(rf"{NUMBER} °C(?= warmer| colder)")
PATTERNS = (
    (re.compile(rf"{NUMBER} °C"), "Cel", "[degF]", "°F", 0),
    (re.compile(rf"{NUMBER} m²/s"), "m2/s", "[ft_i]2/s", "ft²/s", -1),
    (re.compile(rf"{NUMBER} m/s"), "m/s", "[ft_i]/s", "ft/s", 0),
    (re.compile(rf"{NUMBER} m(?![\w²/³])"), "m", "[ft_i]", "ft", -1),
)


def register(app):
    """Give templates the filter: {{ finding.says | said(show) }}."""
    app.jinja_env.filters["said"] = lambda text, show: in_units_of(show, text)


def in_units_of(show, text):
    """Return a sentence of calc's checks as a survey in US customary units reads it; in SI it stays as it is."""
    if show.unit_system != "us" or not text:
        return text
    text = BOTH.sub(lambda found: f" {found[2]} ft²/s", text)
    text = WARMER.sub(lambda found: _said(found[1], convert_difference, "Cel", "[degF]", "°F", 0), text)
    for pattern, given, shown, label, digits in PATTERNS:
        text = pattern.sub(lambda found, to=(given, shown, label, digits): _said(found[1], convert, *to), text)
    return text


def _said(number, converted, given, shown, label, further_digits):
    """Return a number in another unit with about the digits it had."""
    plain = number.replace("\u2212", "-")
    digits = max(0, len(plain.partition(".")[2]) + further_digits)
    value = float(converted(float(plain), given, shown))
    return f"{value:.{digits}f} {label}".replace("-", "\u2212" if "\u2212" in number else "-")
