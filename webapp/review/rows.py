"""What the lists of readings and the page of one reading show, computed for all their readings at once."""

from dataclasses import dataclass

from calc.units import UNITS
from webapp.plan.day import today_of
from webapp.readings.judging import Judged
from webapp.readings.layers import FinalReading, final
from webapp.review.bulk import why_alone
from webapp.review.derived import Derived, derive
from webapp.review.numbers import CORRECTABLE, as_typed
from webapp.review.words import BRACKETS, QUALITY_NAMES, also_of, odd_of, review_of


@dataclass(frozen=True)
class Row:
    """A reading as its page shows it; states are the words for its state."""

    reading: object
    final: FinalReading
    derived: Derived
    states: tuple

    def corrected(self, name):
        """Return whether a number was corrected."""
        return any(event.field == name for event in self.final.corrections)


@dataclass(frozen=True)
class TableRow:
    """A reading as the table shows it."""

    judged: Judged
    derived: Derived

    @property
    def final(self):
        """Return the reading as it stands."""
        return self.judged.reading

    @property
    def states(self):
        """Return the words for its state."""
        return states_of(self.final, self.judged.kept)

    @property
    def moved(self):
        """Return whether its oxygen is not what was recorded."""
        return self.final.do_mg_l != self.final.raw["do_mg_l"]

    @property
    def quality(self):
        """Return its quality in a word or two."""
        return QUALITY_NAMES[self.judged.quality]

    @property
    def checks(self):
        """Return whether it lies between two passing checks, in words."""
        return BRACKETS[self.judged.bracket.state]

    @property
    def review(self):
        """Return what reviewers did about it, in words."""
        return review_of(self.final)


@dataclass(frozen=True)
class TodoRow:
    """A reading as the list of what needs a look shows it: odd in a sentence, also what else there is.

    alone says why it can't be kept together with others.
    """

    judged: Judged
    odd: str
    quality: str
    also: list
    review: str
    alone: str


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
    derived = derived_of(survey, plan, finals)
    return [
        Row(reading, now, more, states_of(now, reading.kept_findings))
        for reading, now, more in zip(readings, finals, derived, strict=True)
    ]


def table_rows(survey, plan, judged):
    """Return a TableRow for each Judged; plan is the newest PlanVersion or None."""
    derived = derived_of(survey, plan, [one.reading for one in judged])
    return [TableRow(*one) for one in zip(judged, derived, strict=True)]


def todo_rows(judged, person_id):
    """Return a TodoRow for each Judged, for a reviewer."""
    return [
        TodoRow(
            judged=one,
            odd=odd_of(one),
            quality=QUALITY_NAMES[one.quality],
            also=also_of(one),
            review=review_of(one.reading),
            alone=why_alone(one, person_id),
        )
        for one in judged
    ]


def derived_of(survey, plan, finals):
    """Return a Derived for each FinalReading, by the plan with what the day showed."""
    prediction = today_of(survey, plan) if plan else None
    if hasattr(prediction, "missing"):
        prediction = None
    stations = (plan.tables.get("stations") or []) if plan else []
    return derive(survey, stations, prediction, finals)


def states_of(now, kept_findings):
    """Return the words for the state of a FinalReading."""
    words = ["set aside" if now.set_aside else "used"]
    words += ["corrected"] if now.corrections else []
    words += ["corrected for drift"] if now.drift else []
    return (*words, "found odd") if kept_findings else tuple(words)


def number_lines(row):
    """Return the layers of each number that may be corrected; also of those without a value."""
    lines = []
    for name, column in CORRECTABLE.items():
        typed, unit = as_typed(row.reading, name)
        label = UNITS[unit].label if unit in UNITS else unit
        raw, now = row.final.raw[name], getattr(row.final, name)
        lines.append(NumberLine(name, column, typed, label, raw, now, row.corrected(name)))
    return lines
