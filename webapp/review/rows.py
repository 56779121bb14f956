"""What the table of readings and the page of one reading show, computed for all their readings at once."""

from dataclasses import dataclass

from calc.units import UNITS
from webapp.plan.day import today_of
from webapp.readings.layers import FinalReading, final
from webapp.review.derived import Derived, derive
from webapp.review.numbers import CORRECTABLE, as_typed


@dataclass(frozen=True)
class Row:
    """A reading as the table shows it; states are the words for its state."""

    reading: object
    final: FinalReading
    derived: Derived
    states: tuple

    def corrected(self, name):
        """Return whether a number was corrected."""
        return any(event.field == name for event in self.final.corrections)


@dataclass(frozen=True)
class NumberLine:
    """One number of a reading through its layers; typed_label the unit it was typed in."""

    name: str
    column: object
    typed: str
    typed_label: str
    raw: float | None
    final: float | None
    corrected: bool

    @property
    def missing(self):
        """Return whether there was never such a number."""
        return not (self.typed or self.corrected) and self.raw is None


def rows_of(survey, plan, readings):
    """Return a Row for each reading; plan is the newest PlanVersion or None."""
    finals = [final(reading) for reading in readings]
    prediction = today_of(survey, plan) if plan else None
    if hasattr(prediction, "missing"):
        prediction = None
    stations = (plan.tables.get("stations") or []) if plan else []
    derived = derive(survey, stations, prediction, finals)
    return [Row(*one, states_of(*one[:2])) for one in zip(readings, finals, derived, strict=True)]


def states_of(reading, as_it_stands):
    """Return the words for a reading's state."""
    words = ["set aside" if as_it_stands.set_aside else "used"]
    words += ["corrected"] if as_it_stands.corrections else []
    return (*words, "found odd") if reading.kept_findings else tuple(words)


def number_lines(row):
    """Return the layers of each number that may be corrected; also of those without a value."""
    lines = []
    for name, column in CORRECTABLE.items():
        typed, unit = as_typed(row.reading, name)
        label = UNITS[unit].label if unit in UNITS else unit
        raw, now = row.final.raw[name], getattr(row.final, name)
        lines.append(NumberLine(name, column, typed, label, raw, now, row.corrected(name)))
    return lines
