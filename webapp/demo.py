"""Loads the demo through the imports and forms that anybody uses, moved in time so that its day is going on now."""

import csv
import hashlib
import json
import uuid
from dataclasses import replace
from datetime import UTC, date, datetime, timedelta
from zoneinfo import ZoneInfo

from webapp.bottles import forms as bottle_forms
from webapp.bottles import service as bottle_service
from webapp.bottles.queries import bottles_of
from webapp.config import SHIPPED
from webapp.display import Show
from webapp.meters import forms as meter_forms
from webapp.meters import service as meter_service
from webapp.meters.queries import meters_of
from webapp.people import queries as people_queries
from webapp.people import service as people_service
from webapp.people.forms import parse_person
from webapp.plan import service as plan_service
from webapp.plan.queries import current_plan
from webapp.plan.tables import PLAN_TABLES
from webapp.readings.asking import findings_on_new, to_ask
from webapp.readings.forms import parse_reading
from webapp.readings.layers import final
from webapp.readings.service import put_reading
from webapp.readings.settling import settle, thresholds
from webapp.readings.surroundings import look_around
from webapp.surveys import service as survey_service
from webapp.surveys.forms import parse_survey
from webapp.surveys.queries import current_settings
from webapp.tablefile import read_table
from webapp.visits.forms import parse_entry
from webapp.visits.service import put_entry

FOLDER = SHIPPED / "demo_survey"
FINISHED = FOLDER / "finished"
SIGN_INS = (
    ("crew", "river-crew-demo", "crew"),
    ("lead", "river-lead-demo", "lead"),
    ("office", "river-office-demo", "office"),
)
NAMES = {"crew": "Cleo Banks", "lead": "Linus Ford", "office": "Olive Reed"}
HOURS_INTO_THE_DAY = 10.5
# What is moved in time, and the names within the files that become ids.
TIMES = ("taken_at", "arrived_at", "left_at", "collected_at", "on_ice_at", "at", "started_at", "finished_at")
DAYS = ("cap_changed_on", "serviced_on", "expires_on")
IDS = ("submission_id", "visit_id", "bottle_id")
ID_LISTS = ("seen", "bottles")


def load(db, now):
    """Load the demo unless it is there; return whether it was loaded. now is about when D5 is due."""
    people = {role: _person(db, sign_in, password, role) for sign_in, password, role in SIGN_INS}
    if people_queries.surveys_of(db, people["office"].id):
        return False
    moved = _whole_minutes(now - timedelta(hours=HOURS_INTO_THE_DAY) - _facts(FOLDER).release_at)
    for folder in (FINISHED, FOLDER):  # the list of surveys begins with the one that was made last
        survey = _survey(db, folder, moved, people)
        _day(db, survey, folder, moved, people["crew"].id)
        if (folder / "bottles.csv").exists():
            _bottles(db, survey, folder, moved, people)
    return True


def _person(db, sign_in, password, role):
    if (there := people_queries.find_by_sign_in(db, sign_in)) is not None:  # a start that was broken off made it
        return there
    new, errors = parse_person({"name": NAMES[role], "sign_in": sign_in, "password": password, "role": role})
    _refuse(errors)
    return people_service.add_person(db, new)


def _facts(folder):
    facts, errors = parse_survey({row["fact"]: row["value"] for row in _csv(folder / "survey.csv")})
    _refuse(errors)
    return facts


def _survey(db, folder, moved, people):
    """Return a new survey with everybody on it and the plan that all surveys of the demo share."""
    facts, office = _facts(folder), people["office"].id
    survey = survey_service.create_survey(db, replace(facts, release_at=facts.release_at + moved), office)
    for role in ("crew", "lead"):
        survey_service.add_member(db, survey.id, people[role].id, office)
    show = Show.of(survey)
    tables = {key: _plan_rows(f"{key}.csv", table, show) for key, table in PLAN_TABLES.items()}
    plan_service.save_tables(db, survey, tables, "the plan of the demo", office)
    return survey


def _plan_rows(name, table, show):
    read = read_table((FOLDER / name).read_text(encoding="utf-8"), table, show, show.time_zone)
    _refuse({str(cell): cell.message for cell in read.errors} | {text: text for text in read.header_errors})
    return read.rows


def _day(db, survey, folder, moved, by_id):
    """Store what the crew typed into the forms at the river, each at the time it was typed.

    What the form asks about a reading is answered with "keep it".
    """
    show, plan = Show.of(survey), current_plan(db, survey.id)
    for form in _typed(folder / "meters.csv", survey, moved):
        meter_service.add_meter(db, survey, _read(meter_forms.parse_meter(form, show)), by_id)
    meters = meters_of(db, survey.id)
    for form in _typed(folder / "checks.csv", survey, moved):
        at = _saved(form, show)
        meter_service.put_check(db, survey, _read(meter_forms.parse_check(form, show, meters, at)), by_id, at)
    for form in _typed(folder / "visits.csv", survey, moved):
        at = _saved(form, show)
        put_entry(db, survey, _read(parse_entry(form, show, form["station"], at)), by_id, at)
    settings, so_far = thresholds(current_settings(db, survey.id)), []
    for form in _typed(folder / "readings.csv", survey, moved):
        at = _saved(form, show)
        new = settle(_read(parse_reading(form, show, form["station"], at)), settings)
        around = look_around(survey, plan, new.station_code, new.taken_at, so_far, replicate=new.replicate, point=new)
        asked = to_ask(findings_on_new(survey, settings, new, around, at, meters), new, at)
        so_far.append(final(put_reading(db, survey, new.keeping(asked), by_id, plan, at)))
    db.commit()


def _bottles(db, survey, folder, moved, people):
    """Store the bottles and their hand-over, which the crew typed, and the results, which the office did."""
    show, crew, office = Show.of(survey), people["crew"].id, people["office"].id
    for form in _typed(folder / "bottles.csv", survey, moved):
        at = _saved(form, show)
        new = _read(bottle_forms.parse_bottle(form, show, form["station"], at))
        bottle_service.put_bottle(db, survey, new, crew, at)
    bottles = bottles_of(db, survey.id)
    for form in _typed(folder / "hand_overs.csv", survey, moved):
        ids = json.loads(form["bottles"])
        new = _read(bottle_forms.parse_hand_over(form, ids, show, bottles, _saved(form, show)))
        bottle_service.add_hand_over(db, survey, new, crew)
    for form in _typed(folder / "results.csv", survey, moved):
        bottle = next(one for one in bottles if one.id == form["bottle_id"])
        new = _read(bottle_forms.parse_result(form, show, bottle, _saved(form, show)))
        bottle_service.put_result(db, survey, new, office)
    db.commit()


def _typed(path, survey, moved):
    """Yield the forms of a file, moved in time; the ids are this survey's own, as if a phone had made them."""
    zone = ZoneInfo(survey.time_zone)
    for row in _csv(path):
        form = {name: text for name, text in row.items() if text}
        form |= {name: _id(survey, form[name]) for name in IDS if name in form}
        form |= {name: _moved_time(form[name], moved, zone) for name in TIMES if name in form}
        form |= {name: (date.fromisoformat(form[name]) + moved).isoformat() for name in DAYS if name in form}
        for name in ID_LISTS:
            if name in form:
                form[name] = json.dumps([_id(survey, one) for one in form[name].split("; ")])
        yield form


def _id(survey, name):
    return str(uuid.UUID(bytes=hashlib.sha256(f"{survey.id} {name}".encode()).digest()[:16], version=4))


def _moved_time(text, moved, zone):
    """Return a time as a phone fills it in; with its offset where the clocks go back over it."""
    instant = datetime.fromisoformat(text).replace(tzinfo=zone).astimezone(UTC) + moved
    local = instant.astimezone(zone)
    return local.isoformat(timespec="minutes") if local.fold else local.strftime("%Y-%m-%dT%H:%M")


def _saved(form, show):
    """Return when a form was saved: at the last of the times that it tells."""
    written = [datetime.fromisoformat(form[name]) for name in TIMES if name in form]
    zone = ZoneInfo(show.time_zone)
    return max(one.astimezone(UTC) if one.tzinfo else one.replace(tzinfo=zone).astimezone(UTC) for one in written)


def _read(parsed):
    new, errors = parsed
    _refuse(errors)
    return new


def _csv(path):
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def _whole_minutes(difference):
    return timedelta(minutes=round(difference.total_seconds() / 60))


def _refuse(errors):
    if errors:
        raise ValueError(f"the demo survey does not read: {errors}")
