import re

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.webapp.planning import REACH, message_beside, set_survey
from tests.webapp.plans import PLAN
from webapp.models import SurveyMember


def test_an_empty_plan_says_what_it_needs(browser_as, survey):
    page = browser_as("lead").get(f"/surveys/{survey.id}/plan")
    assert "Add the reaches of the river" in page.text and "<svg class" not in page.text


def test_the_page_shows_sag_rates_tables_and_versions(browser_as, plan):
    page = browser_as("lead").get(plan).text
    for words in (
        "Predicted lowest oxygen",
        "Covar",
        "flow over width and depth",
        "Reaches · 4",
        "First plan",
        "Linus Ford",
    ):
        assert words in page
    assert "Propose stations" in page and "Add reach" in page


def test_crew_see_the_plan_but_no_way_to_change_it(browser_as, plan):
    crew = browser_as("crew")
    page = crew.get(plan).text
    assert "Predicted lowest oxygen" in page
    assert "Add reach" not in page and "Propose" not in page and "/edit" not in page


@pytest.mark.parametrize("address", ["/reaches/1/edit", "/reaches/new", "/weirs/import", "/stations/proposal"])
def test_crew_may_not_open_what_changes_the_plan(browser_as, plan, address):
    assert browser_as("crew").get(plan + address).status_code == 403


@pytest.mark.parametrize(
    "address",
    [
        "/reaches/1/edit",
        "/reaches/1/look",
        "/reaches/1/remove",
        "/reaches/new",
        "/weirs/import",
        "/weirs/import/save",
        "/stations/proposal",
    ],
)
def test_crew_may_not_post_what_changes_the_plan(browser_as, plan, now, address):
    assert browser_as("crew").post(plan + address, REACH).status_code == 403
    assert now().number == 1


@pytest.mark.parametrize(
    "address",
    ["", "/reaches/1/edit", "/reaches/new", "/weirs/import", "/stations/proposal", "/reaches.csv", "/versions/1"],
)
def test_the_plan_of_a_survey_one_is_not_on_is_not_found(app, browser_as, survey, people, plan, address):
    with app.extensions["bankside_database"].writing() as db:
        db.delete(db.get(SurveyMember, (survey.id, people["lead"].id)))
        db.commit()
    lead = browser_as("lead")
    assert lead.get(plan + address).status_code == 404
    if address and "csv" not in address and "versions" not in address:
        assert lead.post(plan + address, REACH).status_code == 404


@pytest.mark.parametrize(
    "address",
    [
        "/bridges/0/edit",
        "/reaches/99/edit",
        "/bridges/new",
        "/basis/new",
        "/bridges.csv",
        "/bridges/import",
        "/versions/9",
        "/versions/3000000000",
        "/versions/99999999999999999999",
    ],
)
def test_what_a_plan_does_not_have_is_not_found(browser_as, plan, address):
    assert browser_as("lead").get(plan + address).status_code == 404


def test_a_row_is_saved_as_a_new_version(browser_as, plan, now):
    answer = browser_as("lead").post(f"{plan}/reaches/1/edit", REACH | {"kd20_per_day": "0,9", "version_reason": "Lab"})
    assert answer.status_code == 303 and "open=reaches" in answer.location
    version = now()
    assert (version.number, version.reason) == (2, "Lab")
    assert version.tables["reaches"][1]["kd20_per_day"] == 0.9
    assert "ks20_per_day" not in version.tables["reaches"][1]


def test_what_nobody_touched_stays_to_its_last_digit(app, browser_as, survey, plan, now):
    set_survey(app, survey, unit_system="us", distance_rule="river_mile", outfall_mark=41.2)
    lead = browser_as("lead")
    page = lead.get(f"{plan}/reaches/1/edit").text
    form = dict(re.findall(r'<input id="([a-z0-9_]+)" name="\1"[^>]*\svalue="([^"]*)"', page))
    assert form["depth_m"].startswith("3.60892388") and form["from_km"] == "41.2"
    answer = lead.post(f"{plan}/reaches/1/edit", form | {"width_m": "40", "based_on": "1"})
    assert answer.status_code == 303
    assert now().tables["reaches"][1] == PLAN["reaches"][1] | {"width_m": 12.192}


@pytest.mark.parametrize(
    ("field", "typed", "message"),
    [
        ("depth_m", "", "It is empty; fill it in."),
        ("depth_m", "deep", "Enter a number, for example 12.4."),
        ("depth_m", "1,234", "Say which you mean: 1,234 can be read in two ways: write 1.234 or 1234."),
        ("depth_m", "900", "It must lie between 0.02 and 60 m; check it."),
        ("velocity_m_s", "nan", "Enter a number, for example 12.4."),
        ("to_km", "-3", "It ends above where it begins; a reach runs down the river. Check both places."),
        ("name", "x" * 61, "Shorten it to 60 characters or fewer; it has 61."),
        ("version_reason", "x" * 401, "Shorten it to 400 characters or fewer; it has 401."),
    ],
)
def test_a_bad_entry_is_told_beside_its_field_and_kept(browser_as, plan, now, field, typed, message):
    answer = browser_as("lead").post(f"{plan}/reaches/1/edit", REACH | {field: typed})
    assert answer.status_code == 422
    assert message_beside(answer, field) == message
    assert f'value="{typed}"' in answer.text and now().number == 1


@pytest.mark.parametrize(
    ("address", "form", "field", "message"),
    [
        ("/waters/new", {"kind": "outfall", "flow_m3_s": "1"}, "kind", "There is a row for the outfall already"),
        ("/waters/new", {"kind": "ocean", "flow_m3_s": "1"}, "kind", "Write one of: "),
        ("/waters/new", {"kind": "tributary", "flow_m3_s": "1"}, "distance_km", "Enter where it meets the river."),
        ("/waters/1/edit", {"kind": "upstream", "flow_m3_s": "1"}, "kind", "There is a row for the river above"),
        ("/waters/0/edit", {"kind": "outfall", "flow_m3_s": "1"}, "kind", "There is a row for the outfall already"),
        ("/weirs/new", {"name": "Weir", "distance_km": "3", "drop_m": "9"}, "drop_m", "It must lie between"),
        (
            "/access/new",
            {"name": "willow LANE", "distance_km": "3"},
            "name",
            "There is another access point Willow lane",
        ),
        ("/stations/new", {"code": "d3", "distance_km": "3"}, "code", "There is another station D3"),
        ("/stations/new", {"code": "D4/a", "distance_km": "3"}, "code", "A code stands in the address of a page"),
        ("/stations/new", {"code": "D99", "distance_km": "3", "state": "added"}, "reason", "Say why it was added"),
        ("/basis/0/edit", {"sd_kd": "7"}, "sd_kd", "It must lie between 0 and 2; check it."),
    ],
)
def test_each_table_refuses_what_can_not_stand(browser_as, plan, now, address, form, field, message):
    answer = browser_as("lead").post(plan + address, form | {"based_on": "1"})
    assert answer.status_code == 422
    assert message_beside(answer, field).startswith(message) and now().number == 1


def test_a_new_row_is_added_in_its_place(browser_as, plan, now):
    form = {"name": "Low weir", "distance_km": "3,5", "drop_m": "0,4", "shape": "flat", "based_on": "1"}
    assert browser_as("lead").post(f"{plan}/weirs/new", form).status_code == 303
    assert [row["name"] for row in now().tables["weirs"]] == ["Low weir", "Old mill weir"]


def test_a_station_takes_the_place_of_its_access_point(browser_as, plan, now):
    form = {"code": "D10", "distance_km": "", "access": "Hay barn", "based_on": "1"}
    assert browser_as("lead").post(f"{plan}/stations/new", form).status_code == 303
    assert {row["code"]: row["distance_km"] for row in now().tables["stations"]}["D10"] == 12.4


def test_a_row_is_removed_as_a_new_version(browser_as, plan, now):
    assert browser_as("lead").post(f"{plan}/weirs/0/remove", {"based_on": "1"}).status_code == 303
    assert (now().number, now().tables["weirs"]) == (2, [])


def test_the_sag_follows_the_typing_and_nothing_is_saved(browser_as, plan, now):
    lead = browser_as("lead")
    before = lead.post(f"{plan}/reaches/1/look", REACH, htmx=True)
    after = lead.post(f"{plan}/reaches/1/look", REACH | {"kd20_per_day": "1.5"}, htmx=True)
    lowest = [float(re.search(r"<strong>([0-9.]+) mg/L</strong> lowest", one.text).group(1)) for one in (before, after)]
    assert lowest[1] < lowest[0] - 0.3
    assert after.status_code == 200 and "<html" not in after.text and 'hx-swap-oob="true"' in after.text
    assert now().number == 1


def test_bad_typing_says_so_and_leaves_the_figure(browser_as, plan):
    answer = browser_as("lead").post(f"{plan}/reaches/1/look", REACH | {"depth_m": "1.x"}, htmx=True)
    assert answer.status_code == 422
    assert "Mean depth (Enter a number, for example 12.4)" in answer.text and "<svg" in answer.text


def test_without_javascript_the_sag_comes_as_a_page_with_what_was_typed(browser_as, plan, now):
    answer = browser_as("lead").post(f"{plan}/reaches/1/look", REACH | {"kd20_per_day": "1.5"})
    assert answer.status_code == 200 and "<html" in answer.text and 'value="1.5"' in answer.text
    assert now().number == 1


def test_typing_that_leaves_nothing_to_predict_says_what_is_missing(browser_as, plan):
    answer = browser_as("lead").post(f"{plan}/reaches/1/look", REACH | {"to_km": "6"}, htmx=True)
    assert answer.status_code == 200 and "leaves a gap below Willow glides" in answer.text


def test_who_saves_a_change_of_an_older_version_is_told_and_keeps_the_typing(browser_as, plan, now):
    lead, office = browser_as("lead"), browser_as("office")
    office.post(
        f"{plan}/reaches/0/edit", REACH | {"name": "Top", "from_km": "-1", "to_km": "0", "version_reason": "New top"}
    )
    late = lead.post(f"{plan}/reaches/1/edit", REACH | {"kd20_per_day": "0.91"})
    assert late.status_code == 409
    assert "Olive Reed saved version 2 of the plan meanwhile (New top)" in late.text
    assert 'value="0.91"' in late.text and 'name="based_on" value="2"' in late.text
    assert now().number == 2
    assert lead.post(f"{plan}/reaches/1/edit", REACH | {"kd20_per_day": "0.91", "based_on": "2"}).status_code == 303
    assert [row["name"] for row in now().tables["reaches"]][:2] == ["Top", "Willow glides"]


def test_a_late_form_follows_its_row_to_where_it_stands_now(browser_as, plan, now):
    lead, office = browser_as("lead"), browser_as("office")
    assert office.post(f"{plan}/reaches/0/remove", {"based_on": "1"}).status_code == 303
    late = lead.post(f"{plan}/reaches/1/edit", REACH)
    assert late.status_code == 409 and 'action="' + f'{plan}/reaches/0/edit"' in late.text


def test_the_same_form_sent_twice_is_saved_once(browser_as, plan, now):
    lead = browser_as("lead")
    answers = [
        lead.post(f"{plan}/weirs/new", {"name": "W", "distance_km": "3", "drop_m": "1", "based_on": "1"}) for _ in "ab"
    ]
    assert [answer.status_code for answer in answers] == [303, 409]
    assert (now().number, len(now().tables["weirs"])) == (2, 2)


def test_once_readings_exist_the_form_asks_why(browser_as, plan, now, a_reading):
    lead = browser_as("lead")
    answer = lead.post(f"{plan}/reaches/1/edit", REACH)
    assert answer.status_code == 422
    assert message_beside(answer, "version_reason") == "Say why the plan changes: readings were taken on it."
    removal = lead.post(f"{plan}/weirs/0/remove", {"based_on": "1"})
    assert removal.status_code == 422 and "Say why the plan changes" in removal.text
    assert lead.post(f"{plan}/reaches/1/edit", REACH | {"version_reason": "Gauge read"}).status_code == 303
    assert now().reason == "Gauge read"


def test_a_station_with_readings_can_not_be_removed(browser_as, plan, now, a_reading):
    answer = browser_as("lead").post(f"{plan}/stations/3/remove", {"based_on": "1", "version_reason": "not needed"})
    assert answer.status_code == 409 and "Readings were taken at D3" in answer.text and now().number == 1


def test_an_earlier_version_is_shown_as_it_was(browser_as, plan):
    lead = browser_as("lead")
    lead.post(f"{plan}/weirs/0/remove", {"based_on": "1"})
    page = lead.get(f"{plan}/versions/1").text
    assert "Old mill weir" in page and "Weirs · 1" in page and "/edit" not in page
    assert "Weirs · 0" in lead.get(plan).text


def test_the_first_row_of_an_empty_plan_makes_version_one(browser_as, survey, now):
    form = {"name": "W", "distance_km": "3", "drop_m": "1", "based_on": "0"}
    assert browser_as("lead").post(f"/surveys/{survey.id}/plan/weirs/new", form).status_code == 303
    assert now().number == 1


ODD = st.one_of(
    st.text(max_size=30),
    st.sampled_from(["1e308", "-9" * 40, "1,234", "\x00", "٣", "=1+1", "\ud800".encode("utf-8", "replace").decode()]),
)


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_nothing_typed_breaks_a_page_of_the_plan(data, lead, plan):
    key = data.draw(st.sampled_from(sorted(PLAN)))
    names = ["based_on", "version_reason", "text", "take_0", "code_0", "distance_km_0", *(column for column in REACH)]
    form = data.draw(st.dictionaries(st.sampled_from([*names, *PLAN[key][0]]), ODD, max_size=8))
    address = data.draw(st.sampled_from(["/0/look", "/0/edit", "/new", "/import", "/import/save", "/0/remove"]))
    for where in (f"/{key}{address}", "/stations/proposal"):
        assert lead.post(plan + where, form).status_code in {200, 303, 404, 409, 422}
