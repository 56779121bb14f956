"""Numbers, units, distances and times as people read them: one Show per survey, and the template filters."""

import math
from dataclasses import dataclass
from datetime import UTC
from decimal import Decimal
from zoneinfo import ZoneInfo

from calc.units import UNITS, convert

# quantity: (SI code, US code, decimals in SI, decimals in US)
QUANTITIES = {
    "plain": ("1", "1", 2, 2),
    "place": ("km", "[mi_i]", 2, 2),
    "length": ("km", "[mi_i]", 2, 2),
    "depth": ("m", "[ft_i]", 2, 1),
    "elevation": ("m", "[ft_i]", 0, 0),
    "temperature": ("Cel", "[degF]", 1, 1),
    "velocity": ("m/s", "[ft_i]/s", 2, 2),
    "flow": ("m3/s", "[ft_i]3/s", 3, 2),
    "pressure": ("mm[Hg]", "[in_i'Hg]", 0, 2),
    "oxygen": ("mg/L", "mg/L", 2, 2),
    "demand": ("mg/L", "mg/L", 1, 1),
    "percent": ("%", "%", 0, 0),
    "conductance": ("uS/cm", "uS/cm", 0, 0),
    "rate": ("/d", "/d", 3, 3),
    "areal": ("g/m2/d", "g/m2/d", 2, 2),
    "volumetric": ("mg/L/d", "mg/L/d", 2, 2),
}


@dataclass(frozen=True)
class Show:
    """How one survey's numbers are shown and typed. Everything stored is SI and km downstream of the outfall."""

    unit_system: str = "si"
    distance_rule: str = "downstream"
    outfall_mark: float | None = None
    time_zone: str = "UTC"

    @classmethod
    def of(cls, survey):
        """Return the Show of a survey."""
        return cls(survey.unit_system, survey.distance_rule, survey.outfall_mark, survey.time_zone)

    def unit_code(self, quantity):
        """Return the UCUM code of the unit shown."""
        if quantity == "place" and self.distance_rule != "downstream":
            return "[mi_i]" if self.distance_rule == "river_mile" else "km"
        return QUANTITIES[quantity][1 if self.unit_system == "us" else 0]

    def unit_label(self, quantity, unit=None):
        """Return the unit as people write it."""
        return UNITS[unit or self.unit_code(quantity)].label

    def place_label(self):
        """Return what a distance along the river is called here."""
        names = {"river_km": "River kilometre", "river_mile": "River mile"}
        return names.get(self.distance_rule, "Distance below the outfall")

    def shown(self, quantity, value, unit=None):
        """Return an SI value as shown."""
        given, wanted = QUANTITIES[quantity][0], unit or self.unit_code(quantity)
        in_unit = float(value) if wanted == given else float(convert(value, given, wanted))
        if quantity == "place" and self.distance_rule != "downstream":
            return self.outfall_mark - in_unit
        return in_unit

    def to_si(self, quantity, value, unit=None):
        """Return a value as typed in SI."""
        if quantity == "place" and self.distance_rule != "downstream":
            value = self.outfall_mark - value
        return float(convert(value, unit or self.unit_code(quantity), QUANTITIES[quantity][0]))

    def number(self, quantity, value, digits=None):
        """Return an SI value as a rounded text in the unit shown; a dash where there is none."""
        if value is None or not math.isfinite(value):
            return "–"
        if digits is None:
            digits = QUANTITIES[quantity][3 if self.unit_system == "us" else 2]
        text = f"{self.shown(quantity, value):.{digits}f}"
        return text[1:] if float(text) == 0 and text.startswith("-") else text

    def text(self, quantity, value, digits=None):
        """Return an SI value as rounded text with its unit."""
        number = self.number(quantity, value, digits)
        label = self.unit_label(quantity)
        return number if number == "–" or not label else f"{number} {label}"

    def typed(self, quantity, value):
        """Return an SI value as somebody would type it into a form: no digits lost, none invented."""
        if value is None or value == "":
            return ""
        return plain_digits(self.shown(quantity, value))

    def place(self, distance_km):
        """Return a place along the river in words: "3.20 km below the outfall", "river mile 41.20"."""
        if distance_km is None or not math.isfinite(distance_km):
            return "–"
        if self.distance_rule != "downstream":
            return f"{self.place_label().lower()} {self.number('place', distance_km)}"
        side = "above" if distance_km < 0 else "below"
        return f"{self.text('length', abs(distance_km))} {side} the outfall"

    def local(self, instant):
        """Return an instant as a local datetime."""
        return instant.astimezone(ZoneInfo(self.time_zone))

    def clock(self, instant):
        """Return the time of day, for example 05:42."""
        return self.local(instant).strftime("%H:%M") if instant else "–"

    def day_clock(self, instant):
        """Return day and time, for example Fri 14 Aug 05:42."""
        return self.local(instant).strftime("%a %-d %b %H:%M") if instant else "–"

    def when(self, instant, now):
        """Return the time of day of an instant, with its day where that is not the day of now."""
        return self.clock(instant) if self.local(instant).date() == self.local(now).date() else self.day_clock(instant)

    def typed_time(self, instant):
        """Return an instant as a datetime-local field takes it."""
        return self.local(instant).strftime("%Y-%m-%dT%H:%M") if instant else ""

    def iso(self, instant):
        """Return an instant in ISO 8601 with the survey's offset."""
        return self.local(instant).isoformat(timespec="seconds") if instant else ""


def plain_digits(value):
    """Return a number to ten digits as people type it, never as 8e-05."""
    return format(Decimal(f"{round(float(value), 10) + 0.0:.10g}"), "f")


def hours(value):
    """Return hours in words: "25 min", "3 h 10 min", "2 d 4 h"."""
    if value is None or not math.isfinite(value):
        return "–"
    minutes = round(abs(value) * 60)
    if minutes < 60:
        return f"{minutes} min"
    if minutes < 48 * 60:
        return f"{minutes // 60} h {minutes % 60:02d} min"
    return f"{minutes // 1440} d {minutes % 1440 // 60} h"


def from_now(instant, now):
    """Return when something is, against now: "in 25 min", "40 min ago"."""
    seconds = (instant.astimezone(UTC) - now.astimezone(UTC)).total_seconds()
    if abs(seconds) < 60:
        return "now"
    return f"in {hours(seconds / 3600)}" if seconds > 0 else f"{hours(-seconds / 3600)} ago"


def signed(value, digits=1):
    """Return a number with its sign: "+0.4", "−1.2"."""
    if value is None or not math.isfinite(value):
        return "–"
    text = f"{abs(value):.{digits}f}"
    return text if float(text) == 0 else ("+" if value > 0 else "\u2212") + text


def register(app):
    """Make the plain functions template filters."""
    app.jinja_env.filters.update(hours=hours, signed=signed)
    app.jinja_env.globals.update(from_now=from_now)
