"""An approved survey can't be edited without an event that opens it again, whichever way somebody writes."""

import io
import json
import uuid
from datetime import datetime
from types import SimpleNamespace

import pytest

from tests.webapp.sheets import ROWS, TAKEN, correct, put_readings, set_aside
from webapp.errors import Conflict
from webapp.fieldsheet.release import change_release
from webapp.meters import service as meters
from webapp.meters.new import NewCheck, NewMeter
from webapp.models import MeterCheckEvent, SurveyEvent
from webapp.people.access import SignedIn
from webapp.plan import service as plan_service
from webapp.plan.queries import current_plan
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading
from webapp.review import importing
from webapp.review import service as review
from webapp.sag import decisions
from webapp.settings.forms import Change
from webapp.settings.service import change_settings
from webapp.surveyfile import queries as surveyfile_queries
from webapp.surveyfile import service as surveyfile
from webapp.surveys import service as surveys
from webapp.surveys.forms import parse_survey
from webapp.visits import service as visits
from webapp.visits.new import NewEntry

METER, CHECK = (str(uuid.uuid4()) for _ in range(2))
LOCKED = "This survey is approved"
PHONE = "0b8f6f2c-32cb-4a52-9a6f-0f5b0d3b1c11"


def new_id():
    return str(uuid.uuid4())


@pytest.fixture
def ids(db, survey, people):
    """An approved survey's readings by station; it has a plan, a meter, a check and a visit."""
    found = put_readings(db, survey, people)
    crew = people["crew"].id
    meters.add_meter(db, survey, NewMeter(METER, "Meter A"), crew)
    meters.add_check(db, survey, check(CHECK), crew, TAKEN)
    visits.add_entry(db, survey, NewEntry(new_id(), new_id(), "D3", {"width_m": 12.0}), crew, TAKEN)
    db.add(SurveyEvent(survey_id=survey.id, kind="approved", version="1-a", made_by_id=people["office"].id))
    db.commit()
    return found


def check(check_id):
    return NewCheck(check_id, METER, TAKEN, "as_found", "air_saturated_water", 9.0, water_temp_c=20.0)


def reading(reading_id=None):
    return NewReading(reading_id or new_id(), "D3", TAKEN, 5.0, 20.0)


def rows(db, survey):
    db.rollback()
    return surveyfile_queries.rows_of(db, survey.id)


def writes(db, survey, people, ids):
    """Return a function for each way to write, by its name."""
    plan, lead, crew = current_plan(db, survey.id), SignedIn(people["lead"]), people["crew"].id
    sag = SimpleNamespace(plan=plan, mark="m", screen={}, where=None)
    choice = SimpleNamespace(id=new_id(), shown="m", place="A1", reason="", choice="left", ticked=())
    facts, _ = parse_survey({"name": "Another", "river": "R", "time_zone": "UTC", "elevation_m": "1"})
    release = SimpleNamespace(release_at=datetime.fromisoformat("2026-08-12T08:00+00:00"), was_at=survey.release_at)
    entry = NewEntry(new_id(), new_id(), "D3", {"width_m": 12.0})
    return {
        "reading": lambda: add_reading(db, survey, reading(), crew, plan, TAKEN),
        "sheet": lambda: importing.import_readings(db, survey, [{**ROWS[0], "do_mg_l": 1.0}], crew),
        "correction": lambda: correct(db, survey, people, ids["D3"], 4.4),
        "setting aside": lambda: set_aside(db, survey, people, ids["D3"]),
        "keeping": lambda: review.keep(db, survey.id, ids["D3"], "good", 0, lead),
        "question": lambda: review.ask(db, survey.id, ids["D3"], "which meter?", 0, lead),
        "plan": lambda: plan_service.save_tables(db, survey, {"weirs": []}, "no weirs", lead.id),
        "settings": lambda: change_settings(db, survey, Change({"zero_mg_l": 0.1}, "x", 1), lead.id),
        "facts": lambda: surveys.change_survey(db, survey.id, facts, lead.id),
        "release": lambda: change_release(db, survey, release, lead.id),
        "declined place": lambda: decisions.decline(db, survey, sag, choice, lead.id),
        "leaving": lambda: decisions.leave_or_stay(db, survey, sag, choice, lead.id),
        "crew of a station": lambda: decisions.assign(db, survey, "D3", "Cleo", lead.id),
        "meter": lambda: meters.add_meter(db, survey, NewMeter(new_id(), "Meter B"), crew),
        "changed meter": lambda: meters.change_meter(db, survey, METER, NewMeter(METER, "Meter A", maker="x"), crew),
        "check": lambda: meters.add_check(db, survey, check(new_id()), crew, TAKEN),
        "check set aside": lambda: meters.set_aside(db, survey.id, CHECK, "wet", 0, lead),
        "visit": lambda: visits.add_entry(db, survey, entry, crew, TAKEN),
    }


def test_every_way_to_write_is_refused_until_the_survey_is_opened_again(db, survey, people, ids):
    before = rows(db, survey)
    taken = []
    for name in writes(db, survey, people, ids):
        try:
            writes(db, survey, people, ids)[name]()
        except Conflict as conflict:
            assert LOCKED in conflict.message, name
            db.rollback()
            db.expire_all()
        else:
            taken.append(name)
    assert taken == []
    assert rows(db, survey) == before
    db.add(SurveyEvent(survey_id=survey.id, kind="reopened", version="1-a", made_by_id=people["office"].id))
    db.commit()
    assert writes(db, survey, people, ids)["correction"]().events[-1].new_value == 4.4
    assert writes(db, survey, people, ids)["check"]().meter.name == "Meter A"


def test_a_survey_file_that_adds_to_an_approved_survey_is_refused(db, survey, people, ids):
    office = people["office"].id
    surveys.remove_member(db, survey.id, people["crew"].id, office)  # who is on it may change
    surveys.add_member(db, survey.id, people["crew"].id, office)
    exported = surveyfile.read(surveyfile.export(db, survey))
    assert surveyfile.import_file(db, exported, office).total == 0  # the same is no change
    event = {"id": new_id(), "check_id": CHECK, "kind": "set_aside", "reason": "wet", "made_by_id": office}
    exported["meter_check_event"].append({**event, "made_at": TAKEN})
    outcome = surveyfile.outcome_of(db, exported, office)
    assert LOCKED in outcome.notes[0]
    with pytest.raises(Conflict, match=LOCKED):
        surveyfile.import_file(db, exported, office, outcome.mark)
    db.rollback()
    assert db.query(MeterCheckEvent).count() == 0


def form(people, reading_id):
    typed = {"submission_id": reading_id, "taken_at": "2026-08-12T13:20", "do_mg_l": "6.4", "water_temp_c": "19"}
    return typed | {"author_id": people["crew"].id, "saved_at": "2026-08-12T11:20:00Z"}


def test_a_reading_that_waits_on_a_phone_stays_there_with_the_reason(db, survey, people, ids, browser_as):
    crew, address = browser_as("crew"), f"/surveys/{survey.id}/stations/D3/reading"
    for htmx in (True, False):
        answer = crew.post(address, form(people, PHONE), htmx=htmx)
        assert answer.status_code == 409
        assert "X-Stored-Id" not in answer.headers
        assert LOCKED in answer.text
    record = {"id": PHONE, "survey": survey.id, "code": "D3", "author": people["crew"].id, "state": "waiting"}
    copy = {"bankside": "waiting readings", "v": 1, "records": [{**record, "fields": form(people, PHONE)}]}
    file = {"file": (io.BytesIO(json.dumps(copy).encode()), "copy.json")}
    assert LOCKED in crew.post("/phone/copy", file, content_type="multipart/form-data").text
    assert PHONE not in [row["id"] for row in rows(db, survey)["reading"]]
    event = db.query(SurveyEvent).one()
    event.kind = "reopened"
    db.commit()
    assert crew.post(address, form(people, PHONE)).headers["X-Stored-Id"] == PHONE
    event.kind = "approved"
    db.commit()
    # One that was stored before, whose answer was lost, is let go of.
    assert crew.post(address, form(people, PHONE)).headers["X-Stored-Id"] == PHONE


def test_pages_say_why_nothing_was_changed(db, survey, people, ids, browser_as):
    before = rows(db, survey)
    for role, where, what in (
        ("lead", "settings", {"based_on": "1", "zero_mg_l": "0.1", "reason": "x"}),
        ("lead", "plan/access/new", {"name": "Ford", "distance_km": "5", "version_reason": "x", "based_on": "1"}),
        ("lead", f"readings/{ids['D3']}/set-aside", {"reason": "x", "based_on": "0"}),
        ("crew", f"meters/checks/{CHECK}/set-aside", {"reason": "x", "based_on": "0"}),
    ):
        answer = browser_as(role).post(f"/surveys/{survey.id}/{where}", what)
        assert answer.status_code in (409, 422), where
        assert LOCKED in answer.text, where
    assert rows(db, survey) == before
