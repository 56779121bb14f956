"""All that a page about a visit shows: what is known, what is disputed, who said what, the readings of the time."""

from dataclasses import dataclass, field
from datetime import datetime

from webapp.readings.occasions import Occasion
from webapp.visits.changes import Seen, seen_at
from webapp.visits.layers import FinalVisit, final_visit
from webapp.visits.sun import Sun, place_of, sun_at
from webapp.visits.words import LABELS, group_of, told, words_of


@dataclass(frozen=True)
class Dispute:
    """A fact that entries disagree about: what it is called, and of each entry its id, author, time and value."""

    name: str
    label: str
    said: tuple


@dataclass(frozen=True)
class Entry:
    """One entry as the history of a visit lists it: who, when, what it said, and why where that was told."""

    author: str
    made_at: datetime
    lines: list
    reason: str
    emptied: list = field(default_factory=list)


@dataclass(frozen=True)
class Account:
    """A visit with all that belongs to it; occasion holds its readings and what they say of the section."""

    visit: FinalVisit
    seen: Seen
    sun: Sun | None
    lines: list
    disputes: tuple
    entries: tuple
    occasion: Occasion | None


def account_of(show, visit, visits, occasions, tables, settings):
    """Return the Account of a Visit; visits and occasions are the survey's, tables the plan's."""
    finals = [final_visit(one) for one in visits]
    own = final_visit(visit)
    return Account(
        visit=own,
        seen=seen_at(own, finals, settings),
        sun=sun_at(place_of(tables, own.station_code), own.arrived_at),
        lines=told(show, own.facts),
        disputes=_disputes(show, own),
        entries=tuple(_entry(show, one) for one in sorted(visit.entries, key=lambda one: (one.made_at, one.id))),
        occasion=next((one for one in occasions if one.visit and one.visit.id == own.id), None),
    )


def _disputes(show, visit):
    """Return the Disputes of a visit, one for what is said together."""
    found = {}
    for name in visit.disputes:
        group = group_of(name)
        if group[0] in found:
            continue
        entries = {entry.id: entry for one in group for entry, _ in visit.disputes.get(one, ())}
        said = tuple(
            (entry.id, entry.author.name, entry.made_at, words_of(show, group, _facts(entry)) or "nothing")
            for entry in entries.values()
        )
        found[group[0]] = Dispute(group[0], LABELS.get(group[0], group[0]), said)
    return tuple(found.values())


def _facts(entry):
    """Return the facts of one entry with its times as times."""
    times = ("arrived_at", "left_at")
    return {
        name: datetime.fromisoformat(value) if name in times and value else value for name, value in entry.facts.items()
    }


def _entry(show, entry):
    emptied = [LABELS[name] for name, value in entry.facts.items() if value is None and name in LABELS]
    return Entry(entry.author.name, entry.made_at, told(show, _facts(entry)), entry.reason, emptied)
