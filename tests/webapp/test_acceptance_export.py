"""What the acceptance list expects of the dataset: clocks that change, late bottles, odd oxygen, reading back."""

import csv
import io
from datetime import UTC, datetime, timedelta
from types import SimpleNamespace

import pytest

from tests.webapp import servers
from tests.webapp.plans import put_plan
from webapp.dataset import importing, service
from webapp.models import Bottle, LabResult, Survey
from webapp.plan.queries import stations_of
from webapp.review.service import import_readings

HALF = timedelta(minutes=30)
# Half-hours of UTC around 01:00 UTC, when the clocks of the survey's zone change.
SPRING = [datetime(2026, 3, 29, 0, 0, tzinfo=UTC) + step * HALF for step in range(4)]
AUTUMN = [datetime(2026, 10, 25, 0, 0, tzinfo=UTC) + step * HALF for step in range(4)]
FORMULA = "=cmd|'/c calc'!A1"


@pytest.fixture(scope="module")
def place(database_with_people, tmp_path_factory):
    """A survey read over both changes of the clocks with odd values and a late bottle: its server and its dataset."""
    place = servers.server_with_survey(database_with_people, tmp_path_factory.mktemp("source"))
    with place as (database, survey, people):
        with database.writing() as db:
            put_plan(db, survey, people["lead"])
            import_readings(db, survey, [_row(*one) for one in enumerate(SPRING + AUTUMN)], people["crew"].id)
            _put_late_bottle(db, survey, people["crew"])
        with database.reading() as db:
            dataset = service.dataset_of(db, db.get(Survey, survey.id))
        yield SimpleNamespace(database=database, office=people["office"].id, survey=survey, dataset=dataset)


def _row(at, taken_at):
    """Return a paper sheet's row: half-hours at D2, of which the first three have oxygen or words to stumble over."""
    do_mg_l = {0: 0.0, 1: -0.05, 2: 16.2}.get(at, 6.0 + at / 8)
    note = FORMULA if at == 0 else ""
    return {"station": "D2", "taken_at": taken_at, "do_mg_l": do_mg_l, "water_temp_c": 20.0, "note": note,
            "latitude": 48.0, "longitude": -0.02}  # fmt: skip


def _put_late_bottle(db, survey, crew):
    row = {"survey_id": survey.id, "author_id": crew.id}
    collected = datetime(2026, 8, 12, 4, 10, tzinfo=UTC)
    station = stations_of(db, survey.id)["D2"]
    bottle = Bottle(station_id=station.id, code="D2-1", analysis="bod5", collected_at=collected, **row)
    db.add(bottle)
    db.flush()
    set_up = datetime(2026, 8, 14, 5, 0, tzinfo=UTC)
    db.add(LabResult(bottle_id=bottle.id, value=3.4, started_at=set_up, quality={}, **row))
    db.commit()


def rows_in(place, name):
    text = place.dataset.files[name].decode("utf-8")
    return list(csv.DictReader(io.StringIO(text, newline="")))


def test_readings_over_both_changes_of_the_clocks_keep_their_order_their_lengths_and_their_offsets(place):
    written = [row["taken_at"] for row in rows_in(place, "readings.csv")]
    assert [datetime.fromisoformat(text) for text in written] == SPRING + AUTUMN
    assert [text[10:] for text in written] == [
        "T01:00:00+01:00", "T01:30:00+01:00", "T03:00:00+02:00", "T03:30:00+02:00",
        "T02:00:00+02:00", "T02:30:00+02:00", "T02:00:00+01:00", "T02:30:00+01:00",
    ]  # fmt: skip
    assert rows_in(place, "survey.csv")[0]["time_zone"] == "Europe/Vienna"


def test_read_back_on_another_server_it_is_the_same_bytes(place, database_with_people, tmp_path):
    content = service.zip_of(place.dataset)
    with servers.server_with(database_with_people, tmp_path) as other:
        with other.writing() as db:
            mark = importing.look(db, content, place.office).outcome.mark
            importing.import_dataset(db, content, place.office, mark)
        with other.reading() as db:
            again = service.dataset_of(db, db.get(Survey, place.survey.id))
    assert service.zip_of(again) == content
    with place.database.reading() as db:
        assert service.zip_of(service.dataset_of(db, db.get(Survey, place.survey.id))) == content


def test_a_longitude_west_of_zero_stays_a_number_and_a_formula_in_a_note_does_not_stay_one(place):
    first = rows_in(place, "readings.csv")[0]
    assert {row["longitude"] for row in rows_in(place, "readings.csv")} == {"-0.02"}
    assert first["note"] == "'" + FORMULA


def test_oxygen_of_zero_and_below_is_exported_as_read_and_told_as_less_than_the_limit(place):
    zero, below, over = rows_in(place, "readings.csv")[:3]
    assert [(one["do_mg_l_raw"], one["do_mg_l_final"]) for one in (zero, below)] == [("0", ""), ("-0.05", "")]
    assert {(one["do_censor"], one["do_reporting_limit_mg_l"]) for one in (zero, below)} == {("less_than", "0.2")}
    assert (over["do_mg_l_raw"], over["do_mg_l_final"], over["do_censor"]) == ("16.2", "16.2", "none")


def test_a_bottle_of_06_10_set_up_at_07_00_two_days_later_is_exported_late_with_its_result(place):
    (bottle,) = rows_in(place, "bottles.csv")
    assert bottle["collected_at"] == "2026-08-12T06:10:00+02:00"
    assert round(float(bottle["hold_hours"]), 1) == 48.8
    assert "past_hold_time" in bottle["reasons"].split(";") and bottle["quality"] == "questionable"
    assert bottle["value"] == "3.4"
    (result,) = rows_in(place, "lab_results.csv")
    assert (result["started_at"], result["value"]) == ("2026-08-14T07:00:00+02:00", "3.4")
