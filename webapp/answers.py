"""Questions that a form asks before it stores something odd, and how the answers travel with the form.

names maps a finding's field, as calc calls it, to the field of the form.
"""

import json
from dataclasses import replace
from datetime import UTC, datetime


def saved_at(source):
    """Return when a phone saved the form, for one that waited there; None where it says nothing that can be read."""
    try:
        written = datetime.fromisoformat(source.get("saved_at") or "")
    except ValueError:
        return None
    return written.astimezone(UTC) if written.tzinfo and 1990 <= written.year <= 2200 else None


def show_of_form(source, show):
    """Return the Show of the units that the form was filled in with, should the survey's have changed meanwhile."""
    return replace(show, unit_system=source["units"]) if source.get("units") in ("si", "us") else show


def unanswered(findings, source, names):
    """Return the findings that nobody has answered with "keep it" yet."""
    kept = set(_marks(source, "kept")) | set(_marks(source, "keep"))
    return [one for one in findings if _mark(one, source, names) not in kept]


def answers(findings, source, names):
    """Return the marks of the findings kept so far, and those that "keep it" adds, as the form carries them."""
    kept = sorted(set(_marks(source, "kept")) | set(_marks(source, "keep")))
    return json.dumps(kept), json.dumps([_mark(one, source, names) for one in findings])


def _marks(source, name):
    try:
        marks = json.loads(source.get(name) or "[]")
    except (ValueError, RecursionError):
        return []
    return [mark for mark in marks if isinstance(mark, str)] if isinstance(marks, list) else []


def _mark(finding, source, names):
    """Return what identifies a finding that was asked about: its name and the text it was about."""
    return f"{finding.name}={source.get(names.get(finding.field, finding.field)) or ''}"
