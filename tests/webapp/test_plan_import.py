import io
import re

import pytest

from tests.webapp.planning import REACH, message_beside, set_survey
from tests.webapp.plans import PLAN

WEIRS = "Name;Where;Drop\nLow weir;3,5;0,4\nHigh weir;1,5;1,1\n"


def test_a_pasted_table_is_shown_before_it_replaces_the_old_one(browser_as, plan, now):
    lead = browser_as("lead")
    checked = lead.post(f"{plan}/weirs/import", {"text": WEIRS, "based_on": "1"})
    assert checked.status_code == 200 and "All of it can be taken" in checked.text
    assert "<td>3.50 km</td>" in checked.text and "Low weir;3,5;0,4" in checked.text
    assert now().number == 1
    saved = lead.post(f"{plan}/weirs/import/save", {"text": WEIRS, "based_on": "1", "version_reason": "From the sheet"})
    assert saved.status_code == 303
    assert [row["name"] for row in now().tables["weirs"]] == ["High weir", "Low weir"]


def test_an_uploaded_file_is_read_and_its_text_stays_on_the_page(browser_as, plan):
    data = {
        "file": (io.BytesIO("Name,Where,Drop\nMühlwehr,3.5,0.4\n".encode("cp1252")), "weirs.csv"),
        "text": "",
        "based_on": "1",
    }
    checked = browser_as("lead").post(f"{plan}/weirs/import", data)
    assert checked.status_code == 200 and "Mühlwehr,3.5,0.4" in checked.text


@pytest.mark.parametrize("address", ["/weirs/import", "/weirs/import/save"])
def test_bad_cells_are_listed_marked_and_nothing_is_imported(browser_as, plan, now, address):
    text = "Name;Where;Drop;Colour\nLow weir;3,5;high;red\n"
    answer = browser_as("lead").post(plan + address, {"text": text, "based_on": "1"})
    assert answer.status_code == 422
    assert "Row 2, Drop: “high”. Enter a number, for example 12.4." in answer.text
    assert 'class="wrong"' in answer.text and "no such column: Colour" in answer.text
    assert "Low weir;3,5;high;red" in answer.text and now().number == 1


def test_rows_that_clash_within_a_file_are_bad_cells(browser_as, plan):
    text = "Code,Where\nD1,1.8\nd1,3\n"
    answer = browser_as("lead").post(f"{plan}/stations/import", {"text": text, "based_on": "1"})
    assert answer.status_code == 422
    assert "Row 3, Code: “d1”. There is another station D1; give this one a code of its own." in answer.text


def test_an_import_over_a_newer_version_is_a_conflict(browser_as, plan, now):
    lead = browser_as("lead")
    lead.post(f"{plan}/reaches/1/edit", REACH)
    late = lead.post(f"{plan}/weirs/import/save", {"text": WEIRS, "based_on": "1"})
    assert late.status_code == 409 and "meanwhile" in late.text and "Low weir;3,5;0,4" in late.text
    assert 'name="based_on" value="2"' in late.text and now().number == 2


def test_an_import_that_loses_a_read_station_is_refused(browser_as, plan, now, a_reading):
    form = {"text": "Code,Where\nD1,1.8\n", "based_on": "1", "version_reason": "shorter"}
    answer = browser_as("lead").post(f"{plan}/stations/import/save", form)
    assert answer.status_code == 409 and "Readings were taken at D3" in answer.text and now().number == 1


@pytest.mark.parametrize("key", ["reaches", "waters", "weirs", "access", "stations"])
@pytest.mark.parametrize("facts", [{}, {"unit_system": "us", "distance_rule": "river_mile", "outfall_mark": 41.2}])
def test_a_downloaded_table_imports_as_it_was(app, browser_as, survey, plan, now, key, facts):
    set_survey(app, survey, **facts)
    lead = browser_as("lead")
    answer = lead.get(f"{plan}/{key}.csv")
    assert answer.headers["Content-Disposition"] == f'attachment; filename="{key}.csv"'
    data = {"file": (io.BytesIO(answer.data), f"{key}.csv"), "based_on": "1"}
    assert lead.post(f"{plan}/{key}/import", data).status_code == 200
    text = answer.data.decode("utf-8-sig")
    assert lead.post(f"{plan}/{key}/import/save", {"text": text, "based_on": "1"}).status_code == 303
    for row, old in zip(now().tables[key], PLAN[key], strict=True):
        assert row == {name: pytest.approx(value) if isinstance(value, float) else value for name, value in old.items()}


def proposal_form(page):
    texts = dict(re.findall(r'name="((?:code|distance_km|access)_\d+)"[^>]*\svalue="([^"]*)"', page))
    ticks = dict.fromkeys(re.findall(r'name="(take_\d+)" value="yes" checked', page), "yes")
    return texts | ticks | {"based_on": re.search(r'name="based_on" value="(\d+)"', page).group(1)}


def test_ticked_proposals_become_stations_with_codes_of_their_own(browser_as, plan, now):
    lead = browser_as("lead")
    page = lead.get(f"{plan}/stations/proposal").text
    assert "U1 is there already" in page
    form = proposal_form(page)
    ticked = [name.removeprefix("take_") for name in form if name.startswith("take_")]
    answer = lead.post(f"{plan}/stations/proposal", form)
    assert answer.status_code == 303
    rows = {row["code"]: row for row in now().tables["stations"]}
    assert len(rows) == 9 + len(ticked) and {"U1", "D8", "S01"} <= rows.keys()
    assert rows["S01"]["state"] == "planned" and rows["S01"]["access"] in {row["name"] for row in PLAN["access"]}


@pytest.mark.parametrize(
    ("field", "typed", "message"),
    [
        ("code", "a/b", "A code stands in the address"),
        ("code", "D3", "The survey has or had a station"),
        ("code", "", "It is empty"),
        ("distance_km", "far", "Enter a number"),
    ],
)
def test_a_bad_proposal_is_told_and_kept(browser_as, plan, now, field, typed, message):
    lead = browser_as("lead")
    form = proposal_form(lead.get(f"{plan}/stations/proposal").text)
    name = next(name for name in form if name.startswith("take_")).replace("take", field)
    answer = lead.post(f"{plan}/stations/proposal", form | {name: typed})
    assert answer.status_code == 422 and message_beside(answer, name).startswith(message)
    assert f'value="{typed}"' in answer.text and now().number == 1


def test_a_proposal_without_a_tick_or_of_an_older_plan_is_not_saved(browser_as, plan, now):
    lead = browser_as("lead")
    answer = lead.post(f"{plan}/stations/proposal", {"based_on": "1"})
    assert answer.status_code == 422 and "Tick at least one place" in answer.text
    form = proposal_form(lead.get(f"{plan}/stations/proposal").text)
    lead.post(f"{plan}/weirs/0/remove", {"based_on": "1"})
    late = lead.post(f"{plan}/stations/proposal", form)
    assert late.status_code == 409 and now().number == 2


def test_stations_proposed_on_site_are_added_with_their_reason(browser_as, plan, now, a_reading):
    lead = browser_as("lead")
    form = proposal_form(lead.get(f"{plan}/stations/proposal").text) | {"version_reason": "Sag is further down"}
    answer = lead.post(f"{plan}/stations/proposal", form)
    assert answer.status_code == 303
    added = [row for row in now().tables["stations"] if row["code"].startswith("S")]
    assert added and all((row["state"], row["reason"]) == ("added", "Sag is further down") for row in added)


def test_without_a_sag_there_is_nothing_to_propose_yet(browser_as, survey):
    page = browser_as("lead").get(f"/surveys/{survey.id}/plan/stations/proposal")
    assert page.status_code == 200 and "Add the reaches" in page.text
