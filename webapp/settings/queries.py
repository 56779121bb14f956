"""The versions of a survey's settings. Whoever asks has shown that they are on the survey."""

from sqlalchemy import select

from webapp.errors import NotFound
from webapp.models import History, Person, SettingsVersion


def versions_of(db, survey_id):
    """Return (SettingsVersion, name of who made it) of every version, newest first."""
    query = select(SettingsVersion, Person.name).join(Person, Person.id == SettingsVersion.made_by_id)
    query = query.where(SettingsVersion.survey_id == survey_id)
    return [tuple(row) for row in db.execute(query.order_by(SettingsVersion.number.desc()))]


def get_version(db, survey_id, number):
    """Return a version by its number. Raises NotFound."""
    query = select(SettingsVersion).where(SettingsVersion.survey_id == survey_id, SettingsVersion.number == number)
    if (version := db.scalar(query)) is None:
        raise NotFound("This survey has no such version of its settings.")
    return version


def told_of(db, survey_id):
    """Return {version id: particulars} of what the history says of each change."""
    query = select(History.entity_id, History.particulars)
    query = query.where(History.survey_id == survey_id, History.what == "settings changed")
    return {row.entity_id: row.particulars for row in db.execute(query)}
