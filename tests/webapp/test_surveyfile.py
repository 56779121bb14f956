import json
import uuid
import zipfile
from io import BytesIO

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sqlalchemy import event, select

from tests.conftest import PASSWORD
from tests.needs import postgres_server
from tests.webapp import servers
from tests.webapp.sheets import correct, put_readings, set_aside
from webapp.errors import Conflict, NotAllowed
from webapp.models import Base, History, Person, Reading, ReadingEvent, Survey, SurveyMember
from webapp.people import service as people_service
from webapp.people.forms import NewPerson
from webapp.people.queries import find_by_sign_in
from webapp.plan import queries as plan_queries
from webapp.readings.queries import readings_of
from webapp.surveyfile import service, tables
from webapp.surveys import service as survey_service

STRANGER = NewPerson("Ivo Marsh", "ivo", "office", PASSWORD)


@pytest.fixture
def here(app):
    """The server that has the survey."""
    return app.extensions["bankside_database"]


@pytest.fixture
def filled(db, survey, people):
    """The survey with one of everything."""
    ids = put_readings(db, survey, people)
    correct(db, survey, people, ids["D3"], 4.52)
    set_aside(db, survey, people, ids["D5"])
    servers.add_settings_and_decision(db, survey, people["office"])
    db.close()
    return survey


@pytest.fixture
def there(database_with_people, tmp_path):
    """Another server with the same three people, and nothing else."""
    with servers.server_with(database_with_people, tmp_path) as database:
        yield database


@pytest.fixture
def strange(tmp_path):
    """A server that knows nobody but an office of its own, and that person's id."""
    with servers.server(f"sqlite:///{tmp_path / 'strange.sqlite3'}") as database:
        with database.writing() as db:
            office = people_service.add_person(db, STRANGER).id
        yield database, office


def lines(content, name):
    with zipfile.ZipFile(BytesIO(content)) as archive:
        return [json.loads(line) for line in archive.read(f"{name}.jsonl").decode().split("\n")[:-1]]


def test_every_table_is_carried_or_left_out_with_a_reason():
    named = set(tables.CARRIED) | set(tables.LEFT_OUT)
    assert set(Base.metadata.tables) == named, "say in webapp/surveyfile/tables.py whether a survey file carries it"
    assert not set(tables.CARRIED) & set(tables.LEFT_OUT)
    assert all(tables.LEFT_OUT.values())


def test_imported_elsewhere_it_is_the_same_file_byte_by_byte(here, there, filled, people):
    content = servers.exported(here, filled)
    outcome = servers.imported(there, content, people["office"].id)
    assert outcome.new and not outcome.differences and not outcome.notes
    assert servers.exported(there, filled) == content
    counts = {name: len(lines(content, name)) for name in tables.CARRIED}
    assert (counts["reading"], counts["reading_event"], counts["decision"], counts["person"]) == (4, 2, 1, 3)
    assert (counts["settings_version"], counts["survey_member"], counts["plan_version"]) == (2, 3, 1)


def test_on_postgresql_too(here, filled, people, tmp_path):
    content = servers.exported(here, filled)
    with postgres_server() as url, servers.server(url) as there:
        with here.reading() as db, there.writing() as other:
            for person in db.scalars(select(Person)):
                other.add(Person(**{column.key: getattr(person, column.key) for column in Person.__table__.columns}))
            other.commit()
        servers.imported(there, content, people["office"].id)
        assert servers.exported(there, filled) == content
        assert servers.imported(there, content, people["office"].id).total == 0
        new = servers.add_reading(there, filled, "D4", people["crew"], note="ä \u2028 漢 \N{WATER WAVE}")
        outcome = servers.imported(here, servers.exported(there, filled), people["office"].id)
        assert [row["id"] for row in outcome.added["reading"]] == [new]
        assert servers.exported(here, filled) == servers.exported(there, filled)


def test_imported_twice_it_adds_nothing(here, there, filled, people):
    content = servers.exported(here, filled)
    servers.imported(there, content, people["office"].id)
    again = servers.imported(there, content, people["office"].id)
    assert (again.total, again.differences, again.notes) == (0, (), ())
    with there.reading() as db:
        assert len(db.scalars(select(History).where(History.what == tables.FILE_IMPORTED)).all()) == 1


def test_a_grown_copy_merged_back_adds_only_what_is_new(here, there, filled, people):
    servers.imported(there, servers.exported(here, filled), people["office"].id)
    new = servers.add_reading(there, filled, "D4", people["crew"])
    with there.writing() as db:
        correct(db, filled, people, new, 5.6)
    grown_here = servers.add_reading(here, filled, "D3", people["crew"])
    outcome = servers.imported(here, servers.exported(there, filled), people["office"].id)
    added = {name: len(rows) for name, rows in outcome.added.items() if rows}
    assert added == {"reading": 1, "reading_event": 1, "history": 1}
    assert outcome.differences == ()
    with here.reading() as db:
        readings = {one.id: one for one in readings_of(db, filled.id)}
    assert len(readings) == 6 and grown_here in readings
    assert readings[new].events[0].new_value == 5.6


def test_what_differs_is_told_and_stays_as_it_is_here(here, there, filled, people):
    servers.imported(there, servers.exported(here, filled), people["office"].id)
    with there.writing() as db:
        db.get(Survey, filled.id).criterion_basis = "the permit"
        reading = db.scalar(select(Reading).where(Reading.survey_id == filled.id, Reading.note == "-"))
        reading.note, reading.entered = (
            "changed behind our back",
            {**reading.entered, "meter": {"text": "B", "unit": "1"}},
        )
        db.commit()
    before = servers.exported(here, filled)
    outcome = servers.imported(here, servers.exported(there, filled), people["office"].id)
    assert outcome.total == 0
    assert servers.exported(here, filled) == before
    told = {one.title.split(" ")[0]: dict((name, pair) for name, *pair in one.lines) for one in outcome.differences}
    assert told["Survey"] == {"criterion_basis": ["nothing", "the permit"]}
    assert told["Reading"]["note"] == ["-", "changed behind our back"]
    assert told["Reading"]["entered, meter"] == ["nothing", "B 1"]
    assert outcome.differences[1].title == "Reading at D3, 2026-08-12 11:30 UTC"


def test_plans_made_on_both_sides_are_both_kept_and_the_files_come_last(here, there, filled, people):
    servers.imported(there, servers.exported(here, filled), people["office"].id)
    assert servers.add_station(here, filled, "D9", 28.0, people["lead"]) == 2
    assert servers.add_station(there, filled, "E1", 15.0, people["lead"]) == 2
    assert servers.add_station(there, filled, "E2", 16.0, people["lead"]) == 3
    servers.add_reading(there, filled, "E2", people["crew"])
    content = servers.exported(there, filled)
    outcome = servers.imported(here, content, people["office"].id)
    assert "version 4, the file's last, is the one in use" in outcome.notes[0]
    assert outcome.notes[1:] == (
        "Plan version 2 of the file is version 3 here.",
        "Plan version 3 of the file is version 4 here.",
    )
    with here.reading() as db:
        versions = {
            one.number: {row["code"] for row in one.tables["stations"]}
            for one in plan_queries.plan_versions(db, filled.id)
        }
        (reading,) = [one for one in readings_of(db, filled.id) if one.station.code == "E2"]
        assert plan_queries.current_plan(db, filled.id).id == reading.plan_version_id
    assert "D9" in versions[2] and "E1" not in versions[2]
    assert "E1" in versions[3] and "E2" not in versions[3]
    assert "E2" in versions[4]
    again = servers.imported(here, content, people["office"].id)
    assert (again.total, again.differences) == (0, ())
    assert again.notes == outcome.notes[1:]


def test_a_code_given_on_both_sides_to_two_stations_is_kept_apart(here, there, filled, people):
    servers.imported(there, servers.exported(here, filled), people["office"].id)
    servers.add_station(here, filled, "D9", 28.0, people["lead"])
    servers.add_station(there, filled, "d9", 15.0, people["lead"])
    new = servers.add_reading(there, filled, "d9", people["crew"])
    content = servers.exported(there, filled)
    outcome = servers.imported(here, content, people["office"].id)
    assert "Station d9 of the file is d9-2 here" in outcome.notes[-1]
    with here.reading() as db:
        stations = {
            row["code"]: row["distance_km"] for row in plan_queries.current_plan(db, filled.id).tables["stations"]
        }
        assert stations["d9-2"] == 15.0 and "d9" not in stations
        assert {one.id: one.station.code for one in readings_of(db, filled.id)}[new] == "d9-2"
    assert servers.imported(here, content, people["office"].id).total == 0
    assert looks_settled(servers.looked(there, servers.exported(here, filled), people["office"].id))


def looks_settled(outcome):
    """Return whether a file merged back adds only what the other side made, and nothing differs."""
    added = {name for name, rows in outcome.added.items() if rows}
    return not outcome.differences and added == {"plan_version", "station", "history"}


def test_people_only_the_file_knows_become_closed_accounts_that_nobody_signs_in_to(here, strange, filled, people):
    database, office = strange
    content = servers.exported(here, filled)
    servers.imported(database, content, office)
    with database.reading() as db:
        crew = db.get(Person, people["crew"].id)
        assert (crew.name, crew.role, crew.active, crew.password_hash) == ("Cleo Banks", "crew", False, "")
        assert {one.author.name for one in readings_of(db, filled.id)} == {"Cleo Banks"}
        assert all(people_service.check_sign_in(db, crew.sign_in, typed) is None for typed in ("", PASSWORD))
        assert db.get(SurveyMember, (filled.id, office)) is not None
    with database.writing() as db:
        people_service.set_active(db, crew.id, True, office)
        assert people_service.check_sign_in(db, crew.sign_in, "") is None
    with database.writing() as db:
        people_service.change_password(db, crew.id, PASSWORD, office)
        assert people_service.check_sign_in(db, crew.sign_in, PASSWORD).id == crew.id


def test_the_file_tells_no_passwords_and_no_sign_in_names(here, filled):
    content = servers.exported(here, filled)
    with zipfile.ZipFile(BytesIO(content)) as archive:
        everything = b"".join(archive.read(name) for name in archive.namelist())
    assert {tuple(sorted(row)) for row in lines(content, "person")} == {("id", "name", "role")}
    assert b"office.test" not in everything and b"scrypt" not in everything and b"session_key" not in everything


def test_two_of_the_same_name_and_a_name_in_another_script_get_sign_ins_of_their_own(here, strange, filled, people):
    database, office = strange
    twins = [str(uuid.UUID(int=number)) for number in (1, 2, 3)]
    with here.writing() as db:
        for number, (one, name) in enumerate(zip(twins, ("Ann Lee", "Ann Lee", "河"), strict=True)):
            db.add(Person(id=one, name=name, sign_in=f"t{number}", password_hash="", role="crew"))
            db.flush()
            db.add(SurveyMember(survey_id=filled.id, person_id=one))
        db.commit()
    servers.imported(database, servers.exported(here, filled), office)
    with database.reading() as db:
        made = [db.get(Person, one).sign_in for one in twins]
        assert made == ["ann.lee.0000", f"ann.lee.{twins[1]}", "person.0000"]
        assert find_by_sign_in(db, made[1]).id == twins[1]


def test_somebody_taken_off_here_is_not_put_back_by_a_file(here, there, filled, people):
    content = servers.exported(here, filled)
    servers.imported(there, content, people["office"].id)
    with there.writing() as db:
        survey_service.remove_member(db, filled.id, people["crew"].id, people["office"].id)
    outcome = servers.imported(there, content, people["office"].id)
    assert outcome.total == 0
    assert outcome.notes == ("Cleo Banks was taken off the survey here, and stays off it.",)


def test_a_file_is_no_way_into_a_survey_that_one_is_not_on(here, filled, people):
    content = servers.exported(here, filled)
    with here.writing() as db:
        other = people_service.add_person(db, STRANGER).id
    with pytest.raises(NotAllowed, match="not on it"):
        servers.looked(here, content, other)
    with pytest.raises(NotAllowed, match="not on it"):
        servers.imported(here, content, other)


def test_what_was_agreed_to_is_what_is_added(here, there, filled, people):
    servers.imported(there, servers.exported(here, filled), people["office"].id)
    servers.add_reading(there, filled, "D4", people["crew"])
    content = servers.exported(there, filled)
    mark = servers.looked(here, content, people["office"].id).mark
    servers.imported(here, content, people["office"].id)
    with here.writing() as db, pytest.raises(Conflict, match="changed here since"):
        service.import_file(db, service.read(content), people["office"].id, mark)


def test_an_import_that_fails_half_way_adds_nothing(here, there, filled, people):
    def break_down(_connection, _cursor, statement, *_rest):
        if statement.startswith("INSERT INTO reading_event"):
            raise OSError("the disk is full")

    event.listen(there.engine, "before_cursor_execute", break_down)
    with pytest.raises(OSError, match="disk is full"):
        servers.imported(there, servers.exported(here, filled), people["office"].id)
    with there.reading() as db:
        assert db.get(Survey, filled.id) is None
        assert db.scalars(select(Reading)).all() == db.scalars(select(ReadingEvent)).all() == []


AWKWARD = st.text(st.characters(exclude_categories=["Cs"], exclude_characters="\x00"), max_size=60)


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(note=AWKWARD, typed=AWKWARD, reason=AWKWARD.filter(str.strip))
def test_texts_travel_as_they_are(here, there, filled, people, note, typed, reason):
    entered = {"do_mg_l": {"text": typed, "unit": "mg/L"}}
    new = servers.add_reading(here, filled, "D4", people["crew"], note=note, entered=entered)
    with here.writing() as db:
        set_aside(db, filled, people, new, reason=reason)
    content = servers.exported(here, filled)
    servers.imported(there, content, people["office"].id)
    assert servers.exported(there, filled) == content
    with there.reading() as db:
        reading = db.get(Reading, new)
        assert (reading.note, reading.entered, reading.events[0].reason) == (note, entered, reason)


@pytest.mark.parametrize(
    "text", ['5" pipe, "mud"', "a\r\nb\rc\n", "=cmd|'/c calc'!A1", "ä;ß,漢,עברית", "\u2028\u2029\x85\x1a", "{}", ""]
)
def test_awkward_text_comes_through(here, there, filled, people, text):
    new = servers.add_reading(here, filled, "D4", people["crew"], note=text)
    servers.imported(there, servers.exported(here, filled), people["office"].id)
    with there.reading() as db:
        assert db.get(Reading, new).note == text
