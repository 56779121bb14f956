"""The dataset: what a stranger finds in the zip."""

import csv
import hashlib
import io
import json
import zipfile
from datetime import UTC, datetime

import pandas
import pytest
from frictionless import Package
from hypothesis import given
from hypothesis import strategies as st

from tests.conftest import SURVEY_FORM
from tests.webapp.everything import PRIVATE_PHONE, put_everything, unpacked
from tests.webapp.plans import PLAN, put_plan
from tests.webapp.sheets import TAKEN, correct, put_readings
from webapp.dataset import package, service
from webapp.dataset.fields import (
    FORMULA_STARTS,
    PLAIN_NUMBER,
    DataTable,
    as_written,
    decimal,
    exact,
    harmless,
    text,
)
from webapp.dataset.summary import rounded
from webapp.models import Person, Reading
from webapp.people.access import SignedIn
from webapp.review import service as review


@pytest.fixture
def filled(db, survey, people):
    """A survey with one of everything."""
    put_everything(db, survey, people)
    return survey


@pytest.fixture(scope="module")
def folder(database_with_people, tmp_path_factory):
    """The zip of a survey with one of everything, unpacked. Made once: nobody changes it."""
    return unpacked(database_with_people, tmp_path_factory)


@pytest.fixture(scope="module")
def files(folder):
    """The files of the zip: a dictionary from name to bytes."""
    return {path.name: path.read_bytes() for path in folder.iterdir()}


def fetch(browser_as, survey):
    answer = browser_as("office").get(f"/surveys/{survey.id}/dataset.zip")
    assert answer.status_code == 200
    return answer.data


def rows_in(files, name):
    return list(csv.DictReader(io.StringIO(files[name].decode("utf-8"), newline="")))


def reading_at(files, code, name="readings.csv"):
    return next(row for row in rows_in(files, name) if row["station_code"] == code)


def by_id(files, reading_id):
    return next(row for row in rows_in(files, "readings.csv") if row["reading_id"] == reading_id)


def test_frictionless_finds_nothing_wrong(files, folder):
    report = Package(str(folder / "datapackage.json")).validate()
    assert report.valid, report.flatten(["name", "rowNumber", "fieldName", "message"])
    assert len(report.tasks) == sum(name.endswith(".csv") for name in files)


def test_pandas_reads_every_table_without_arguments(files, folder):
    tables = {path.stem: pandas.read_csv(path) for path in folder.glob("*.csv")}
    readings = tables["readings"].set_index("station_code")
    assert readings.loc["D3", "do_mg_l_raw"] == 4.25
    assert readings.loc["D3", "do_mg_l_final"] == 4.52
    assert readings["longitude"].dtype == float and readings.loc["U1", "longitude"] == -15.625
    assert tables["reaches"]["from_km"].tolist() == [-1.0, 0.0, 7.2, 19.0]
    assert pandas.to_datetime(readings["taken_at"]).iloc[0].tz_convert("UTC") == pandas.Timestamp(TAKEN)


def test_every_number_column_of_readings_is_numeric_to_pandas(files, folder):
    package = json.loads(files["datapackage.json"])
    schema = next(one["schema"] for one in package["resources"] if one["name"] == "readings")
    readings = pandas.read_csv(folder / "readings.csv")
    numeric = [field["name"] for field in schema["fields"] if field["type"] == "number"]
    assert len(numeric) == 3 * 9 + 1 + 2 + 1 + 2 + 3 + 10  # layers, drift, spread, limit, place across, place, derived
    assert not [name for name in numeric if not pandas.api.types.is_numeric_dtype(readings[name])]


def test_same_data_exported_twice_is_the_same_bytes(browser_as, filled):
    assert fetch(browser_as, filled) == fetch(browser_as, filled)


def test_order_in_which_keys_are_given_makes_no_other_bytes():
    rows, fields = [{"a": "1", "b": "2"}], (text("a", "A"), text("b", "B"))
    keys = {"b": ("people", "person"), "a": ("stations", "code")}
    made = [DataTable("t", "T", "", fields, ("a",), rows, dict(some)) for some in (keys, reversed(keys.items()))]
    one, other = (package.descriptor({}, [table], {"t.csv": b""}) for table in made)
    assert one == other
    schema = json.loads(one)["resources"][0]["schema"]
    assert [key["fields"] for key in schema["foreignKeys"]] == [["a"], ["b"]]


def test_who_answers_a_question_is_not_told_as_its_reviewer(db, filled, people):
    reading = db.query(Reading).filter(~Reading.events.any()).first()
    taker, reviewer = SignedIn(db.get(Person, reading.author_id)), SignedIn(people["office"])
    review.ask(db, filled.id, reading.id, "At the bridge?", 0, reviewer)
    review.answer(db, filled.id, reading.id, "Yes.", 1, taker)
    found = by_id(service.dataset_of(db, filled).files, reading.id)
    assert (found["status"], found["reviewed_by"]) == ("draft", "")
    review.keep(db, filled.id, reading.id, "As the crew says.", 2, reviewer)
    found = by_id(service.dataset_of(db, filled).files, reading.id)
    assert (found["status"], found["reviewed_by"]) == ("reviewed", people["office"].name)


def test_several_raw_values_are_read_even_where_percent_was_noted_too(db, filled):
    reading = next(one for one in db.query(Reading) if one.series)
    reading.do_percent = 68.0
    db.commit()
    assert by_id(service.dataset_of(db, filled).files, reading.id)["do_source"] == "read"


def test_solar_time_is_that_of_the_access_point_where_the_reading_has_no_place(db, filled, people):
    access = [{**row, "longitude": -30.0, "latitude": 44.0} for row in PLAN["access"]]
    put_plan(db, filled, people["lead"], {**PLAN, "access": access}, number=2)
    rows = rows_in(service.dataset_of(db, filled).files, "station_summary.csv")
    placed = {one.id for one in db.query(Reading) if one.longitude is not None}
    here = [row for row in rows if row["reading_id"] not in placed]
    assert here and placed
    for row in here:
        utc = datetime.fromisoformat(row["observed_at"]).astimezone(UTC)
        expected = (utc.hour + utc.minute / 60 + utc.second / 3600 - 2) % 24
        assert float(row["mean_solar_time_h"]) == pytest.approx(expected, abs=0.006)


def test_any_change_makes_another_version(browser_as, filled, db, people):
    before = service.dataset_of(db, filled)
    reading = db.query(Reading).first()
    correct(db, filled, people, reading.id, 8.0, based_on=len(reading.events))
    after = service.dataset_of(db, filled)
    assert before.version != after.version
    assert [one.version.split("-")[0] for one in (before, after)] == ["draft", "draft"]
    assert int(after.version.split("-")[1]) == int(before.version.split("-")[1]) + 1


def test_checksums_are_those_of_the_files(files):
    lines = dict(line.split("  ")[::-1] for line in files["checksums.txt"].decode().splitlines())
    assert set(lines) == set(files) - {"checksums.txt"}
    assert all(hashlib.sha256(files[name]).hexdigest() == mark for name, mark in lines.items())


def test_files_are_utf_8_with_crlf_and_ascii_headers(files):
    for name in files:
        if name.endswith(".csv"):
            text = files[name].decode("utf-8")
            assert not text.startswith("\ufeff")
            assert text.endswith("\r\n")
            assert text.split("\r\n")[0].isascii()
            widths = {len(record) for record in csv.reader(io.StringIO(text, newline=""), strict=True)}
            assert len(widths) == 1


def test_corrected_reading_keeps_what_was_recorded_beside_it(files):
    row = reading_at(files, "D3")
    assert (row["do_mg_l_raw"], row["do_mg_l_corrected"], row["do_mg_l_final"]) == ("4.25", "4.52", "4.52")
    assert (row["water_temp_c_raw"], row["water_temp_c_corrected"]) == ("20.5", "")
    (decision,) = [one for one in rows_in(files, "corrections.csv") if one["kind"] == "corrected"]
    assert decision["reading_id"] == row["reading_id"]
    assert (decision["field"], decision["old_value"], decision["new_value"]) == ("do_mg_l", "4.25", "4.52")
    assert (decision["unit"], decision["reason"], decision["made_by"]) == ("mg/L", "slip of the pen", "Olive Reed")


def test_reading_set_aside_stays_and_is_marked_bad(files):
    row = reading_at(files, "D5")
    assert row["quality"] == "bad"
    assert as_written(row["set_aside_reason"]) == '\'the probe hung in the "air",\nfor a while'
    assert reading_at(files, "D5", "station_summary.csv")["quality"] == "bad"


def test_oxygen_below_the_limit_is_a_censor_and_never_a_number_to_use(files):
    row = reading_at(files, "D4")
    assert (row["do_censor"], row["do_reporting_limit_mg_l"]) == ("less_than", "0.2")
    assert (row["do_mg_l_raw"], row["do_mg_l_final"]) == ("0.05", "")
    assert "below_limit" in row["reasons"].split(";")
    assert reading_at(files, "D4", "station_summary.csv")["do_mg_l"] == ""


def test_reasons_say_where_the_pressure_and_the_reading_come_from(files):
    assert "pressure_assumed" in reading_at(files, "D3")["reasons"].split(";")
    assert "pressure_assumed" not in reading_at(files, "U1")["reasons"].split(";")
    paper = {
        row["station_code"] for row in rows_in(files, "readings.csv") if "transcribed_from_paper" in row["reasons"]
    }
    assert paper == {"U1", "D3", "D4", "D5"}


def test_oxygen_from_percent_is_said_to_be_so(files):
    row = reading_at(files, "D5")
    assert (row["do_source"], row["do_mg_l_as_typed"], row["do_percent_as_typed"]) == ("percent", "", "51")
    assert 4 < float(row["do_mg_l_raw"]) < 5


def test_float_velocity_is_the_mean_and_keeps_what_was_typed(files):
    row = reading_at(files, "D5")
    assert float(row["velocity_m_s_final"]) == pytest.approx(0.255)
    assert (row["velocity_m_s_as_typed"], row["velocity_m_s_typed_unit"]) == ("0.3", "m/s")


def test_text_that_looks_like_a_formula_is_neutralised(files):
    assert reading_at(files, "U1")["note"] == "'=cmd|'/c calc'!A1"
    assert reading_at(files, "D3")["note"] == "'-"


@pytest.mark.parametrize("text", ["=1+1", "+SUM(A1)", "-2+3", "@now", "\t=1", "\n=1", "＝1", "-", "+49 650", "'a"])
def test_formula_starts_get_an_apostrophe(text):
    assert harmless(text).startswith("'")


@given(st.text())
def test_any_text_comes_back_as_it_was_written(text):
    cell = harmless(text)
    assert as_written(cell) == text.replace("\x00", "")
    assert not cell.startswith(FORMULA_STARTS) or PLAIN_NUMBER.fullmatch(cell)


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_any_stored_number_reads_back_as_the_same_without_an_exponent(value):
    digits = exact(value)
    assert float(digits) == value
    assert "e" not in digits.lower() and PLAIN_NUMBER.fullmatch(digits)


@pytest.mark.parametrize("text", ["-0.3", "+8,1", "-.5", "8.1", "D3", "a=b", ""])
def test_numbers_and_plain_text_stay_as_they_are(text):
    assert harmless(text) == text


@pytest.mark.parametrize(
    ("value", "text"), [(0.1 + 0.2, "0.3"), (-15.625, "-15.625"), (-0.0, "0"), (8e-05, "0.00008"), (1200.0, "1200")]
)
def test_numbers_are_written_with_a_point_and_without_exponent(value, text):
    assert decimal(value) == text


@pytest.mark.parametrize(
    ("value", "digits", "text"),
    [(8.25, 1, "8.2"), (8.35, 1, "8.4"), (0.5, 0, "0"), (1.5, 0, "2"), (431.5, -3, "432"), (1234.5, -3, "1.23E+3"),
     (12.35, -3, "12.4"), (-0.04, 1, "0.0"), (0.0, -3, "0.00")],
)  # fmt: skip
def test_people_get_numbers_rounded_half_to_even(value, digits, text):
    assert str(rounded(value, digits)) == text


def test_wide_table_is_rounded_to_what_can_be_measured(files):
    row = reading_at(files, "D3", "station_summary.csv")
    assert (row["do_mg_l"], row["water_temp_c"], row["conductance_us_cm"]) == ("4.5", "20.5", "431")
    assert (row["distance_km"], row["pressure_mmhg"]) == ("6.90", "741")


def test_private_fields_stay_out_and_are_listed(files):
    everything = b"".join(files.values()).decode("utf-8")
    assert "Ring the farm first" not in everything
    assert PRIVATE_PHONE not in everything
    assert "office.test" not in everything
    assert {row["column"] for row in rows_in(files, "left_out.csv")} == {"contact", "safety_note", "sign_in"}
    assert "contact" not in rows_in(files, "access.csv")[0]


def test_safety_note_stays_out_of_the_history_too(browser_as, filled):
    form = {**SURVEY_FORM, "safety_note": "Ring 0999 777"}
    assert browser_as("office").post(f"/surveys/{filled.id}/about", form).status_code == 303
    audit = zipfile.ZipFile(io.BytesIO(fetch(browser_as, filled))).read("audit.csv").decode("utf-8")
    assert "survey changed" in audit
    assert "0999" not in audit and PRIVATE_PHONE not in audit


def test_dictionary_names_every_column_of_every_other_table(files):
    package = json.loads(files["datapackage.json"])
    columns = {
        (one["name"], field["name"])
        for one in package["resources"]
        for field in one["schema"]["fields"]
        if one["name"] != "dictionary"
    }
    assert {(row["table"], row["column"]) for row in rows_in(files, "dictionary.csv")} == columns
    assert "UCUM" in files["README.txt"].decode("utf-8")


def test_times_have_the_offset_of_the_survey(files):
    assert reading_at(files, "U1")["taken_at"] == "2026-08-12T06:30:00+02:00"


def test_prediction_and_plan_are_those_of_the_newest_version(files):
    points = rows_in(files, "predictions.csv")
    assert float(points[0]["distance_km"]) == -1.0 and float(points[-1]["distance_km"]) == 30.0
    assert all(float(one["low_mg_l"]) <= float(one["do_mg_l"]) <= float(one["high_mg_l"]) for one in points)
    assert [row["code"] for row in rows_in(files, "stations.csv")] == [row["code"] for row in PLAN["stations"]]


def test_survey_without_plan_or_readings_still_is_a_valid_package(browser_as, survey, tmp_path):
    zipfile.ZipFile(io.BytesIO(fetch(browser_as, survey))).extractall(tmp_path)
    report = Package(str(tmp_path / "datapackage.json")).validate()
    assert report.valid, report.flatten(["name", "rowNumber", "fieldName", "message"])


def test_page_says_what_is_in_it_and_what_is_left_out(browser_as, filled):
    page = browser_as("office").get(f"/surveys/{filled.id}/dataset")
    assert page.status_code == 200
    assert "readings.csv" in page.text and "safety note" in page.text
    assert f"/surveys/{filled.id}/dataset.zip" in page.text


@pytest.mark.parametrize("address", ["dataset", "dataset.zip"])
def test_only_the_office_exports_and_only_its_surveys(browser_as, survey, address):
    assert browser_as("crew").get(f"/surveys/{survey.id}/{address}").status_code == 403
    assert browser_as("lead").get(f"/surveys/{survey.id}/{address}").status_code == 403
    assert browser_as("office").get(f"/surveys/elsewhere/{address}").status_code == 404


@pytest.mark.parametrize(("name", "slug"), [("Älder  Brook!", "alder-brook"), ("河", "survey"), ("../x\r\ny", "x-y")])
def test_file_name_is_safe_everywhere(name, slug):
    assert service.slug(name) == slug


def test_awkward_text_survives_and_the_package_stays_valid(db, survey, people, tmp_path):
    notes = [
        '5" pipe, "mud"',
        "a\r\nb",
        "a\rb\n",
        "ä;ß,漢",
        "\x1a",
        "NaN",
        " padded ",
        "'quoted'",
        "''",
        "=1",
        "'=1",
        "\n-",
    ]
    ids = put_readings(db, survey, people)
    for place, note in enumerate(notes):
        correct(db, survey, people, ids["D3"], 4.0 + place, based_on=place, reason=note)
    dataset = service.dataset_of(db, survey)
    for name, content in dataset.files.items():
        (tmp_path / name).write_bytes(content)
    assert Package(str(tmp_path / "datapackage.json")).validate().valid
    assert [as_written(row["reason"]) for row in rows_in(dataset.files, "corrections.csv")] == notes


def test_station_left_out_of_the_newest_plan_is_still_listed(db, filled, people):
    put_plan(db, filled, people["lead"], {**PLAN, "stations": PLAN["stations"][:3]}, number=2)
    files = service.dataset_of(db, filled).files
    states = {row["code"]: row["state"] for row in rows_in(files, "stations.csv")}
    assert states["D1"] == "planned" and states["D5"] == "not_in_plan"
    assert reading_at(files, "D5")["plan_version"] == "1"
    assert rows_in(files, "survey.csv")[0]["plan_version"] == "2"


def test_what_the_day_showed_is_in_it_with_units_and_times(db, filled, people, tmp_path):
    day = {"river_flow_m3_s": 1.65, "crew_until": "2026-08-12T18:30:00+00:00", "drive_to_lab_min": 50.0}
    put_plan(db, filled, people["lead"], {**PLAN, "day": [day], "day_reaches": []}, number=2)
    files = service.dataset_of(db, filled).files
    for name, content in files.items():
        (tmp_path / name).write_bytes(content)
    assert Package(str(tmp_path / "datapackage.json")).validate().valid
    assert rows_in(files, "day.csv")[0]["crew_until"] == "2026-08-12T20:30:00+02:00"
    units = {(row["table"], row["column"]): row["unit"] for row in rows_in(files, "dictionary.csv")}
    assert units["day", "drive_to_lab_min"] == units["access", "drive_min"] == "min"
    assert (units["day_reaches", "travel_time_h"], units["day", "river_flow_m3_s"]) == ("h", "m3/s")
