"""The readings of a survey as the lists show them: filtered, in order, a page at a time."""

from collections import Counter
from dataclasses import dataclass
from datetime import timedelta

from webapp.readings.layers import ANSWERED, ASKED, KEPT
from webapp.readings.quality_words import REASONS

_MINUTE = timedelta(minutes=1)


@dataclass(frozen=True)
class Choices:
    """What the readings of a survey can be filtered by: (key, words) of each, in order."""

    stations: list
    authors: list
    meters: list
    days: list
    reasons: list


def choices_of(judged, show):
    """Return the Choices of a survey's Judged; the reasons tell how many readings have each."""
    authors = {one.author_id: one.author for one in judged}
    reasons = Counter(reason for one in judged for reason in one.reasons)
    days = sorted({show.local(one.reading.taken_at).date() for one in judged})
    return Choices(
        stations=_named(sorted({one.reading.station_code for one in judged})),
        authors=sorted(authors.items(), key=lambda pair: (pair[1].lower(), pair[0])),
        meters=_named(sorted({one.reading.meter for one in judged} - {""}, key=str.lower)),
        days=[(day.isoformat(), f"{day:%a} {day.day} {day:%b %Y}") for day in days],
        reasons=[(key, f"{words} ({reasons[key]})") for key, words in REASONS.items() if reasons[key]],
    )


def _named(names):
    return [(name, name) for name in names]


def matching(judged, filters, show):
    """Return the Judged that the filters let through, in the order they came."""
    tests = [test for test in _tests(filters, show) if test is not None]
    return [one for one in judged if all(test(one) for test in tests)]


def _tests(filters, show):
    yield filters.station and (lambda one: one.reading.station_code == filters.station) or None
    yield filters.author and (lambda one: one.author_id == filters.author) or None
    yield filters.since and (lambda one: one.reading.taken_at >= filters.since) or None
    yield filters.until and (lambda one: one.reading.taken_at < filters.until + _MINUTE) or None
    yield filters.quality and (lambda one: one.quality == filters.quality) or None
    yield filters.reason and (lambda one: filters.reason in one.reasons) or None
    yield filters.meter and (lambda one: one.reading.meter == filters.meter) or None
    yield filters.day and (lambda one: show.local(one.reading.taken_at).date() == filters.day) or None
    yield _STATES[filters.state]
    yield _LOOKS[filters.review]
    yield _CHECKS[filters.checks]


_STATES = {
    "all": None,
    "used": lambda one: not one.reading.set_aside,
    "set_aside": lambda one: one.reading.set_aside,
    "corrected": lambda one: bool(one.reading.corrections or one.reading.drift),
    "findings": lambda one: bool(one.kept),
}
_LOOKS = {
    "all": None,
    "todo": lambda one: one.severity > 0 and one.reading.review != ASKED,
    "asked": lambda one: one.reading.review == ASKED,
    "answered": lambda one: one.reading.review == ANSWERED,
    "kept": lambda one: one.reading.review == KEPT,
}
_CHECKS = {
    "all": None,
    "bracketed": lambda one: one.bracket.state == "bracketed",
    "not_bracketed": lambda one: one.bracket.state != "bracketed",
}


def worst_first(judged):
    """Return the Judged in the order in which they want a look; likes in the order they were taken."""
    return sorted(judged, key=lambda one: (-one.severity, one.reading.taken_at, one.reading.id))


def looked_at(judged):
    """Return how many of them a reviewer has looked at."""
    return sum(one.reading.review == KEPT for one in judged)


def to_look_at(judged):
    """Return how many of them want a look by a reviewer."""
    return sum(1 for one in judged if _LOOKS["todo"](one))


def questions_for(judged, person_id):
    """Return those of somebody's own readings about which a question is open, in the order they were taken."""
    return [one for one in judged if one.author_id == person_id and one.reading.review == ASKED]


def page_of(some, page, size):
    """Return one page of a list, counted from 1."""
    return some[(page - 1) * size : page * size]


def beside(some, reading_id):
    """Return (Judged before, Judged after) a reading in a list, None at its ends; for one not in it, the list's first.

    So whoever has just decided about a reading, which took it off the list, goes on at what is now the worst.
    """
    place = next((at for at, one in enumerate(some) if one.reading.id == reading_id), None)
    if place is None:
        return None, next(iter(some), None)
    return (some[place - 1] if place else None), (some[place + 1] if place + 1 < len(some) else None)
