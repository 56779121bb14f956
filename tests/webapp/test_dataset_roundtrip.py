"""Export then import is the identity, whatever people wrote and meters showed."""

import itertools
import re
import uuid
from datetime import UTC, datetime

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sqlalchemy import String

from tests.conftest import ROLES, SURVEY_FORM
from tests.webapp import servers
from tests.webapp.everything import put_everything
from webapp.dataset import importing, service
from webapp.models import Survey
from webapp.people.queries import find_by_sign_in
from webapp.plan.rows import refused_code
from webapp.surveyfile import checks
from webapp.surveyfile import service as surveyfile
from webapp.surveyfile.rows import lines_of, rows_in
from webapp.surveyfile.tables import CARRIED, carried
from webapp.surveys.forms import parse_survey
from webapp.surveys.service import create_survey

AWKWARD = [
    "", "=cmd|'/c calc'!A1", "'", "''x", "'=1", '"', '","', "a\r\nb", "\r", "\n", "-", "-5", "+8,1", "NA", "NULL",
    " x ", ";", "\\", "עברית", "漢字", "e\u0301", "\u2028", "\x1a", "\ufeff", "@now", "\t", "true", "2026-08-12",
]  # fmt: skip
TEXTS = st.lists(
    st.one_of(st.sampled_from(AWKWARD), st.text(max_size=12)).filter(lambda one: "\x00" not in one),
    min_size=9,
    max_size=9,
)
NUMBERS = st.lists(st.floats(0, 14), min_size=7, max_size=7)
CODES = st.text(min_size=1, max_size=8).filter(lambda one: "\x00" not in one and one.strip() and not refused_code(one))
MOMENTS = st.datetimes(datetime(2026, 10, 24), datetime(2026, 10, 26)).map(lambda one: one.replace(tzinfo=UTC))
ZONES = st.sampled_from(["Europe/Vienna", "America/St_Johns", "Asia/Kathmandu", "Pacific/Chatham", "UTC"])
WRITTEN = {"note", "reason", "purpose", "river", "criterion_basis", "maker", "model", "serial", "lot", "place", "seal",
           "laboratory", "analyst", "lab_number", "gave", "took", "meter", "unstable_reason", "preservative", "version",
           "entity", "replicate_of"}  # fmt: skip
SHOWN = {
    "do_mg_l", "water_temp_c", "depth_m", "ph", "soak_s", "distance_left_m", "sensor_depth_m", "old_value", "new_value",
    "sample_depth_m", "volume_ml", "arrival_temp_c", "resolution_mg_l", "position_radius_m",
}  # fmt: skip
UUIDS = re.compile(rb"[0-9a-f]{8}(?:-[0-9a-f]{4}){3}-[0-9a-f]{12}")
counter = itertools.count()


@pytest.fixture(scope="module")
def places(database_with_people, tmp_path_factory):
    """Two servers, who imports, and the rows of a survey with one of everything."""
    facts, _ = parse_survey(SURVEY_FORM)
    folders = [tmp_path_factory.mktemp(name) for name in ("one", "two", "source")]
    with (
        servers.server_with(database_with_people, folders[0]) as one,
        servers.server_with(database_with_people, folders[1]) as two,
        servers.server_with(database_with_people, folders[2]) as source,
    ):
        with source.reading() as db:
            people = {role: find_by_sign_in(db, f"{role}.test") for role in ROLES}
        with source.writing() as db:
            survey = create_survey(db, facts, people["office"].id)
        with source.writing() as db:
            put_everything(db, survey, people)
        yield one, two, people["office"].id, surveyfile.read(servers.exported(source, survey))


def another(tables, by_id):
    """Return the tables as another survey of other people: every id is new but that of who imports."""
    new, ids = uuid.UUID(int=next(counter)), {by_id.encode(): by_id.encode()}

    def renamed(found):
        return ids.setdefault(found[0], str(uuid.uuid5(new, found[0].decode())).encode())

    return {name: rows_in(carried()[name], UUIDS.sub(renamed, lines_of(rows))) for name, rows in tables.items()}


def rewritten(tables, office, texts, numbers, moments, code, zone):
    """Return the tables with other texts, numbers, times, code and zone; the office keeps its name."""
    texts, numbers, moments = (itertools.cycle(some) for some in (texts, numbers, moments))
    made = {name: [_row(name, row, texts, numbers, moments) for row in rows] for name, rows in tables.items()}
    for row in made["person"]:
        row["name"] = row["name"] if row["id"] == office else next(texts)
    for row in made["reading"]:
        row["longitude"] = -next(numbers) * 10
        row["entered"] = {"do_mg_l": {"text": next(texts), "unit": "mg/L"}}
        row["kept_findings"] = [{"name": "x", "says": next(texts)}]
    for row in made["history"]:
        row["particulars"] = {next(texts): [next(texts), next(numbers), None, {"a": -next(numbers)}]}
    made["survey"][0] |= {"time_zone": zone, "name": next(texts) or "?"}
    for row in made["station"]:
        row["code"] = code if row["code"] == "D2" else row["code"]
    for plan in made["plan_version"]:
        stations = [{**row, "code": code if row["code"] == "D2" else row["code"]} for row in plan["tables"]["stations"]]
        plan["tables"] = {**plan["tables"], "stations": stations}
    return made


def _row(name, row, texts, numbers, moments):
    row = dict(row)
    for column, kind in carried()[name].columns.items():
        if column in WRITTEN and isinstance(kind.type, String):
            row[column] = next(texts)[: kind.type.length]
        elif column in SHOWN and row[column] is not None:
            row[column] = next(numbers)
        elif column in ("made_at", "received_at", "taken_at") and name != "survey_event":
            row[column] = next(moments)
    return row


def exported(database, survey_id):
    with database.reading() as db:
        return service.dataset_of(db, db.get(Survey, survey_id))


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(texts=TEXTS, numbers=NUMBERS, moments=st.lists(MOMENTS, min_size=5, max_size=5), code=CODES, zone=ZONES)
def test_export_then_import_is_the_identity(places, texts, numbers, moments, code, zone):
    one, two, office, tables = places
    made = another(rewritten(tables, office, texts, numbers, moments, code, zone), office)
    checks.check(made)
    with one.writing() as db:
        surveyfile.import_file(db, made, office)
    survey_id = made["survey"][0]["id"]
    dataset = exported(one, survey_id)
    content = service.zip_of(dataset)
    with two.writing() as db:
        mark = importing.look(db, content, office).outcome.mark
        importing.import_dataset(db, content, office, mark)
    assert exported(two, survey_id).files == dataset.files
    with two.reading() as db:
        stored = surveyfile.queries.rows_of(db, survey_id)
    for name in sorted(set(CARRIED) - {"survey", "plan_version", "survey_member", "history"}):
        assert stored[name] == sorted(made[name], key=carried()[name].key_of), name
    assert stored["survey"] == [{**made["survey"][0], "safety_note": ""}]
