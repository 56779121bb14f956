"""The demo as it is loaded, and its finished survey taken by lead and office from the drift to the approved dataset."""

import csv
import io
import json
import re
import shutil
import uuid
import zipfile
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from demo_survey import finished, make
from tests.conftest import Browser
from webapp import create_app, demo
from webapp.bottles.service import judged_of
from webapp.config import read_config
from webapp.db import Database, make_engine
from webapp.people.queries import find_by_sign_in, surveys_of
from webapp.readings.judging import judgement_of
from webapp.readings.queries import readings_of

README = " ".join((Path(make.__file__).resolve().parent / "README.md").read_text(encoding="utf-8").split())
PASSWORDS = {role: password for _, password, role in demo.SIGN_INS}


def loaded(folder, template, now):
    """Load the demo into a folder of its own; return its settings."""
    config = read_config({}, data_dir=folder)
    config.data_dir.mkdir(exist_ok=True)
    shutil.copy(template, config.sqlite_path)
    database = Database(make_engine(config.database_url))
    with database.writing() as db:
        assert demo.load(db, now)
    database.engine.dispose()
    return config


@pytest.fixture(scope="module")
def demo_app(tmp_path_factory, database_with_people):
    """The application on a freshly loaded demo."""
    config = loaded(tmp_path_factory.mktemp("demo"), database_with_people, datetime.now(UTC))
    app = create_app(config, TESTING=True, RATELIMIT_ENABLED=False)
    yield app
    app.extensions["bankside_database"].engine.dispose()


@pytest.fixture
def reading_db(demo_app):
    """A reading session on the demo."""
    with demo_app.extensions["bankside_database"].reading() as db:
        yield db


@pytest.fixture
def surveys(reading_db):
    """The survey that is going on and the finished one, in the order of the list."""
    return surveys_of(reading_db, find_by_sign_in(reading_db, "crew").id)


@pytest.fixture
def july(reading_db, surveys):
    """The Judgement of the finished survey."""
    return judgement_of(reading_db, surveys[1])


@pytest.fixture
def signed_in(demo_app, reading_db):
    """A function from a role to a Browser signed in as the demo's person of that role."""

    def browser(role):
        one = Browser(demo_app)
        assert one.sign_in(find_by_sign_in(reading_db, role), PASSWORDS[role]).status_code == 303
        return one

    return browser


def test_the_survey_that_is_going_on_stands_first(surveys):
    assert [one.name for one in surveys] == ["Sallow Water, August low flow", "Sallow Water, July low flow"]


def test_every_reading_looks_as_recorded_on_a_phone_by_the_crew(reading_db, surveys):
    for survey in surveys:
        for reading in readings_of(reading_db, survey.id):
            assert reading.author.sign_in == "crew"
            assert uuid.UUID(reading.id).version == 4
            assert timedelta() <= reading.received_at - reading.taken_at < timedelta(minutes=5)
        assert all(
            "transcribed_from_paper" not in one.reasons for one in judgement_of(reading_db, survey).by_id.values()
        )


def test_every_reading_belongs_to_a_visit(reading_db, surveys):
    for survey in surveys:
        assert all(one.visit_id for one in judgement_of(reading_db, survey).by_id.values())


def test_what_the_form_asks_about_was_kept_by_the_crew(reading_db, surveys):
    kept = [
        {(one.reading.station_code, *one.kept) for one in judgement_of(reading_db, survey).by_id.values() if one.kept}
        for survey in surveys
    ]
    assert kept[0] == {("D2", "sea_level_pressure"), ("D3", "percent_against_concentration")}
    assert {("D6", "replicate_spread"), ("D7", "unstable")} <= kept[1]


def test_sag_page_says_before_the_crew_leaves_that_meter_a_has_no_end_check(signed_in, surveys):
    page = " ".join(signed_in("crew").get(f"/surveys/{surveys[0].id}/sag").text.split())
    assert "Meter A has no end check since" in page
    assert "all its readings today count as questionable" in page


def stations_with(judgement, reason):
    return [one.reading.station_code for one in judgement.by_id.values() if reason in one.reasons]


def test_readme_says_what_the_checks_find_in_the_finished_survey(july):
    assert set(stations_with(july, "late_for_parcel")) == {"D3"}
    assert stations_with(july, "replicate_differs") == ["D6"]
    assert stations_with(july, "unstable") == ["D7"]
    assert {one.station_code: one.section.mixed for one in july.occasions if one.section.points == 3} == {
        "D1": False,
        "D2": True,
        "D5": True,
    }
    assert "The sections at D2 and D5 are mixed" in README
    layered = {one.station_code: one.layers.stratified for one in july.occasions if one.layers.stratified is not None}
    assert layered == {"D4": False, "D7": False}
    assert "D4 and D7: deeper than 0.76 m, so read at two depths; neither is layered" in README


def test_readme_says_how_far_the_replicates_lie_from_what_they_repeat(july):
    apart = {
        one.reading.station_code: one.reading.do_mg_l - july.by_id[one.repeats_id].reading.do_mg_l
        for one in july.by_id.values()
        if one.repeats_id
    }
    assert f"D6: the replicate lies {-apart.pop('D6'):.2f} mg/L below the reading that it repeats" in README
    assert "The replicates at D2, D5 and D9 agree" in README
    assert set(apart) == {"D2", "D5", "D9"}
    assert all(abs(difference) <= 0.2 for difference in apart.values())


def test_readme_says_what_the_checks_of_meter_b_find(july):
    checks = {(one.check.meter.name, one.check.kind, one.check.standard): one for one in july.checks}
    end = checks["Meter B", "end_of_day", "air_saturated_water"]
    assert f"is off by {abs(end.verdict.error):.2f} mg/L, grade {end.verdict.grade}" in README
    assert checks["Meter B", "field", "winkler"].verdict.passes
    assert {one.bracket.state for one in july.by_id.values() if one.reading.meter == "Meter B"} == {"bracketed"}


def test_only_d8_was_left_before_it_was_done_and_nobody_has_reviewed_anything(july):
    assert [one.station_code for one in july.occasions if one.visit.facts["status"] == "partial"] == ["D8"]
    assert {one.reading.review for one in july.by_id.values()} == {"open"}


def test_readme_says_what_the_laboratory_found(reading_db, surveys):
    bottles = {one.bottle.code: one for one in judged_of(reading_db, surveys[1], datetime.now(UTC))}
    assert f"{len(bottles)} bottles went to the laboratory" in README
    assert {one.bottle.analysis for one in bottles.values()} == {"bod5"}
    assert {code: one.reasons for code, one in bottles.items() if one.reasons} == {
        "SW-01": ("past_hold_time",),
        "SW-04": ("below_limit",),
    }
    assert f"SW-01 was set up {bottles['SW-01'].hold.hours:.1f} h after it was filled" in README
    blank, (first, again) = bottles["SW-04"], (bottles[code] for code in ("SW-02", "SW-03"))
    assert (blank.bottle.kind, blank.result.value, blank.result.limit_value) == ("blank", None, 2.0)
    assert f"SW-04 came back as “{blank.reported}”" in README
    assert again.bottle.replicate_of == first.bottle.code
    assert f"agree: {first.reported} and {again.reported} mg/L" in README


def test_moved_over_the_end_of_summer_time_every_interval_stays(tmp_path, database_with_people):
    # the night of the finished survey is then that of the last Sunday of October 2026
    config = loaded(tmp_path / "autumn", database_with_people, datetime(2026, 11, 14, 15, tzinfo=UTC))
    database = Database(make_engine(config.database_url))
    with database.reading() as db:
        survey = surveys_of(db, find_by_sign_in(db, "crew").id)[1]
        taken = [one.taken_at for one in readings_of(db, survey.id)]
    database.engine.dispose()
    assert (taken[0].date().isoformat(), taken[-1].date().isoformat()) == ("2026-10-24", "2026-10-25")
    typed = [datetime.fromisoformat(row["taken_at"]) for row in finished.readings()]
    assert [one - taken[0] for one in taken] == [one - typed[0] for one in typed]


def field_of(page, name):
    """Return what a hidden field of the page holds."""
    return re.search(rf'name="{name}" value="([^"]*)"', page)[1]


def tables_of(browser, survey):
    """Download the dataset; return its bytes and its tables."""
    answer = browser.get(f"{survey}/dataset.zip")
    assert answer.status_code == 200
    with zipfile.ZipFile(io.BytesIO(answer.data)) as file:
        texts = {Path(name).stem: file.read(name).decode() for name in file.namelist() if name.endswith(".csv")}
    return answer.data, {name: list(csv.DictReader(io.StringIO(text))) for name, text in texts.items()}


def test_a_meter_that_drifts_is_graded_corrected_traced_to_what_was_typed_and_approved(signed_in, surveys):
    lead, office, survey = signed_in("lead"), signed_in("office"), f"/surveys/{surveys[1].id}"
    _the_lead_corrects_the_drift(lead, survey)
    _, tables = tables_of(office, survey)
    reading_id = _from_the_final_value_back_to_what_was_typed(tables)
    _step(lead, survey, "review", "every reading, the drift of Meter A corrected")
    refused = _step(lead, survey, "approve", "myself")
    assert refused.status_code == 403
    assert _step(office, survey, "approve", "for the permit").status_code == 303
    first, tables = tables_of(office, survey)
    assert first == tables_of(office, survey)[0]
    assert {row["status"] for row in tables["readings"]} == {"approved"}
    refused = _corrects(lead, survey, reading_id)
    assert refused.status_code == 409
    assert "This survey is approved, so nothing of it changes any more" in refused.text
    assert first == tables_of(office, survey)[0]
    assert _step(office, survey, "reopen", "a page of the log book turned up").status_code == 303
    assert _corrects(lead, survey, reading_id).status_code == 303


def _the_lead_corrects_the_drift(lead, survey):
    page = lead.get(f"{survey}/review/drift").text
    words = " ".join(re.sub(r"<[^>]+>", " ", page).split())
    assert "Expected 8.26 mg/L Read 7.80 mg/L" in words
    assert re.search(r"Grade good Correction Ratio, linear in time: ×1 at the check before, ×1\.059 at", words)
    assert "Apply to 9 readings" in words
    form = {name: field_of(page, name) for name in ("submission_id", "start_check", "end_check", "seen")}
    assert lead.post(f"{survey}/review/drift", form).status_code == 422  # not without a reason
    form["reason"] = "0.46 mg/L low after 8 h, zero unmoved"
    assert lead.post(f"{survey}/review/drift", form).status_code == 303
    assert "Applied." in lead.get(f"{survey}/review/drift").text


def _from_the_final_value_back_to_what_was_typed(tables):
    """Follow one reading of the dataset back; return its id."""
    (typed,) = (row for row in finished.readings() if row.get("do_mg_l") == "5,14")
    (reading,) = (row for row in tables["readings"] if row["do_mg_l_as_typed"] == typed["do_mg_l"])
    event = next(row for row in tables["corrections"] if row["event_id"] == reading["drift_event_id"])
    assert (event["reading_id"], event["kind"]) == (reading["reading_id"], "drift")
    assert event["reason"] == "0.46 mg/L low after 8 h, zero unmoved"
    told = json.loads(event["particulars"])
    start, end, zero = (
        next(row for row in tables["meter_checks"] if row["check_id"] == told[f"{name}_check"])
        for name in ("start", "end", "zero")
    )
    assert (start["check_id"], end["check_id"]) == (reading["check_before"], reading["check_after"])
    assert (start["kind"], end["kind"], zero["kind"]) == ("read_back", "end_of_day", "zero")
    assert (float(start["error"]), float(end["error"])) == pytest.approx((-0.01, -0.46), abs=0.005)
    assert (float(end["shown"]), float(end["expected"])) == pytest.approx((7.80, 8.26), abs=0.005)
    assert (end["grade"], reading["drift_grade"], told["grade"]) == ("good", "good", "good")
    assert zero["passes"] == "true"
    assert json.loads(end["typed"])["value"] == {"text": "7.80", "unit": "mg/L"}
    starts, ends, taken = (
        datetime.fromisoformat(text) for text in (start["checked_at"], end["checked_at"], reading["taken_at"])
    )
    assert ends - starts == timedelta(hours=8)
    factor = 1 + (taken - starts) / (ends - starts) * (float(end["expected"]) / float(end["shown"]) - 1)
    assert told["scale"] == pytest.approx(factor, abs=1e-9)
    raw = float(reading["do_mg_l_raw"])
    assert float(reading["do_mg_l_drift_corrected"]) == pytest.approx(raw * factor, abs=0.00005)
    assert float(reading["do_mg_l_final"]) == pytest.approx(raw * factor, abs=0.005)
    assert raw == float(typed["do_mg_l"].replace(",", "."))
    assert f"“5,14” as typed becomes {raw * factor:.2f} mg/L" in README
    return reading["reading_id"]


def _step(browser, survey, step, reason):
    """Take a step of the approval as its page offers it."""
    page = browser.get(f"{survey}/approval").text
    seen = re.search(r'name="seen" value="([^"]*)"', page)
    form = {"submission_id": str(uuid.uuid4()), "seen": seen[1] if seen else "", "reason": reason}
    return browser.post(f"{survey}/approval/{step}", form)


def _corrects(browser, survey, reading_id):
    form = {"field": "water_temp_c", "value": "20.4", "reason": "a slip of the pen", "based_on": "1"}
    return browser.post(f"{survey}/readings/{reading_id}/correct", form)
