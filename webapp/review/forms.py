"""The table's filters, and what somebody decides about a reading."""

import math
from dataclasses import dataclass
from datetime import datetime

from webapp.forms import Fields
from webapp.review.numbers import CORRECTABLE

STATES = {
    "all": "All",
    "used": "Used",
    "set_aside": "Set aside",
    "corrected": "Corrected",
    "findings": "With findings",
}
LAST_PAGE = 100_000


@dataclass(frozen=True)
class Filters:
    """Which readings the table shows."""

    station: str = ""
    state: str = "all"
    author: str = ""
    since: datetime | None = None
    until: datetime | None = None
    page: int = 1


@dataclass(frozen=True)
class Correction:
    """A number's new value in SI, None where it is taken away, and why."""

    field: str
    value: float | None
    reason: str


def parse_filters(source, show):
    """Return (Filters, {field: message}); a filter that can't be read lets everything through."""
    fields = Fields(source, show)
    filters = Filters(
        station=fields.text("station", "station", 20, required=False) or "",
        state=fields.choice("state", "state", STATES, "all") or "all",
        author=fields.text("author", "author", 36, required=False) or "",
        since=fields.local_time("since", "earliest time", required=False),
        until=fields.local_time("until", "latest time", required=False),
        page=_page(source.get("page")),
    )
    if filters.since and filters.until and filters.since > filters.until:
        fields.refuse("until", "This is before the earliest time, so nothing can lie between them.")
    return filters, fields.errors


def _page(text):
    if text and text.isascii() and text.isdigit() and len(text) <= 6:
        return min(max(int(text), 1), LAST_PAGE)
    return 1


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
    if "value" not in fields.errors and based_on(source) == decided and _same(value, getattr(final, name)):
        fields.refuse("value", "That is what it says already.")
    return (None, fields.errors) if fields.errors else (Correction(name, value, reason), {})


def parse_reason(source):
    """Return (reason, {}) or (None, {field: message})."""
    fields = Fields(source)
    reason = _reason(fields)
    return (None, fields.errors) if fields.errors else (reason, {})


def based_on(source):
    """Return how many decisions the form's page knew of; -1, which never fits, where it does not say."""
    text = source.get("based_on") or ""
    return int(text) if text.isascii() and text.isdigit() and len(text) <= 6 else -1


def _reason(fields):
    return fields.text("reason", "reason: whoever reads this later must see why", 500)


def _same(value, other):
    if value is None or other is None:
        return value is other
    return math.isclose(value, other, rel_tol=1e-9, abs_tol=1e-9)
