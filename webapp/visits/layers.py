"""A visit as it stands after every entry about it. An entry is never changed."""

from dataclasses import dataclass, field
from datetime import datetime

TIMES = ("arrived_at", "left_at")


@dataclass(frozen=True)
class FinalVisit:
    """What is known of a visit: facts in SI by name, times among them as aware datetimes.

    disputes maps a fact to the (entry, value) pairs that disagree and did not see each other; facts then holds the one
    that was said last, and somebody has to choose.
    """

    id: str
    station_code: str
    opened_by: str
    opened_by_id: str
    facts: dict
    disputes: dict = field(default_factory=dict)

    @property
    def arrived_at(self):
        """Return when the crew arrived, or None."""
        return self.facts.get("arrived_at")

    @property
    def left_at(self):
        """Return when the crew left, or None."""
        return self.facts.get("left_at")


def final_visit(visit):
    """Return the FinalVisit of a Visit; its entries may come in any order."""
    entries = sorted(visit.entries, key=lambda entry: (entry.made_at, entry.id))
    facts, disputes = {}, {}
    for name in sorted({name for entry in entries for name in entry.facts}):
        said = _standing([entry for entry in entries if name in entry.facts], {entry.id: entry for entry in entries})
        facts[name] = _value(name, said[-1])
        if any(one.facts[name] != said[-1].facts[name] for one in said):
            disputes[name] = [(one, _value(name, one)) for one in said]
    return FinalVisit(visit.id, visit.station.code, visit.opened_by.name, visit.opened_by_id, facts, disputes)


def _standing(said, by_id):
    """Return the entries about a fact that none of the others, which saw them, has replaced."""
    replaced = set()
    for entry in said:
        replaced |= _seen(entry, by_id)
    return [entry for entry in said if entry.id not in replaced] or said[-1:]


def _seen(entry, by_id):
    """Return the ids of all entries that an entry saw, and that those had seen."""
    found, to_do = set(), [entry]
    while to_do:
        fresh = {name for name in to_do.pop().seen if name in by_id and name != entry.id} - found
        found |= fresh
        to_do += [by_id[name] for name in fresh]
    return found


def _value(name, entry):
    value = entry.facts[name]
    return datetime.fromisoformat(value) if name in TIMES and value else value
