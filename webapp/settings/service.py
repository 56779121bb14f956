"""Changing a survey's settings: every change is a new version with who, when and why; the old ones stay."""

from dataclasses import dataclass

from sqlalchemy.exc import IntegrityError

from webapp.errors import Conflict
from webapp.models import SettingsVersion
from webapp.settings import queries
from webapp.settings.rejudged import judged_otherwise
from webapp.settings.topics import SETTINGS, TOPICS, typed, values_of
from webapp.surveys.queries import current_settings
from webapp.surveys.service import remember

__all__ = ["TOPICS", "Overtaken", "VersionLine", "change_settings", "differing", "lines_of"]


class Overtaken(Conflict):
    """The settings were changed by somebody else since the form was opened."""


@dataclass(frozen=True)
class VersionLine:
    """A version as the page lists it; changes holds (label, old, new, unit) of each setting against the one before.

    told holds what the history says of it, empty for the first: how many of the readings it judged otherwise.
    """

    version: SettingsVersion
    by: str
    changes: tuple
    told: dict


def otherwise_under(db, survey, change):
    """Return (how many readings a change judges otherwise, of how many), told before standing in the writers' line."""
    current = current_settings(db, survey.id)
    return judged_otherwise(db, survey, values_of(current.thresholds) | change.values)


def change_settings(db, survey, change, by_id, told=None):
    """Store a new version with the changed values over those of the one it is based on; return it.

    told is what otherwise_under said just before: the history keeps it. The same change sent twice is one version.
    Raises Overtaken where somebody else was quicker.
    """
    current = current_settings(db, survey.id)
    if change.based_on != current.number:
        if _is_that(db, survey, current, change, by_id):
            return current
        raise Overtaken(
            "Somebody changed the settings since you opened them. What they changed is marked below, and what you "
            "typed is still here: look once more, then save again."
        )
    before = values_of(current.thresholds)
    after = before | change.values
    otherwise, readings = told or judged_otherwise(db, survey, after)
    version = SettingsVersion(
        survey_id=survey.id,
        number=current.number + 1,
        thresholds=after,
        reason=change.reason,
        made_by_id=by_id,
    )
    db.add(version)
    changed = {key: [before[key], value] for key, value in change.values.items()}
    particulars = {"number": version.number, "reason": change.reason, "changed": changed}
    particulars |= {"otherwise": otherwise, "readings": readings}
    try:
        db.flush()
        remember(db, survey.id, by_id, "settings changed", "settings version", version.id, particulars)
        db.commit()
    except IntegrityError as clash:  # two processes on one PostgreSQL: the version's number is unique
        db.rollback()
        raise Overtaken("Somebody changed the settings at this moment. Look once more, then save again.") from clash
    return version


def _is_that(db, survey, current, change, by_id):
    """Return whether the current version is this very change: a double tap."""
    if (current.number, current.made_by_id, current.reason) != (change.based_on + 1, by_id, change.reason):
        return False
    before = queries.get_version(db, survey.id, change.based_on)
    return values_of(current.thresholds) == values_of(before.thresholds) | change.values


def differing(older, newer):
    """Return (key, label, old, new, unit) of each setting that two versions' thresholds hold otherwise."""
    before, after = values_of(older), values_of(newer)
    return tuple(
        (one.key, one.label, typed(before[one.key]), typed(after[one.key]), one.unit)
        for one in SETTINGS
        if before[one.key] != after[one.key]
    )


def lines_of(db, survey):
    """Return a VersionLine for every version of a survey's settings, newest first."""
    versions, told = queries.versions_of(db, survey.id), queries.told_of(db, survey.id)
    earlier = [*(version.thresholds for version, _ in versions[1:]), None]
    return [
        VersionLine(
            version, by, () if before is None else differing(before, version.thresholds), told.get(version.id, {})
        )
        for (version, by), before in zip(versions, earlier, strict=True)
    ]
