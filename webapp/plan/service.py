"""Saving a plan: every change is a new version with who, when and why; a station's code is for ever its own."""

from sqlalchemy.exc import IntegrityError

from webapp.errors import Conflict
from webapp.models import PlanVersion, Station
from webapp.plan import queries
from webapp.plan.rows import SAME_PLACE_KM, in_order
from webapp.plan.tables import ALL_TABLES, EMPTY_PLAN
from webapp.surveys.queries import count_readings
from webapp.surveys.service import remember

_LOOK_AGAIN = "What you typed is still here: look at it once more, then save again."


class Overtaken(Conflict):
    """The plan was saved by somebody else since the form was opened."""


class ReasonNeeded(Conflict):
    """The survey has readings, so that a change of its plan needs a reason."""


def replace_table(db, survey, key, rows, reason, by_id, based_on=None):
    """Store a new version of the plan with one table replaced. See save_tables."""
    return save_tables(db, survey, {key: rows}, reason, by_id, based_on)


def save_tables(db, survey, tables, reason, by_id, based_on=None):
    """Store a new version of the plan, in which the given tables replace those of the current one; return it.

    based_on is the number of the version that whoever changes it looked at, 0 where there was none; None: not asked.
    Raises Overtaken, ReasonNeeded, or Conflict where a station's code would vanish or pass to another place.
    """
    current = queries.current_plan(db, survey.id)
    number = current.number if current else 0
    if based_on is not None and based_on != number:
        raise Overtaken(overtaken(queries.get_version(db, survey.id, number) if number else None))
    reason = (reason or "").strip()
    if not reason and current is not None and count_readings(db, survey.id):
        raise ReasonNeeded("Readings were taken on this plan: say why it changes. The reason stays with the version.")
    before = {**EMPTY_PLAN, **(current.tables if current else {})}
    after = before | {key: in_order(key, [_kept(key, row) for row in rows]) for key, rows in tables.items()}
    if "stations" in tables:
        after["stations"] = _with_known_codes(db, survey, after["stations"], before["stations"])
    version = PlanVersion(survey_id=survey.id, number=number + 1, tables=after, reason=reason, made_by_id=by_id)
    db.add(version)
    changed = [table.title for key, table in ALL_TABLES.items() if after.get(key) != before.get(key)]
    particulars = {"number": number + 1, "reason": reason, "tables": changed}
    try:
        db.flush()
        remember(db, survey.id, by_id, "plan changed", "plan version", version.id, particulars)
        db.commit()
    except IntegrityError as clash:  # two processes on one PostgreSQL: the version's number is unique
        db.rollback()
        raise Overtaken(overtaken(None)) from clash
    return version


def _kept(key, row):
    """Return a row without what is empty, and without what is no column."""
    columns = {column.key for column in ALL_TABLES[key].columns}
    return {name: value for name, value in row.items() if name in columns and value is not None and value != ""}


def overtaken(version):
    """Return the words for whoever saves a change to a version that is no longer the current one, which this is."""
    if version is None:
        return f"Somebody saved another version of the plan meanwhile. {_LOOK_AGAIN}"
    why = f" ({version.reason})" if version.reason else ""
    return f"{version.made_by.name} saved version {version.number} of the plan meanwhile{why}. {_LOOK_AGAIN}"


def _with_known_codes(db, survey, rows, before):
    """Return the stations with each code spelt as it first was; make the identity of each new one."""
    known = {code.casefold(): code for code in queries.stations_of(db, survey.id)}
    rows = [{**row, "code": known.get(row["code"].casefold(), row["code"])} for row in rows]
    codes = [row["code"].casefold() for row in rows]
    if len(codes) != len(set(codes)):
        twice = next(row["code"] for row in rows if codes.count(row["code"].casefold()) > 1)
        raise Conflict(f"Station {twice} stands twice in the table; each code is for one place.")
    if gone := sorted(code for code in queries.codes_with_readings(db, survey.id) if code.casefold() not in codes):
        raise Conflict(
            f"Readings were taken at {', '.join(gone)}, so it stays in the plan. To leave it out of the day, "
            "set its state to dropped, with the reason."
        )
    _refuse_moved_codes(db, survey, rows, {row["code"] for row in before}, set(known.values()))
    db.add_all(Station(survey_id=survey.id, code=row["code"]) for row in rows if row["code"].casefold() not in known)
    return rows


def _refuse_moved_codes(db, survey, rows, current, known):
    """Refuse a code that an earlier version gave to another place and that is to come back."""
    back = {row["code"]: row["distance_km"] for row in rows if row["code"] in known - current}
    for version in queries.plan_versions(db, survey.id) if back else ():
        for row in version.tables.get("stations", []):
            place = back.pop(row["code"], None)
            if place is not None and abs(place - row["distance_km"]) > SAME_PLACE_KM:
                raise Conflict(
                    f"The code {row['code']} was given to another place in version {version.number} of the plan. "
                    "A code is never given twice: choose a new one."
                )
