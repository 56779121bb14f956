"""What the lists of readings are filtered by, and what somebody decides about a reading."""

import math
from dataclasses import dataclass
from datetime import date, datetime

from webapp.forms import Fields, whole_number
from webapp.readings.quality_words import QUALITIES, REASONS
from webapp.review.numbers import CORRECTABLE

STATES = {
    "all": "All",
    "used": "Used",
    "set_aside": "Set aside",
    "corrected": "Corrected",
    "findings": "With findings",
}
LOOKS = {
    "todo": "To look at",
    "answered": "Answered by the crew",
    "asked": "Waiting for the crew",
    "kept": "Looked at",
    "all": "All",
}
CHECKS = {"all": "All", "bracketed": "Between two passing checks", "not_bracketed": "Not between two passing checks"}
FILTER_FIELDS = (
    *("state", "station", "author", "since", "until", "quality", "checks", "review", "reason", "meter", "day"),
)
LAST_PAGE = 100_000
WHY_KEPT = "reason: whoever reads this later must see why"


@dataclass(frozen=True)
class Filters:
    """Which readings a list shows; an empty text lets every one through."""

    station: str = ""
    state: str = "all"
    author: str = ""
    since: datetime | None = None
    until: datetime | None = None
    quality: str = ""
    checks: str = "all"
    review: str = "all"
    reason: str = ""
    meter: str = ""
    day: date | None = None
    page: int = 1


@dataclass(frozen=True)
class Correction:
    """A number's new value in SI, None where it is taken away, and why."""

    field: str
    value: float | None
    reason: str


def parse_filters(source, show, review="all"):
    """Return (Filters, {field: message}); a filter that can't be read lets everything through.

    review is what is shown of the reviewers' work where nothing is asked.
    """
    fields = Fields(source, show)
    filters = Filters(
        station=fields.text("station", "station", 20, required=False) or "",
        state=fields.choice("state", "state", STATES, "all") or "all",
        author=fields.text("author", "author", 36, required=False) or "",
        since=fields.local_time("since", "earliest time", required=False),
        until=fields.local_time("until", "latest time", required=False),
        quality=fields.choice("quality", "quality", {"": "", **QUALITIES}, "") or "",
        checks=fields.choice("checks", "meter checks", CHECKS, "all") or "all",
        review=fields.choice("review", "state of the review", LOOKS, review) or review,
        reason=fields.choice("reason", "reason", {"": "", **REASONS}, "") or "",
        meter=fields.text("meter", "meter", 60, required=False) or "",
        day=_day(fields),
        page=_page(source.get("page")),
    )
    if filters.since and filters.until and filters.since > filters.until:
        fields.refuse("until", "This is before the earliest time, so nothing can lie between them.")
    return filters, fields.errors


def _day(fields):
    text = fields.text("day", "day", 10, required=False)
    try:
        return date.fromisoformat(text) if text else None
    except ValueError:
        return fields.refuse("day", "Choose the day from the list.")


def _page(text):
    return min(max(whole_number(text, 1), 1), LAST_PAGE)


def parse_correction(source, show, final, decided):
    """Return (Correction, {}) or (None, {field: message}).

    final is the reading as it stands after so many decisions. What it says already is refused only to somebody who
    knew of them all: to others it may be their own correction, sent twice.
    """
    fields = Fields(source, show)
    name = fields.choice("field", "number to correct", CORRECTABLE)
    reason = _reason(fields)
    if name is None:
        return None, fields.errors
    column = CORRECTABLE[name]
    value = None
    if not fields.ticked("nothing"):
        label = column.label[0].lower() + column.label[1:]
        value = fields.number("value", label, column.low, column.high, column.quantity)
    elif fields.text("value", "value", 100, required=False):
        fields.refuse("value", "Either enter a value, or tick that there was none.")
    stands = standing(final, name)
    if "value" not in fields.errors and based_on(source) == decided and _same(value, stands):
        fields.refuse("value", "That is what it says already.")
    return (None, fields.errors) if fields.errors else (Correction(name, value, reason), {})


def standing(final, name):
    """Return the number that a correction would replace: oxygen as it is before the correction for drift."""
    return final.before_drift_mg_l if name == "do_mg_l" else getattr(final, name)


def parse_reason(source):
    """Return (reason, {}) or (None, {field: message})."""
    fields = Fields(source)
    reason = _reason(fields)
    return (None, fields.errors) if fields.errors else (reason, {})


def parse_words(source, name, label):
    """Return (text of a question or an answer, {}) or (None, {field: message})."""
    fields = Fields(source)
    words = fields.text(name, label, 500)
    return (None, fields.errors) if fields.errors else (words, {})


@dataclass(frozen=True)
class Ticked:
    """The readings of a list that are to be kept together: ids with how many decisions each had, or all that fit."""

    counts: dict
    all_that_fit: bool
    reason: str


def parse_ticked(source, ticked):
    """Return (Ticked, {}) or (None, {field: message}); ticked are texts "id.number of decisions"."""
    fields = Fields(source)
    reason = fields.text("why_kept", WHY_KEPT, 500)
    counts = {}
    for text in ticked:
        reading_id, _, count = text.rpartition(".")
        counts[reading_id[:36]] = whole_number(count, -1)
    all_that_fit = fields.ticked("all_that_fit")
    if not counts and not all_that_fit:
        fields.refuse("ticked", "Tick the readings to keep first.")
    return (None, fields.errors) if fields.errors else (Ticked(counts, all_that_fit, reason), {})


@dataclass(frozen=True)
class DriftChoice:
    """A correction to apply or undo: between which checks, what was seen of it, and why; batch is the form's id."""

    start_id: str
    end_id: str
    seen: str
    batch: str
    reason: str


def parse_drift(source):
    """Return (DriftChoice, {}) or (None, {field: message})."""
    fields = Fields(source)
    choice = DriftChoice(
        start_id=fields.text("start_check", "check before", 36, required=False) or "",
        end_id=fields.text("end_check", "check after", 36, required=False) or "",
        seen=fields.text("seen", "state of the page", 64, required=False) or "",
        batch=fields.uuid("submission_id"),
        reason=_reason(fields),
    )
    return (None, fields.errors) if fields.errors else (choice, {})


def based_on(source):
    """Return how many decisions the form's page knew of; -1, which never fits, where it does not say."""
    return whole_number(source.get("based_on"), -1)


def _reason(fields):
    return fields.text("reason", WHY_KEPT, 500)


def _same(value, other):
    if value is None or other is None:
        return value is other
    return math.isclose(value, other, rel_tol=1e-9, abs_tol=1e-9)
