"""Reads text fields into values, or into a message beside the field that says what to do."""

import re
import uuid
from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

from webapp.display import Show

NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)")
LOOKS_GROUPED = re.compile(r"[+-]?[1-9]\d{0,2},\d{3}")
# How far a clock may run ahead of the server's before a time is taken for a slip.
FURTHEST_AHEAD = timedelta(minutes=10)
MINUS_SIGNS = str.maketrans({"\u2212": "-", "\u2013": "-", "\u00a0": " "})


class NotANumber(ValueError):
    """The text is no number, or could be two; the message says which."""


def read_number(text, decimal_comma=None):
    """Return the number written with a decimal dot or comma.

    decimal_comma says which the writer uses where that is known (a whole file); then "1,234" is no riddle.
    """
    plain = text.translate(MINUS_SIGNS).strip()
    if decimal_comma is False and "," in plain:
        plain = _without_groups(plain)
    if not plain.isascii() or not NUMBER.fullmatch(plain):
        raise NotANumber("not a number")
    if decimal_comma is None and LOOKS_GROUPED.fullmatch(plain):
        either = plain.replace(",", ".").rstrip("0").rstrip("."), plain.replace(",", "")
        raise NotANumber(f"{plain} can be read in two ways: write {either[0]} or {either[1]}")
    return float(plain.replace(",", "."))


def _without_groups(plain):
    if re.fullmatch(r"[+-]?\d{1,3}(,\d{3})+(\.\d*)?", plain):
        return plain.replace(",", "")
    raise NotANumber("not a number")


def whole_number(text, otherwise=None):
    """Return the whole number that plain digits say, otherwise where they don't or are too many for a page to mean."""
    text = str(text or "")
    return int(text) if text.isascii() and text.isdigit() and len(text) <= 6 else otherwise


class Fields:
    """Takes fields from a form one by one; errors collects a message for each bad one, entered what was typed."""

    def __init__(self, source, show=None):
        self.source = source
        self.show = show or Show()
        self.errors = {}
        self.entered = {}

    def _raw(self, name):
        return str(self.source.get(name) or "").replace("\x00", "").strip()

    def refuse(self, name, message):
        """Set the field's message, unless it has one, and return None."""
        self.errors.setdefault(name, message)

    def holds(self, name):
        """Return whether anything was typed into a field."""
        return bool(self._raw(name))

    def text(self, name, label, longest=200, required=True):
        """Return the text, without surrounding blanks."""
        value = self._raw(name)
        if not value and required:
            return self.refuse(name, f"Enter the {label}.")
        if len(value) > longest:
            return self.refuse(name, f"Shorten the {label} to {longest} characters or fewer; it has {len(value)}.")
        return value

    def number(self, name, label, low, high, quantity="plain", required=True, unit=None):
        """Return the number in SI, or None where it may be missing.

        low and high are SI and included. The text is in the unit that the survey shows for the quantity, or in unit,
        a code of calc.units, where the person chose one.
        """
        text = self._raw(name)
        if not text:
            return self.refuse(name, f"Enter the {label}.") if required else None
        unit_code = unit or self.show.unit_code(quantity)
        self.entered[name] = {"text": text, "unit": unit_code}
        try:
            value = self.show.to_si(quantity, read_number(text), unit)
        except NotANumber as trouble:
            return self.refuse(name, self._number_message(label, trouble))
        if not low <= value <= high:
            return self.refuse(name, self._range_message(label, low, high, quantity, unit))
        return value

    def _number_message(self, label, trouble):
        if "two ways" in str(trouble):
            return f"Say which you mean: {trouble}."
        return f"Enter the {label} as a number, for example 12.4."

    def _range_message(self, label, low, high, quantity, unit):
        bounds = sorted((self.show.shown(quantity, low, unit), self.show.shown(quantity, high, unit)))
        unit_label = self.show.unit_label(quantity, unit)
        return f"The {label} must lie between {bounds[0]:.6g} and {bounds[1]:.6g} {unit_label}".strip() + "; check it."

    def choice(self, name, label, options, default=None):
        """Return one of the options, the default where nothing was sent."""
        value = self._raw(name) or default
        if value not in options:
            return self.refuse(name, f"Choose the {label} from the list.")
        return value

    def ticked(self, name):
        """Return whether a box was ticked."""
        return self._raw(name) not in {"", "no", "off", "0"}

    def uuid(self, name):
        """Return a client-made id as text."""
        try:
            return str(uuid.UUID(self._raw(name)))
        except ValueError:
            return self.refuse(name, "This form came without its id. Open it again and repeat what you typed.")

    def past_time(self, name, label, now, required=True):
        """Return the instant of a time as local_time does, but refuse one that is still to come."""
        return self.not_to_come(name, self.local_time(name, label, required), now)

    def not_to_come(self, name, instant, now):
        """Return an instant that may be missing, or refuse it where it is still to come."""
        if instant is not None and instant > now + FURTHEST_AHEAD:
            return self.refuse(name, "That time is still to come. Check the date, the hour and this phone's clock.")
        return instant

    def local_time(self, name, label, required=True):
        """Return the instant of a time written in the survey's zone, for example 2026-08-14T05:42."""
        text = self._raw(name)
        if not text:
            return self.refuse(name, f"Enter the {label}.") if required else None
        try:
            written = datetime.fromisoformat(text)
        except ValueError:
            return self.refuse(name, f"Enter the {label} as date and time, for example 2026-08-14 05:42.")
        if not 1990 <= written.year <= 2200:
            return self.refuse(name, f"Check the year of the {label}.")
        if written.tzinfo is not None:
            return written.astimezone(UTC)
        instant = written.replace(tzinfo=ZoneInfo(self.show.time_zone)).astimezone(UTC)
        if instant.astimezone(ZoneInfo(self.show.time_zone)).replace(tzinfo=None) != written:
            return self.refuse(name, f"That hour was skipped when the clocks changed; check the {label}.")
        return instant
