"""A dataset read back: equal on a server that did not have it, compared where it does, bad cells named."""

import csv
import io
import json
import zipfile
from datetime import UTC, datetime
from types import SimpleNamespace

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sqlalchemy import select

from tests.conftest import PASSWORD, SURVEY_FORM
from tests.needs import postgres_server
from tests.webapp import servers
from tests.webapp.everything import put_everything
from webapp import demo
from webapp.dataset import importing, service
from webapp.dataset.cells import BadDataset
from webapp.dataset.kept import NOT_HERE, kept
from webapp.dataset.package import checksums, zipped
from webapp.errors import Conflict, NotAllowed
from webapp.models import History, Reading, Survey, SurveyEvent, SurveyMember
from webapp.people import service as people_service
from webapp.people.forms import NewPerson
from webapp.surveyfile import service as surveyfile
from webapp.surveyfile.archive import BadSurveyFile
from webapp.surveyfile.tables import carried
from webapp.surveys.forms import parse_survey
from webapp.surveys.service import change_survey

STRANGER = NewPerson("Ivo Marsh", "ivo", "office", PASSWORD)


@pytest.fixture(scope="module")
def source(database_with_people, tmp_path_factory):
    """A server with a survey that has one of everything, and its dataset; nobody changes either."""
    place = servers.server_with_survey(database_with_people, tmp_path_factory.mktemp("source"))
    with place as (database, survey, people):
        with database.writing() as db:
            put_everything(db, survey, people)
        with database.reading() as db:
            dataset = service.dataset_of(db, db.get(Survey, survey.id))
        content = service.zip_of(dataset)
        yield SimpleNamespace(database=database, survey=survey, people=people, dataset=dataset, content=content)


@pytest.fixture
def strange(tmp_path):
    """A server that knows nobody but an office of its own, and that person's id."""
    with servers.server(f"sqlite:///{tmp_path / 'strange.sqlite3'}") as database:
        with database.writing() as db:
            office = people_service.add_person(db, STRANGER).id
        yield database, office


@pytest.fixture(scope="module")
def strange_tables():
    """The tables that an import reads."""
    own = [one.table for name, one in kept().items() if name != "survey_member"]
    return [*own, "settings", "plan_rows", "reading_values"]


def imported(database, content, by_id):
    with database.writing() as db:
        mark = importing.look(db, content, by_id).outcome.mark
        return importing.import_dataset(db, content, by_id, mark)


def looked(database, content, by_id):
    with database.reading() as db:
        return importing.look(db, content, by_id)


def exported(database, survey_id):
    with database.reading() as db:
        return service.dataset_of(db, db.get(Survey, survey_id))


def unzipped(content):
    with zipfile.ZipFile(io.BytesIO(content)) as opened:
        return {name: opened.read(name) for name in opened.namelist()}


def with_rows(content, name, change, sealed=True):
    """Return the zip after change(rows) of one table, rows being lists of cells with the header first."""
    files = unzipped(content)
    rows = list(csv.reader(io.StringIO(files[f"{name}.csv"].decode(), newline="")))
    change(rows)
    out = io.StringIO(newline="")
    csv.writer(out).writerows(rows)
    files[f"{name}.csv"] = out.getvalue().encode()
    if sealed:
        del files["checksums.txt"]
        files["checksums.txt"] = checksums(files)
    return zipped(files)


def cell_set(column, value, row=1):
    def change(rows):
        rows[row][rows[0].index(column)] = value

    return change


def test_every_stored_value_is_kept_or_left_out_for_a_reason():
    for name, one in carried().items():
        if name != "survey_member":
            assert set(one.columns) == set(kept()[name].fields) | (set(one.columns) & set(NOT_HERE)), name
            here = [field.name for field in kept()[name].fields.values()]
            assert len(here) == len(set(here)), name


def test_read_back_on_a_fresh_server_it_is_the_same_files_byte_by_byte(source, strange):
    database, office = strange
    found = imported(database, source.content, office)
    assert found.outcome.new and found.version == source.dataset.version and not found.changed
    again = exported(database, source.survey.id)
    for name, content in source.dataset.files.items():
        assert again.files[name].decode() == content.decode(), name
    assert service.zip_of(again) == source.content


def test_read_back_everything_stored_is_the_same_but_for_what_is_private(source, strange):
    database, office = strange
    imported(database, source.content, office)
    with source.database.reading() as one, database.reading() as two:
        here = surveyfile.export(one, source.survey)
        there = surveyfile.export(two, source.survey)
    rows = [{name: text.decode().splitlines() for name, text in unzipped(file).items()} for file in (here, there)]
    for name in carried():
        mine, theirs = ([json.loads(line) for line in some[f"{name}.jsonl"]] for some in rows)
        if name == "plan_version":
            for row in mine:
                for access in row["tables"]["access"]:
                    access.pop("contact", None)
        assert mine == theirs, name


def test_whoever_imports_it_may_look_and_stays_out_of_later_exports(source, strange):
    database, office = strange
    imported(database, source.content, office)
    with database.reading() as db:
        assert db.get(SurveyMember, (source.survey.id, office)) is not None
        (line,) = db.query(History).filter(History.what == "dataset imported")
        assert (line.person_id, line.particulars["version"]) == (office, source.dataset.version)
    assert "Ivo Marsh" not in b"".join(exported(database, source.survey.id).files.values()).decode()


def test_a_server_that_has_the_survey_says_whether_it_is_equal(source):
    office = source.people["office"].id
    found = looked(source.database, source.content, office)
    assert found.equal and not found.outcome.new and not found.outcome.differences
    with source.database.writing() as db, pytest.raises(Conflict, match="has the survey already"):
        importing.import_dataset(db, source.content, office, found.outcome.mark)
    with source.database.reading() as db, pytest.raises(NotAllowed, match="you are not on it"):
        importing.look(db, source.content, source.people["crew"].id)


def test_a_server_that_has_the_survey_says_what_differs(source, database_with_people, tmp_path):
    office = source.people["office"].id
    with servers.server_with(database_with_people, tmp_path) as there:
        imported(there, source.content, office)
        with there.writing() as db:
            facts, _ = parse_survey({**SURVEY_FORM, "elevation_m": "212", "safety_note": "Ring 0650 1"})
            change_survey(db, source.survey.id, facts, office)
        found = looked(there, source.content, office)
    (difference,) = found.outcome.differences
    assert [line for line in difference.lines] == [("elevation_m", "212.0", "210.0")]
    assert found.here_only == (("Lines of the history", 1),) and not found.equal


@pytest.mark.parametrize(
    ("table", "column", "value", "message"),
    [
        ("readings", "do_mg_l_raw", "8,1", "a number with a decimal point"),
        ("readings", "do_mg_l_raw", "nan", "a number with a decimal point"),
        ("readings", "taken_at", "12.08.2026 06:30", "a time with its offset"),
        ("readings", "taken_at", "", "a value is missing"),
        ("readings", "author", "Nobody", "does not say what that is"),
        ("readings", "station_code", "Z9", "does not say what that is"),
        ("readings", "replicate", "maybe", "true or false"),
        ("readings", "typed", "{", "JSON is wanted here"),
        ("readings", "reading_id", "../x", "this is no id"),
        ("reading_values", "reading_id", "x", "there is no such reading"),
        ("reading_values", "after_s", "soon", "a number"),
        ("survey", "created_at", "2026-08-12T06:00:00", "a time with its offset"),
        ("people", "person_id", "", "a value is missing"),
        ("plan_versions", "plan_version", "one", "a whole number"),
        ("plan_rows", "table", "moons", "no such table"),
        ("plan_rows", "values", "[", "JSON is wanted"),
        ("settings", "value", "much", "a number"),
        ("settings", "settings_version", "99", "there is no such one"),
        ("audit", "particulars", '{"a": NaN}', "JSON is wanted"),
        ("meters", "name", "m" * 61, "longer than 60"),
    ],
)
def test_a_bad_cell_is_named_by_file_row_and_column(source, table, column, value, message):
    bad = with_rows(source.content, table, cell_set(column, value))
    with pytest.raises(BadDataset, match="can't be read") as refusal:
        looked(source.database, bad, source.people["office"].id)
    cell = refusal.value.cells[0]
    assert (cell.file, cell.row, cell.column, cell.typed) == (f"{table}.csv", 2, column, value[:60])
    assert message in cell.message


STRANGE = [
    "", "'", "-1", "0", "1e400", "nan", "9" * 400, "[]", "{}", '{"a": 1}', '[{"name": 1}]', "[" * 3000, "true", "D3",
    "a/b", "0001-01-01T00:00:00+23:59", "2026-08-12T06:00:00Z", "\ud7ff", "x" * 5000, "..", "1.5", "draft",
]  # fmt: skip


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(place=st.tuples(*[st.integers(0, 10**6)] * 3), value=st.one_of(st.sampled_from(STRANGE), st.text(max_size=20)))
def test_whatever_a_cell_says_it_is_read_or_refused(source, strange_tables, place, value):
    table = strange_tables[place[0] % len(strange_tables)]

    def change(rows):
        row = rows[1 + place[1] % (len(rows) - 1)]
        row[place[2] % len(row)] = value

    try:
        found = looked(source.database, with_rows(source.content, table, change), source.people["office"].id)
    except (BadSurveyFile, NotAllowed) as refusal:
        assert 0 < len(str(refusal)) < 400
    else:
        assert found.outcome.name


def test_all_bad_cells_are_named_at_once(source):
    def change(rows):
        for row in (1, 3):
            cell_set("do_mg_l_raw", "x", row)(rows)
            cell_set("water_temp_c_raw", "y", row)(rows)

    with pytest.raises(BadDataset, match="4 cells") as refusal:
        looked(source.database, with_rows(source.content, "readings", change), source.people["office"].id)
    assert [(cell.row, cell.column[:2]) for cell in refusal.value.cells] == [(2, "do"), (2, "wa"), (4, "do"), (4, "wa")]


@pytest.mark.parametrize(
    ("table", "change", "message"),
    [
        ("readings", lambda rows: rows[0].__setitem__(0, "x"), "readings.csv lacks the column reading_id"),
        ("readings", lambda rows: rows.append(rows[1]), "1 cell that can't be read"),
        ("readings", lambda rows: rows[1].append("x"), "1 cell that can't be read"),
        ("survey", lambda rows: rows.pop(), "another number of them"),
        ("survey", lambda rows: rows.clear(), "lacks the column"),
        ("people", lambda rows: rows.append(rows[1]), "can't be read"),
        ("meter_checks", cell_set("standard", "gin"), "standard"),
        ("readings", cell_set("position", "top"), "position"),
        ("stations", cell_set("code", "a/b"), "can't be read|Bankside can't take"),
    ],
)
def test_what_is_no_dataset_is_refused(source, table, change, message):
    with pytest.raises(BadSurveyFile, match=message):
        looked(source.database, with_rows(source.content, table, change), source.people["office"].id)


@pytest.mark.parametrize("junk", [b"", b"PK", b"hello", b"PK\x03\x04" + b"\x00" * 50])
def test_what_is_no_zip_is_refused(source, junk):
    with pytest.raises(BadSurveyFile):
        looked(source.database, junk, source.people["office"].id)


@pytest.mark.parametrize(
    "text", [b"[]", b"{", b'{"bankside_layout": 99}', b'{"bankside_layout": "2"}', b"{}", b"[" * 9999]
)
def test_a_package_of_somebody_else_or_another_bankside_is_refused(source, text):
    files = {**unzipped(source.content), "datapackage.json": text}
    with pytest.raises(BadDataset, match="Bankside"):
        looked(source.database, zipped(files), source.people["office"].id)


def test_the_folder_zipped_anew_by_another_program_is_taken(source, strange):
    database, office = strange
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w") as anew:
        anew.writestr("alder-brook/", b"")
        for name, content in unzipped(source.content).items():
            anew.writestr(f"alder-brook/{name}", content)
    found = looked(database, out.getvalue(), office)
    assert found.outcome.new and not found.changed


def test_a_changed_file_is_told_and_written_into_the_history(source, strange):
    database, office = strange
    changed = with_rows(source.content, "readings", cell_set("note", "'=2"), sealed=False)
    found = imported(database, changed, office)
    assert found.changed == ("readings.csv",)
    with database.reading() as db:
        (line,) = db.query(History).filter(History.what == "dataset imported")
        assert line.particulars["changed"] == ["readings.csv"]
        assert "=2" in [one.note for one in db.query(Reading)]


def test_import_in_two_steps_stores_what_was_looked_at(browser_as, source, db):
    office = browser_as("office")
    preview = office.post("/datasets/import/preview", {"file": (io.BytesIO(source.content), "d.zip")})
    assert preview.status_code == 200 and "Store the survey" in preview.text and source.dataset.version in preview.text
    assert db.query(Survey).count() == 0
    db.rollback()
    held, mark = (preview.text.split(f'name="{name}" value="')[1].split('"')[0] for name in ("held", "mark"))
    stored = office.post("/datasets/import", {"held": held, "mark": mark})
    assert stored.status_code == 303
    page = office.get(stored.headers["Location"])
    assert "stored from its dataset" in page.text
    assert office.get(f"/surveys/{source.survey.id}/dataset.zip").data == source.content
    again = office.post("/datasets/import/preview", {"file": (io.BytesIO(source.content), "d.zip")})
    assert "is equal to it" in again.text and "Store the survey" not in again.text
    assert office.post("/datasets/import", {"held": held, "mark": mark}).status_code == 409


def test_every_page_of_a_survey_taken_from_its_dataset_works(app, browser_as, source, people):
    imported(app.extensions["bankside_database"], source.content, people["office"].id)
    office, seen = browser_as("office"), {}
    for rule in app.url_map.iter_rules():
        if "GET" in rule.methods and rule.arguments == {"survey_id"}:
            address = rule.rule.replace("<survey_id>", source.survey.id)
            seen[rule.endpoint] = office.get(address).status_code
    assert {"sag.page", "meters.page", "review.todo", "settings.page", "bottles.page", "dataset.page"} <= set(seen)
    assert {name: status for name, status in seen.items() if status >= 400} == {}


def test_an_approved_survey_comes_approved_and_stays_as_it_was(source, strange, tmp_path, database_with_people):
    database, office = strange
    (tmp_path / "approved").mkdir()
    with servers.server_with(database_with_people, tmp_path / "approved") as approved:
        imported(approved, source.content, source.people["office"].id)
        with approved.writing() as db:
            event = {"survey_id": source.survey.id, "kind": "approved", "version": "reviewed-1-x", "reason": "good"}
            db.add(SurveyEvent(made_by_id=source.people["lead"].id, **event))
            db.commit()
        dataset = exported(approved, source.survey.id)
    assert dataset.version.startswith("approved-")
    imported(database, service.zip_of(dataset), office)
    again = exported(database, source.survey.id)
    assert again.files == dataset.files and b",approved," in again.files["readings.csv"]
    facts, _ = parse_survey({**SURVEY_FORM, "elevation_m": "212"})
    with database.writing() as db, pytest.raises(Conflict, match="approved"):
        change_survey(db, source.survey.id, facts, office)


def test_the_import_page_names_bad_cells_and_takes_nothing(browser_as, source, db):
    bad = with_rows(source.content, "readings", cell_set("do_mg_l_raw", "<b>x"))
    answer = browser_as("office").post("/datasets/import/preview", {"file": (io.BytesIO(bad), "d.zip")})
    assert answer.status_code == 422
    assert "readings.csv" in answer.text and "do_mg_l_raw" in answer.text and "&lt;b&gt;x" in answer.text
    assert db.query(Survey).count() == 0


@pytest.mark.parametrize("form", [{}, {"held": "%%%"}, {"held": "aGVsbG8=", "mark": "x"}])
def test_an_import_without_its_preview_is_refused(browser_as, form):
    assert browser_as("office").post("/datasets/import", form).status_code == 422


def test_only_the_office_imports(browser_as):
    for role in ("crew", "lead"):
        assert browser_as(role).get("/datasets/import").status_code == 403
    assert browser_as("office").post("/datasets/import/preview").status_code == 422


def test_read_back_on_postgresql_it_is_the_same_zip(source):
    with postgres_server() as url, servers.server(url) as database:
        with database.writing() as db:
            office = people_service.add_person(db, STRANGER).id
        imported(database, source.content, office)
        assert service.zip_of(exported(database, source.survey.id)) == source.content


def test_what_forms_stored_in_the_demos_surveys_comes_back_the_same(strange, tmp_path):
    database, office = strange
    with servers.server(f"sqlite:///{tmp_path / 'demo.sqlite3'}") as filled:
        with filled.writing() as db:
            demo.load(db, datetime.now(UTC))
        with filled.reading() as db:
            ids = list(db.scalars(select(Survey.id)))
        assert ids
        for survey_id in ids:
            dataset = exported(filled, survey_id)
            imported(database, service.zip_of(dataset), office)
            assert exported(database, survey_id).files == dataset.files
