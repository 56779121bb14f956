"""Readings from a paper sheet: all of them or none, each once, with what was typed."""

import io
from functools import cache

import pytest

from tests.webapp.plans import put_plan
from tests.webapp.sheets import ROWS, rows
from webapp.errors import Conflict, NotFound
from webapp.models import History, Reading
from webapp.review import importing, service

SHEET = (
    "Station;Time;Oxygen;Water temperature;Depth (ft);Air pressure;Unit of the air pressure;"
    "Where the air pressure comes from;Note\n"
    "D1;2026-08-12 07:40;7,2;19,9;3,1;1013;hPa or mbar;A weather report or phone (reduced to sea level);clear\n"
    "D2;2026-08-12 09:10;5,9;20,1;3,4;;;;\n"
)


@pytest.fixture
def plan(db, survey, people):
    """A plan for the survey's stations."""
    return put_plan(db, survey, people["lead"])


@pytest.fixture
def sheet(browser_as, survey, plan):
    """A function that posts a table as text: sheet(text, "/preview")."""

    browser = cache(browser_as)

    def post(text, end="", role="lead", **more):
        return browser(role).post(f"/surveys/{survey.id}/readings/import{end}", {"text": text}, **more)

    return post


def test_preview_stores_nothing_and_says_what_would_be(sheet, db):
    answer = sheet(SHEET, "/preview")
    assert answer.status_code == 200
    assert "2 new readings." in answer.text and "Import 2 readings" in answer.text
    assert db.query(Reading).count() == 0


def test_import_stores_all_readings_in_si_with_what_was_typed(sheet, db, survey, people):
    answer = sheet(SHEET)
    assert answer.status_code == 303
    assert answer.headers["Location"].endswith("added=2&known=0")
    first, second = rows(db, survey)
    assert (first.final.station_code, first.final.do_mg_l) == ("D1", 7.2)
    assert first.final.depth_m == pytest.approx(3.1 * 0.3048)
    assert first.reading.entered["depth_m"] == {"text": "3,1", "unit": "[ft_i]"}
    assert first.reading.entered["pressure"] == {"text": "1013", "unit": "hPa"}
    assert first.reading.pressure_source == "weather" and 735 < first.reading.pressure_mmhg < 745
    assert first.reading.taken_at.isoformat() == "2026-08-12T05:40:00+00:00"
    assert (second.reading.pressure_source, second.reading.author_id) == ("standard", people["lead"].id)
    assert db.query(History).filter_by(what="readings imported").one().particulars == {"added": 2, "known": 0}


def test_table_says_how_many_were_added_and_known(sheet, browser_as):
    assert "2 readings were added." in browser_as("lead").get(sheet(SHEET).headers["Location"]).text
    again = browser_as("lead").get(sheet(SHEET).headers["Location"]).text
    assert "0 readings were added; 2 were here already." in again


def test_same_sheet_imported_twice_adds_nothing_whoever_sends_it(sheet, db):
    sheet(SHEET)
    assert sheet(SHEET, role="office").headers["Location"].endswith("added=0&known=2")
    assert db.query(Reading).count() == 2


def test_longer_sheet_adds_only_its_new_lines(sheet, db):
    sheet(SHEET)
    longer = SHEET + "D3;2026-08-12 13:20;4,6;20,4;3,5;;;;\n"
    assert "1 new reading." in sheet(longer, "/preview").text
    assert sheet(longer).headers["Location"].endswith("added=1&known=2")


def test_two_like_lines_in_one_sheet_are_two_readings(sheet, db):
    twice = SHEET + SHEET.splitlines()[-1] + "\n"
    assert sheet(twice).headers["Location"].endswith("added=3&known=0")
    assert sheet(twice).headers["Location"].endswith("added=0&known=3")


def test_uploaded_file_is_read_and_comes_back_as_text(sheet, browser_as, survey, db):
    address = f"/surveys/{survey.id}/readings/import"
    lead = browser_as("lead")
    upload = {"text": "", "file": (io.BytesIO(SHEET.encode("utf-8-sig")), "day.csv")}
    answer = lead.post(f"{address}/preview", upload, content_type="multipart/form-data")
    assert "2 new readings." in answer.text and "07:40;7,2" in answer.text
    upload = {"file": (io.BytesIO(SHEET.encode("cp1252")), "day.csv")}
    assert lead.post(address, upload, content_type="multipart/form-data").status_code == 303
    assert db.query(Reading).count() == 2


@pytest.mark.parametrize(
    ("line", "column", "message"),
    [
        ("D9;2026-08-12 07:40;7,2;19,9;3;;;;", "Station", "no such station. It has: D1"),
        (";2026-08-12 07:40;7,2;19,9;3;;;;", "Station", "It is empty"),
        ("D1;;7,2;19,9;3;;;;", "Time at the water", "It is empty"),
        ("D1;2199-01-01 07:40;7,2;19,9;3;;;;", "Time at the water", "still to come"),
        ("D1;2026-08-12 07:40;72;19,9;3;;;;", "Oxygen", "must lie between -0.5 and 30"),
        ("D1;2026-08-12 07:40;7,2;68;3;;;;", "Water temperature", "must lie between -1 and 45"),
        ("D1;2026-08-12 07:40;7,2;19,9;deep;;;;", "Depth of the water", "Enter a number"),
        ("D1;2026-08-12 07:40;7,2;19,9;3;750;mmHg;;", "Where the air pressure comes from", "Say where"),
        ("D1;2026-08-12 07:40;;;;;;;just a note", "Oxygen", "Nothing was measured in this row"),
    ],
)
@pytest.mark.parametrize("end", ["", "/preview"])
def test_bad_cell_is_named_by_row_and_column_and_nothing_is_stored(sheet, db, line, column, message, end):
    answer = sheet(SHEET + line + "\n", end)
    assert answer.status_code == 422
    assert f"Row 4, {column}" in answer.text and message in answer.text
    assert "07:40;7,2;19,9;3,1" in answer.text
    assert db.query(Reading).count() == 0


@pytest.mark.parametrize(
    ("columns", "cells", "message"),
    [
        ("Depth;Depth of the sensor", "1,0;1,2", "under the bed"),
        ("Velocity of the water", "0,4", "Say how the velocity was measured"),
    ],
)
def test_columns_that_contradict_each_other_are_named(sheet, columns, cells, message):
    text = f"Station;Time;Oxygen;{columns}\nD1;2026-08-12 07:40;7,2;{cells}\n"
    answer = sheet(text, "/preview")
    assert answer.status_code == 422 and message in answer.text


@pytest.mark.parametrize(
    "text", ["", "   \n", "\x00", "a;b\n1;2\n", '"', "Station;Time\n" * 3, "=cmd\n", "\ufeff", "Station,Time\nD1,nan\n"]
)
@pytest.mark.parametrize("end", ["", "/preview"])
def test_text_that_is_no_table_is_refused_with_words(sheet, db, text, end):
    answer = sheet(text, end)
    assert answer.status_code == 422
    assert 'class="error"' in answer.text or "Nothing was imported" in answer.text
    assert db.query(Reading).count() == 0


def test_what_a_check_finds_odd_is_worth_a_look_and_stored_by_name(sheet, db, survey):
    odd = SHEET + "D2;2026-08-12 09:14;9,9;20,1;3,4;;;;bubbles\n"
    preview = sheet(odd, "/preview")
    assert preview.status_code == 200
    assert "Worth a look" in preview.text and "higher than the next station upstream" in preview.text
    sheet(odd)
    found = {row.final.do_mg_l: [one["name"] for one in row.reading.kept_findings] for row in rows(db, survey)}
    assert "step_against_neighbour" in found[9.9] and "step_against_prediction" in found[9.9]


def test_hazards_to_the_crew_are_not_findings_about_a_number(sheet, db, survey):
    sheet("Station;Time;Oxygen;Water temperature\nD1;2026-08-12 07:40;9,9;4\n")
    names = {one["name"] for row in rows(db, survey) for one in row.reading.kept_findings}
    assert "cold_water" not in names


def test_htmx_gets_the_form_alone_and_is_sent_on_after_the_import(sheet):
    preview = sheet(SHEET, "/preview", htmx=True)
    assert preview.text.lstrip().startswith('<form id="import"')
    stored = sheet(SHEET, htmx=True)
    assert stored.status_code == 204
    assert stored.headers["HX-Redirect"].endswith("added=2&known=0")


def test_crew_and_strangers_do_not_import(sheet, browser_as, survey):
    assert sheet(SHEET, role="crew").status_code == 403
    assert sheet(SHEET, "/preview", role="crew").status_code == 403
    lead = browser_as("lead")
    assert lead.post("/surveys/elsewhere/readings/import", {"text": SHEET}).status_code == 404
    assert lead.post("/surveys/elsewhere/readings/import/preview", {"text": SHEET}).status_code == 404
    assert lead.get("/surveys/elsewhere/readings/import").status_code == 404


def test_empty_sheet_to_fill_in_has_the_names_an_import_reads(browser_as, survey, plan):
    sheet = browser_as("lead").get(f"/surveys/{survey.id}/readings/sheet.csv")
    assert sheet.status_code == 200 and sheet.mimetype == "text/csv"
    filled = sheet.text + "D1,2026-08-12 07:40,7.2\n"
    answer = browser_as("lead").post(f"/surveys/{survey.id}/readings/import/preview", {"text": filled})
    assert "1 new reading." in answer.text


def test_import_page_names_the_columns(browser_as, survey, plan):
    page = browser_as("lead").get(f"/surveys/{survey.id}/readings/import").text
    assert "Oxygen (mg/L)" in page and "Centre" in page


def test_rows_without_typed_cells_are_kept_as_typed_in_si(db, survey, people, plan):
    pressure = {**ROWS[0], "pressure": 745.0, "pressure_unit": "hPa"}
    assert service.import_readings(db, survey, [pressure], people["crew"].id) == (1, 0)
    entered = rows(db, survey)[0].reading.entered
    assert entered["do_mg_l"] == {"text": "8.1", "unit": "mg/L"}
    assert entered["pressure"]["unit"] == "hPa"
    assert float(entered["pressure"]["text"]) == pytest.approx(993.25, abs=0.01)


def test_row_at_an_unknown_station_stores_none_of_the_rows(db, survey, people, plan):
    with pytest.raises(NotFound, match="no such station"):
        service.import_readings(db, survey, [ROWS[0], {**ROWS[1], "station": "D9"}], people["crew"].id)
    db.rollback()
    assert db.query(Reading).count() == 0


def test_survey_without_plan_takes_no_readings(db, survey, people):
    with pytest.raises(Conflict, match="no plan yet"):
        service.import_readings(db, survey, ROWS, people["crew"].id)


def test_id_follows_from_survey_and_content_alone(survey):
    entered = [{} for _ in ROWS]
    first = [one.id for one in importing._identified(survey, ROWS, entered)]
    again = [one.id for one in importing._identified(survey, ROWS[::-1], entered)]
    assert first == again[::-1] and len(set(first)) == len(ROWS)


VALUES = "Station;Time;Several values;Oxygen;Water temperature;pH;Why they had not settled\n"


def test_several_values_on_a_paper_sheet_give_their_median_and_stay_raw(sheet, db, survey):
    text = VALUES + "D2;2026-08-12 09:10;6,1 6,3 6,2 6,2 6,2;;20,1;7,4;\n"
    assert sheet(text).status_code == 303
    (row,) = rows(db, survey)
    assert (row.final.do_mg_l, row.reading.stable, row.final.ph) == (6.2, True, 7.4)
    assert [one["do_mg_l"] for one in row.reading.series] == [6.1, 6.3, 6.2, 6.2, 6.2]
    assert row.reading.entered["values"] == {"text": "6,1 6,3 6,2 6,2 6,2", "unit": "mg/L"}
    assert sheet(text).headers["Location"].endswith("added=0&known=1")


def test_values_that_had_not_settled_are_stored_as_unstable_with_the_reason(sheet, db, survey):
    text = VALUES + "D2;2026-08-12 09:10;5.8 6.4 6.0 6.3 6.1;6.1;20.1;;slack water\n"
    assert "Not stable" in sheet(text, "/preview").text
    sheet(text)
    (row,) = rows(db, survey)
    assert (row.final.do_mg_l, row.reading.stable, row.reading.unstable_reason) == (6.1, False, "slack water")
    assert "unstable" in {one["name"] for one in row.reading.kept_findings}


@pytest.mark.parametrize(
    ("cells", "message"),
    [
        ("6.1 six;", "Enter numbers with blanks between them"),
        ("6.1 60 6.2;", "Oxygen must lie between"),
        ("6.1 6.2 6.3;7.2", "Their median is 6.20 mg/L, and the oxygen beside them is 7.2"),
    ],
)
def test_several_values_that_cannot_be_are_named_by_row_and_column(sheet, db, cells, message):
    answer = sheet(VALUES + f"D2;2026-08-12 09:10;{cells};20.1;;\n")
    assert answer.status_code == 422 and "Row 2, Several values" in answer.text and message in answer.text
    assert db.query(Reading).count() == 0


def test_writers_wait_for_an_import_only_while_it_stores(app, browser_as, survey, plan, monkeypatch):
    lock, held = app.extensions["bankside_database"].lock, {}

    def noting(name):
        deed = getattr(importing, name)

        def run(*args):
            held[name] = lock.locked()
            return deed(*args)

        monkeypatch.setattr(importing, name, run)

    noting("_findings")
    noting("put_reading")
    assert browser_as("lead").post(f"/surveys/{survey.id}/readings/import", {"text": SHEET}).status_code == 303
    assert held == {"_findings": False, "put_reading": True}


def test_reading_that_came_while_a_sheet_was_looked_at_is_known_and_not_stored_twice(db, survey, people, plan):
    prepared = importing.prepare(db, survey, ROWS)
    importing.import_readings(db, survey, ROWS[:1], people["crew"].id)
    assert importing.store(db, survey, prepared, people["lead"].id) == (len(ROWS) - 1, 1)
    assert db.query(Reading).count() == len(ROWS)
