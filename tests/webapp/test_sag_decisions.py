"""The lead's decisions on the sag page: choosing and declining places, sending a person, leaving or staying."""

import csv
import io
import json
import re
import uuid
import zipfile
from datetime import UTC, datetime

import pytest
from sqlalchemy import select

from demo_survey import make
from tests.webapp.days import demo_readings, demo_survey, store
from webapp.display import Show
from webapp.models import Decision, History, Survey
from webapp.plan.queries import current_plan
from webapp.plan.service import save_tables
from webapp.sag import service


@pytest.fixture(autouse=True)
def in_the_forenoon(monkeypatch):
    """Daylight is a limit of the day, and these tests run at any hour: the crew is where no sun sets."""
    row = {"latitude": 89.0 if datetime.now(UTC).month in range(4, 10) else -89.0, "longitude": 0.0}
    monkeypatch.setitem(make.PLAN, "day", [row])


@pytest.fixture
def day(app, people):
    """The address of the demo survey's sag page, its readings stored."""
    with app.extensions["bankside_database"].writing() as db:
        survey = demo_survey(db, people)
        plan = current_plan(db, survey.id)
    for new in demo_readings():
        store(app, survey, plan, people["crew"], new)
    return f"/surveys/{survey.id}/sag"


@pytest.fixture
def stored(app, day):
    """Functions to the survey's current stations by code, and its decisions."""
    survey_id = day.split("/")[2]

    class Stored:
        def stations(self):
            with app.extensions["bankside_database"].reading() as db:
                return {row["code"]: row for row in current_plan(db, survey_id).tables["stations"]}

        def decisions(self):
            with app.extensions["bankside_database"].reading() as db:
                return db.scalars(select(Decision).order_by(Decision.made_at)).all()

        def history(self):
            with app.extensions["bankside_database"].reading() as db:
                return db.scalars(select(History.particulars).where(History.what == "decided")).all()

    return Stored()


def survey_of(db, day):
    return db.get(Survey, day.split("/")[2])


def mark_on(text):
    return re.search(r'name="shown" value="([0-9a-f]+)"', text)[1]


def form_for(text, place, **more):
    return {"id": str(uuid.uuid4()), "shown": mark_on(text), "place": place, **more}


def test_offers_come_with_reason_way_time_and_room_in_the_day(browser_as, day):
    text = browser_as("lead").get(day).text
    card = " ".join(text.split("Heron pool", 1)[1].split("</li>")[0].split())
    assert "Shows whether oxygen recovers below your last station" in card
    assert "km along the river from the last reading, about 27 min to drive" in card
    assert re.search(r"Parcel there (\w+ \d+ \w+ )?\d\d:\d\d, ", card)
    assert "no time limit is known" in card
    assert "Hazard: Deep pool" in card


def test_crew_sees_everything_and_no_button(browser_as, day):
    text = browser_as("crew").get(day).text
    assert "Where next" in text and "May we leave?" in text and "Heron pool" in text
    main = text.split("<main")[1]
    assert "<form" not in main and "<button" not in main


@pytest.mark.parametrize("deed", ["station", "decline", "offer", "crew", "leave"])
def test_crew_decides_nothing(browser_as, day, stored, deed):
    crew = browser_as("crew")
    assert crew.post(f"{day}/{deed}", {"id": str(uuid.uuid4()), "place": "Heron pool"}).status_code == 403
    assert stored.decisions() == []


@pytest.mark.parametrize("deed", ["station", "decline", "offer", "crew", "leave"])
def test_survey_of_another_crew_is_not_found(browser_as, deed):
    other = "/surveys/00000000-0000-0000-0000-000000000000/sag"
    assert browser_as("lead").post(f"{other}/{deed}", {"id": str(uuid.uuid4()), "place": "x"}).status_code == 404


@pytest.mark.parametrize("deed", ["decline", "offer", "leave"])
def test_survey_without_a_plan_has_nothing_to_decide(app, browser_as, survey, deed):
    form = {"id": str(uuid.uuid4()), "place": "Heron pool", "choice": "stayed", "shown": service.mark_of(None, ())}
    answer = browser_as("lead").post(f"/surveys/{survey.id}/sag/{deed}", form)
    assert answer.status_code == 409 and "There is no plan yet" in answer.text


def test_one_tap_adds_a_station_and_keeps_what_was_on_the_screen(browser_as, day, stored, people):
    lead = browser_as("lead")
    before = stored.stations()
    answer = lead.post(f"{day}/station", form_for(lead.get(day).text, "Heron pool"))
    assert (answer.status_code, answer.headers["Location"]) == (303, day)
    after = stored.stations()
    assert {code: after[code] for code in before} == before
    assert after["D5A"]["state"] == "added" and after["D5A"]["access"] == "Heron pool"
    assert after["D5A"]["reason"].startswith("where next: shows whether oxygen recovers")
    (decision,) = stored.decisions()
    assert (decision.kind, decision.chosen, decision.made_by_id) == ("station", "D5A", people["lead"].id)
    assert decision.screen["answer"]["word"] == "open below"
    assert decision.screen["intervals"]["lowest_mg_l"]["low"] < decision.screen["intervals"]["lowest_mg_l"]["high"]
    assert "Heron pool" in [one["place"] for one in decision.screen["places"]]
    assert stored.history() == [{"kind": "station", "chosen": "D5A", "reason": ""}]
    text = lead.get(day).text
    assert "D5A is added</strong> at Heron pool: it is on every field sheet. Who reads it?" in text
    assert "On the screen: Open below:" in text


def test_same_choice_sent_twice_is_one_station(browser_as, day, stored):
    lead = browser_as("lead")
    form = form_for(lead.get(day).text, "Heron pool")
    assert [lead.post(f"{day}/station", form).status_code for _ in range(2)] == [303, 303]
    assert len(stored.decisions()) == 1
    assert len(stored.stations()) == len(make.STATIONS) + 1


def test_with_htmx_the_page_as_it_is_then_comes_back(browser_as, day):
    lead = browser_as("lead")
    answer = lead.post(f"{day}/station", form_for(lead.get(day).text, "Heron pool"), htmx=True)
    assert answer.status_code == 200
    assert answer.text.lstrip().startswith('<section id="sag"') and "D5A is added" in answer.text


def test_second_tap_sends_a_person(browser_as, day, stored, people):
    lead = browser_as("lead")
    lead.post(f"{day}/station", form_for(lead.get(day).text, "Heron pool"))
    assert lead.post(f"{day}/crew", {"code": "D5A", "crew": people["crew"].name}).status_code == 303
    assert stored.stations()["D5A"]["crew"] == people["crew"].name
    text = lead.get(day).text
    assert "Who reads it?" not in text and f"for {people['crew'].name}" in text
    assert f"it is on every field sheet. {people['crew'].name} reads it." in text


@pytest.mark.parametrize("form", [{"code": "D5", "crew": "Nobody"}, {"code": "", "crew": "Cleo Banks"}, {}])
def test_person_who_is_not_on_the_survey_is_refused(browser_as, day, stored, form):
    before = stored.stations()
    assert browser_as("lead").post(f"{day}/crew", form).status_code == 422
    assert stored.stations() == before


def test_station_that_is_gone_is_told(browser_as, day, people):
    answer = browser_as("lead").post(f"{day}/crew", {"code": "D99", "crew": people["crew"].name})
    assert answer.status_code == 409 and "There is no station D99 in the plan any more." in answer.text


def test_planned_station_is_chosen_without_a_change_of_the_plan(browser_as, day, stored):
    lead = browser_as("lead")
    before = stored.stations()
    assert lead.post(f"{day}/station", form_for(lead.get(day).text, "Stone barn")).status_code == 303
    assert stored.stations() == before
    assert stored.decisions()[0].chosen == "D6"


def test_another_place_takes_a_reason_and_needs_none(browser_as, day, stored):
    lead = browser_as("lead")
    lead.post(f"{day}/station", form_for(lead.get(day).text, "Gravel bar", reason="Safer to stop there"))
    lead.post(f"{day}/station", form_for(lead.get(day).text, "Lower bridge"))
    stations = stored.stations()
    assert stations["D7A"]["reason"] == "chosen on site: Safer to stop there"
    assert stations["D10"]["reason"] == "chosen on site"


def test_declined_place_is_offered_no_longer_until_it_is_offered_again(browser_as, day, stored):
    lead = browser_as("lead")
    assert lead.post(f"{day}/decline", form_for(lead.get(day).text, "Heron pool")).status_code == 303
    text = lead.get(day).text
    assert "Offer Heron pool again" in text
    assert "Add Heron pool as" not in text
    lead.post(f"{day}/offer", form_for(text, "Heron pool"))
    assert "Add Heron pool as" in lead.get(day).text
    assert [one.kind for one in stored.decisions()] == ["declined", "offered"]
    assert [one.reason for one in stored.decisions()] == ["", ""]


@pytest.mark.parametrize(
    "wrong",
    [{"id": "x"}, {"place": ""}, {"place": "x" * 101}, {"reason": "x" * 201}, {"id": ""}],
)
def test_choice_that_is_no_choice_is_refused(browser_as, day, stored, wrong):
    lead = browser_as("lead")
    form = form_for(lead.get(day).text, "Heron pool") | wrong
    assert lead.post(f"{day}/station", form).status_code == 422
    assert stored.decisions() == []


@pytest.mark.parametrize("place", ["Nowhere", "Poplar footbridge", "\x00", "15.3"])
def test_place_that_is_not_offered_is_refused(browser_as, day, stored, place):
    lead = browser_as("lead")
    assert lead.post(f"{day}/station", form_for(lead.get(day).text, place)).status_code in (409, 422)
    assert stored.decisions() == []


def test_decision_on_an_old_screen_is_asked_again(browser_as, day, stored):
    lead = browser_as("lead")
    old = lead.get(day).text
    lead.post(f"{day}/station", form_for(old, "Heron pool"))
    answer = lead.post(f"{day}/station", form_for(old, "Gravel bar"))
    assert answer.status_code == 409 and "changed since this page was shown" in answer.text
    assert len(stored.decisions()) == 1


def test_leaving_while_it_is_open_needs_a_reason(browser_as, day, stored):
    lead = browser_as("lead")
    form = form_for(lead.get(day).text, "") | {"choice": "left", "check_people": "yes"}
    answer = lead.post(f"{day}/leave", form)
    assert answer.status_code == 422
    assert "Say why you leave although the low point is not settled." in answer.text
    assert re.search(r'name="check_people" value="yes" checked', answer.text)
    assert lead.post(f"{day}/leave", form | {"leave_reason": "Thunder"}).status_code == 303
    (decision,) = stored.decisions()
    assert (decision.chosen, decision.reason, decision.screen["ticked"]) == ("left", "Thunder", ["people"])
    assert "We leave</strong>" in lead.get(day).text


def test_dataset_holds_every_decision_with_its_screen(browser_as, day):
    lead = browser_as("lead")
    lead.post(f"{day}/station", form_for(lead.get(day).text, "Heron pool"))
    archive = browser_as("office").get(f"{day.removesuffix('/sag')}/dataset.zip")
    text = zipfile.ZipFile(io.BytesIO(archive.data)).read("decisions.csv").decode("utf-8-sig")
    (row,) = csv.DictReader(io.StringIO(text))
    assert (row["kind"], row["chosen"], row["plan_version"]) == ("station", "D5A", "1")
    assert json.loads(row["screen"])["answer"]["word"] == "open below"


def test_staying_needs_no_reason(browser_as, day, stored):
    lead = browser_as("lead")
    form = form_for(lead.get(day).text, "") | {"choice": "stayed"}
    assert [lead.post(f"{day}/leave", form).status_code for _ in range(2)] == [303, 303]
    assert [one.chosen for one in stored.decisions()] == ["stayed"]


@pytest.mark.parametrize("wrong", [{"choice": "gone"}, {"choice": ""}, {"leave_reason": "x" * 1001}, {"id": "1"}])
def test_leaving_form_that_says_nothing_is_refused(browser_as, day, stored, wrong):
    lead = browser_as("lead")
    form = form_for(lead.get(day).text, "") | {"choice": "stayed"} | wrong
    assert lead.post(f"{day}/leave", form).status_code == 422
    assert stored.decisions() == []


def test_news_come_when_something_changed_and_are_silent_before(browser_as, day):
    lead = browser_as("lead")
    mark = mark_on(lead.get(day).text)
    assert lead.get(f"{day}/news?shown={mark}").status_code == 204
    lead.post(f"{day}/station", form_for(lead.get(day).text, "Heron pool"))
    answer = lead.get(f"{day}/news?shown={mark}", headers={"HX-Request": "true"})
    assert "New since this page was shown." in answer.text and "<html" not in answer.text


def test_boat_reads_anywhere_on_the_river(app, browser_as, day, people, stored):
    with app.extensions["bankside_database"].writing() as db:
        survey = survey_of(db, day)
        row = {**make.PLAN["day"][0], "reachable_anywhere": True}
        save_tables(db, survey, {"day": [row]}, "The boat is here", people["lead"].id)
    lead = browser_as("lead")
    text = lead.get(day).text
    assert "By boat: any place on the river." in text
    place = re.search(r'name="place" value="(\d+\.\d+)">\s*<button', text)[1]
    assert lead.post(f"{day}/station", form_for(text, place)).status_code == 303
    added = [row for row in stored.stations().values() if row["state"] == "added"]
    assert [row["distance_km"] for row in added] == [float(place)]


def test_place_that_breaks_the_day_is_shown_and_not_offered(app, browser_as, day, people):
    soon = datetime.now(UTC).isoformat(timespec="seconds")
    with app.extensions["bankside_database"].writing() as db:
        survey = survey_of(db, day)
        row = {**make.PLAN["day"][0], "crew_until": soon}
        save_tables(db, survey, {"day": [row]}, "Crew tired", people["lead"].id)
    text = browser_as("lead").get(day).text
    assert "No time is left." in text
    assert "Does not fit into the day:" in text
    assert "No place that is left fits into the day." in text
    assert "Add Heron pool as" not in text


def test_mark_is_that_of_the_page(app, day):
    with app.extensions["bankside_database"].reading() as db:
        survey = survey_of(db, day)
        sag = service.sag_of(db, survey, Show.of(survey), datetime.now(UTC))
        assert service.current_mark(db, survey) == sag.mark


@pytest.mark.parametrize("endpoint", ["sag.choose", "sag.decline", "sag.offer", "sag.leave"])
def test_the_estimate_is_made_before_standing_in_the_writers_line(app, endpoint):
    assert app.view_functions[endpoint].reads_only
