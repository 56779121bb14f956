import copy
import gzip
import json
import re
import shutil
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest
from scipy.interpolate import RegularGridInterpolator

from calc.oxygen import salinity_psu, saturation_mg_l
from tests.webapp.plans import PLAN, put_plan
from webapp.fieldpack.tables import saturation_tables
from webapp.models import SurveyMember
from webapp.plan.queries import current_plan
from webapp.readings import queries
from webapp.readings.expected import prediction_or_reasons

READING = "0b8f6f2c-32cb-4a52-9a6f-0f5b0d3b1c11"
FORM = {"submission_id": READING, "taken_at": "2026-08-12T13:20", "do_mg_l": "6.4", "water_temp_c": "19"}


@pytest.fixture
def address(db, survey, people):
    """The address of the reading form at D3 of a ready plan."""
    put_plan(db, survey, people["lead"])
    return f"/surveys/{survey.id}/stations/D3/reading"


def test_phone_learns_who_is_signed_in_and_gets_a_token_that_fits(browser_as, people, address):
    crew = browser_as("crew")
    page = crew.get("/phone/here").text
    assert re.search(r'data-person="([^"]*)"', page).group(1) == people["crew"].id
    crew.token = re.search(r'data-token="([^"]+)"', page).group(1)
    assert crew.post(address, FORM, htmx=True).headers["X-Stored-Id"] == READING


def test_phone_whose_session_ended_gets_the_form_to_sign_in_over_the_page(app):
    page = app.test_client().get("/phone/here").text
    assert 'data-person=""' in page and 'name="password"' in page
    assert 'name="next" value="/phone/here"' in page


def test_reading_is_never_stored_under_another_name(browser_as, db, survey, people, address):
    lead = browser_as("lead")
    answer = lead.post(address, {**FORM, "author_id": people["crew"].id}, htmx=True)
    assert (answer.status_code, answer.headers["X-Belongs-To"]) == (409, "another")
    assert "X-Stored-Id" not in answer.headers
    assert "under their name only" in answer.text
    assert queries.readings_of(db, survey.id) == []


def test_reading_of_the_person_signed_in_names_its_id_each_time(browser_as, db, survey, people, address):
    crew = browser_as("crew")
    form = {**FORM, "author_id": people["crew"].id}
    for _ in range(5):
        assert crew.post(address, form, htmx=True).headers["X-Stored-Id"] == READING
    assert [one.author_id for one in queries.readings_of(db, survey.id)] == [people["crew"].id]


@pytest.mark.parametrize("author", ["nobody", "\x00", "é" * 4000, "crew\r\nX-Stored-Id: yes"])
def test_odd_author_is_refused_in_words(browser_as, address, author):
    answer = browser_as("crew").post(address, {**FORM, "author_id": author}, htmx=True)
    assert (answer.status_code, answer.headers["X-Belongs-To"]) == (409, "another")


def test_suggestion_comes_with_the_fields_it_sets_so_that_the_phone_keeps_what_is_sent(browser_as, address):
    answer = browser_as("crew").post(address, {**FORM, "water_temp_c": "68"}, htmx=True)
    assert answer.status_code == 422
    assert 'data-sets="{&#34;water_temp_c&#34;: &#34;20&#34;}"' in answer.text


def test_page_about_the_phone_wants_a_sign_in_and_works_for_everybody(app, browser_as):
    assert app.test_client().get("/phone").status_code == 302
    assert "What waits on this phone" in browser_as("crew").get("/phone").text


def test_script_is_kept_a_year_under_its_own_mark_only(app):
    client = app.test_client()
    page = client.get("/sign-in").text
    address = re.search(r'src="(/scripts/[^"]+/page.js)"', page).group(1)
    assert "max-age=31536000" in client.get(address).headers["Cache-Control"]
    assert "max-age=31536000" not in client.get("/scripts/old/page.js").headers["Cache-Control"]
    assert client.get("/scripts/old/../webapp/__init__.py").status_code == 404


@pytest.fixture
def pack(browser_as, db, survey, people):
    """The field pack of a ready plan, as a phone gets it."""
    put_plan(db, survey, people["lead"])
    return browser_as("crew").get(f"/surveys/{survey.id}/fieldpack").get_json()


def test_pack_names_its_plan_version_its_pages_and_files_and_each_can_be_fetched(pack, browser_as, survey):
    assert (pack["plan"], pack["survey"]) == (1, survey.id)
    assert f"/surveys/{survey.id}/sheet" in pack["pages"]
    for form in ("stations/D3/reading", "stations/D3/visit", "stations/D3/bottle", "meters/check"):
        assert f"/surveys/{survey.id}/{form}" in pack["pages"]
    crew = browser_as("crew")
    assert {crew.get(address).status_code for address in [*pack["pages"], *pack["files"]]} == {200}


def test_pack_has_every_station_as_an_entry_of_the_predicted_sag(pack, db, survey):
    prediction, _ = prediction_or_reasons(survey, current_plan(db, survey.id))
    for station in pack["stations"]:
        at = pack["sag"]["km"].index(station["km"])
        there = prediction.at(station["km"])
        assert pack["sag"]["do"][at] == pytest.approx(there.do_mg_l, abs=0.0006)
        assert pack["sag"]["deficit"][at] == pytest.approx(there.deficit_mg_l, abs=0.0006)
        assert pack["sag"]["travel_h"][at] == pytest.approx(there.travel_time_h, abs=0.0001)


def test_pack_without_a_plan_says_so_and_still_has_saturation(browser_as, survey):
    pack = browser_as("crew").get(f"/surveys/{survey.id}/fieldpack").get_json()
    assert (pack["sag"], pack["stations"], pack["plan"]) == (None, [], 0)
    assert "There is no plan yet." in pack["missing"]
    assert pack["saturation"]["z"][20][0] > 0


def test_pack_has_the_wading_limits_and_how_depth_and_velocity_are_typed(pack):
    assert pack["wading"] == {"stop": 0.929, "caution": 0.6, "depth": 0.9, "ft2": 10.76391}
    us = pack["typed"]["us"]
    assert (us["wading_depth_m"]["scale"], us["wading_velocity_m_s"]["scale"]) == (pytest.approx(0.3048),) * 2


def test_pack_of_another_crews_survey_is_not_found(browser_as, db, survey, people):
    db.query(SurveyMember).filter_by(survey_id=survey.id, person_id=people["crew"].id).delete()
    db.commit()
    assert browser_as("crew").get(f"/surveys/{survey.id}/fieldpack").status_code == 404


def test_saturation_tables_are_within_rounding_of_calc_between_their_entries():
    tables, random = saturation_tables(), np.random.default_rng(4)
    celsius, mmhg = random.uniform(0, 40, 5000), random.uniform(380, 836, 5000)
    conductance = 59000 * random.random(5000) ** 3
    salinity = np.interp(conductance, tables["salinity"]["x"], tables["salinity"]["y"])
    fresh, salted = (
        RegularGridInterpolator((tables[name]["x"], tables[name]["y"]), np.array(tables[name]["z"]))
        for name in ("saturation", "salted")
    )
    looked_up = fresh(np.c_[celsius, mmhg]) * salted(np.c_[celsius, salinity])
    assert np.abs(looked_up - saturation_mg_l(celsius, mmhg, salinity_psu(conductance))).max() < 0.005


def test_pack_of_forty_stations_weighs_at_most_60_kb_compressed(browser_as, db, survey, people):
    stations = [{"code": f"S{number}", "distance_km": round(0.3 + 0.55 * number, 2)} for number in range(40)]
    put_plan(db, survey, people["lead"], tables={**copy.deepcopy(PLAN), "stations": stations})
    crew = browser_as("crew")
    answer = crew.get(f"/surveys/{survey.id}/fieldpack", headers={"Accept-Encoding": "gzip"})
    assert answer.headers["Content-Encoding"] == "gzip"
    assert len(answer.data) <= 60_000
    assert len(json.loads(gzip.decompress(answer.data))["stations"]) == 40


def test_worker_is_served_at_the_root_and_differs_with_each_version_of_the_files(app, tmp_path):
    client = app.test_client()
    answer = client.get("/worker.js")
    assert (answer.mimetype, answer.headers["Cache-Control"]) == ("text/javascript", "no-cache")
    mark = re.search(r'"(/scripts/[^/]+/)waiting.js"', answer.text).group(1)
    shutil.copytree(app.static_folder, tmp_path / "static")
    with (tmp_path / "static" / "check.js").open("a") as script:
        script.write("// newer\n")
    app.static_folder = str(tmp_path / "static")
    assert mark not in client.get("/worker.js").text


@pytest.mark.parametrize(
    ("hours_on_the_phone", "status"), [(0, 422), (0.1, 422), (5, 200)], ids=["now", "minutes ago", "hours ago"]
)
def test_what_is_odd_holds_back_no_reading_whose_crew_has_left_the_water(
    browser_as, db, survey, address, hours_on_the_phone, status
):
    saved_at = datetime.now(UTC) - timedelta(hours=hours_on_the_phone)
    odd = {**FORM, "do_mg_l": "16", "saved_at": saved_at.isoformat()}
    assert browser_as("crew").post(address, odd, htmx=True).status_code == status
    assert len(queries.readings_of(db, survey.id)) == (status == 200)


@pytest.mark.parametrize("saved_at", ["", "yesterday", "2026-08-12T13:20", "9999-12-31T23:59:59+00:00", "\x00", "١٢"])
def test_moment_of_saving_that_cannot_be_read_counts_as_now(browser_as, address, saved_at):
    odd = {**FORM, "do_mg_l": "16", "saved_at": saved_at}
    assert browser_as("crew").post(address, odd, htmx=True).status_code == 422
