"""A survey's rows of every carried table, as plain dictionaries. Whoever asks has shown that they are on the survey."""

from sqlalchemy import select

from webapp.models import Base, Survey
from webapp.surveyfile.tables import CARRIED, DATASET_IMPORTED, OF_PEOPLE, STAYS_HERE, carried

_AT_ONCE = 500  # SQLite takes no more than so many values in one query, give or take


def find_survey(db, survey_id):
    """Return the survey of that id, whoever is on it, or None."""
    return db.get(Survey, survey_id)


def rows_of(db, survey_id):
    """Return {table: rows} of a survey, sorted by their keys, with the people that its rows name."""
    found = {name: _rows(db, one, survey_id) for name, one in carried().items() if name != "person"}
    put_on = _put_on_here(found["history"])
    found["history"] = [row for row in found["history"] if row["what"] not in STAYS_HERE]
    found["survey_member"] = [row for row in found["survey_member"] if row["person_id"] not in put_on]
    people = people_of(db, people_named(found))
    rows = {"person": people, **found}
    return {name: sorted(rows[name], key=carried()[name].key_of) for name in CARRIED}


def _put_on_here(history):
    """Return the ids of those whom the import of a dataset put on the survey, so that they could look at it."""
    put_on = {row["particulars"].get("put_on") for row in history if row["what"] == DATASET_IMPORTED}
    return put_on - {row["entity_id"] for row in history if row["what"] == "person added"}


def people_named(rows):
    """Return the ids of the people that rows name, also those whom the history tells of."""
    ids = {
        row[column]
        for name, some in rows.items()
        for column, parent in carried()[name].parents.items()
        if parent == "person"
        for row in some
    }
    return (ids | {row["entity_id"] for row in rows["history"] if row["entity"] == "person"}) - {None}


def people_of(db, ids):
    """Return id, name and role of those people that this server knows."""
    person = Base.metadata.tables["person"]
    return _by_ids(db, [person.c[name] for name in OF_PEOPLE], person.c.id, ids)


def known_ids(db, name, ids):
    """Return which of the ids a table holds, of whatever survey."""
    table = Base.metadata.tables[name]
    return {row["id"] for row in _by_ids(db, [table.c.id], table.c.id, ids)}


def sign_ins(db):
    """Return every sign-in name."""
    return set(db.scalars(select(Base.metadata.tables["person"].c.sign_in)))


def _rows(db, one, survey_id):
    query = select(*one.columns.values())
    if one.name == "survey":
        query = query.where(one.columns["id"] == survey_id)
    elif "survey_id" in one.columns:
        query = query.where(one.columns["survey_id"] == survey_id)
    else:
        column, parent = next(pair for pair in one.parents.items() if "survey_id" in carried()[pair[1]].columns)
        above = carried()[parent].columns
        query = query.join(Base.metadata.tables[parent], one.columns[column] == above["id"])
        query = query.where(above["survey_id"] == survey_id)
    return [dict(row) for row in db.execute(query).mappings()]


def _by_ids(db, columns, id_column, ids):
    ids, found = sorted(ids), []
    for start in range(0, len(ids), _AT_ONCE):
        query = select(*columns).where(id_column.in_(ids[start : start + _AT_ONCE]))
        found += [dict(row) for row in db.execute(query).mappings()]
    return found
