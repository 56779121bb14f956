"""What is new on the field sheet since a person looked, and the record of their looks.

A look is a whole page of the field sheet. What differs from the look before is marked on it, and on every update while
the page stays open; then the look is recorded, so that the next whole page no longer marks it. An update that arrives
by itself is no look: the phone may be in a pocket.
"""

from dataclasses import dataclass, field
from datetime import timedelta

from sqlalchemy.exc import IntegrityError

from webapp.display import hours
from webapp.fieldsheet import queries
from webapp.models import Seen, now
from webapp.plan.queries import get_version
from webapp.readings.expected import expected_at_stations

NEW, DROPPED, MOVED, YOURS = "new", "dropped", "moved", "yours"
# A shift that a crew can't act on is no news.
_A_SHIFT = timedelta(minutes=5)


@dataclass(frozen=True)
class News:
    """marks maps a station's code to what is new about it, was_at to when the parcel was due before; lines say all."""

    lines: tuple[str, ...] = ()
    marks: dict = field(default_factory=dict)
    was_at: dict = field(default_factory=dict)


def news_of(db, survey, show, plan_version, seen, person_name):
    """Return the News against what the person was shown; none at a first look."""
    number = plan_version.number if plan_version else 0
    if seen is None or (seen.plan_number == number and seen.release_at == survey.release_at):
        return News()
    old = get_version(db, survey.id, seen.plan_number) if seen.plan_number else None
    marks, lines = _stations(old, plan_version, person_name)
    was_at = _moved_times(survey, seen.release_at, old, plan_version)
    if seen.release_at != survey.release_at:
        before = show.day_clock(seen.release_at) if seen.release_at else "not set"
        lines.insert(0, f"Release: {show.day_clock(survey.release_at)}, before: {before}.")
    if was_at:
        lines.append(_shift_words(survey, plan_version, was_at))
    reasons = queries.reasons_since(db, survey.id, seen.plan_number) if number != seen.plan_number else ()
    lines.extend(dict.fromkeys(f"{name}: {reason}" for name, reason in reasons))
    return News(tuple(lines), marks, was_at)


def looked(db, survey_id, person_id, plan_number, release_at):
    """Record what the person is being shown, in a writing session."""
    db.merge(Seen(survey_id=survey_id, person_id=person_id, plan_number=plan_number, release_at=release_at, at=now()))
    try:
        db.commit()
    except IntegrityError:  # two pages of one person at once: both showed the same
        db.rollback()


def unseen(seen, plan_number, release_at):
    """Return whether a look shows anything that the look before did not."""
    return seen is None or (seen.plan_number, seen.release_at) != (plan_number, release_at)


def mark_of(db, survey):
    """Return a text that changes with anything the field sheet shows, other than the time."""
    release = survey.release_at.timestamp() if survey.release_at else "none"
    facts = (*queries.counts_of(db, survey.id), release, survey.sampling, survey.unit_system, survey.distance_rule)
    return "-".join(map(str, facts))


def _stations(old, new, person_name):
    """Return (marks by code, sentences) of stations that were added, dropped, moved or given to somebody."""
    before, after = (
        {row["code"]: row for row in (version.tables["stations"] if version else [])} for version in (old, new)
    )
    marks, lines = {}, [f"{code} is no longer in the plan." for code in before if code not in after]
    for code, row in after.items():
        mark, words = _change(before.get(code), row, person_name)
        if mark:
            marks[code] = mark
            why = f": {row['reason']}" if mark in (NEW, DROPPED) and row.get("reason") else ""
            lines.append(f"{code} {words}{why}.")
    return marks, lines


def _change(before, row, person_name):
    is_dropped, was_dropped = (bool(one) and one.get("state") == "dropped" for one in (row, before))
    if is_dropped:
        return ("", "") if was_dropped or before is None else (DROPPED, "is dropped")
    if before is None or was_dropped:
        return NEW, "is new" if before is None else "is back"
    if before["distance_km"] != row["distance_km"]:
        return MOVED, "has another place"
    if before.get("crew") != row.get("crew") and person_name in (before.get("crew"), row.get("crew")):
        return YOURS, "is for you now" if row.get("crew") == person_name else "is no longer for you"
    return "", ""


def _moved_times(survey, old_release_at, old, new):
    """Return when the parcel was due at each station before, where that has moved."""
    if survey.sampling != "same_parcel" or None in (old_release_at, survey.release_at, old, new):
        return {}
    before, after = (expected_at_stations(survey, version) for version in (old, new))
    moved = {}
    for code in before.keys() & after.keys():
        if None in (before[code], after[code]) or after[code].distance_km < 0:
            continue
        was = old_release_at + timedelta(hours=before[code].travel_time_h)
        if abs(survey.release_at + timedelta(hours=after[code].travel_time_h) - was) >= _A_SHIFT:
            moved[code] = was
    return moved


def _shift_words(survey, plan_version, was_at):
    """Return how much later or earlier the parcel comes, at the first and the last station where that moved."""
    expected = expected_at_stations(survey, plan_version)
    codes = sorted(was_at, key=lambda code: expected[code].distance_km)
    words = []
    for code in dict.fromkeys((codes[0], codes[-1])):
        shift = survey.release_at + timedelta(hours=expected[code].travel_time_h) - was_at[code]
        late = "later" if shift > timedelta() else "earlier"
        words.append(f"{hours(shift.total_seconds() / 3600)} {late} at {code}")
    return f"The parcel comes {', '.join(words)}."
