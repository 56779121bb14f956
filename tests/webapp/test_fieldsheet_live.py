import copy
import re
from datetime import UTC, datetime, timedelta

import pytest
from sqlalchemy import event, select

from tests.webapp.planning import set_survey
from tests.webapp.plans import PLAN, put_plan
from webapp.fieldsheet.service import next_stop
from webapp.models import History, Seen, Survey
from webapp.plan.queries import current_plan
from webapp.plan.service import save_tables
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading

RELEASE = datetime(2026, 8, 12, 4, 0, tzinfo=UTC)  # 06:00 in Vienna, as the survey's form has it
MARK = "New since you looked"
ADDED = {"code": "D4A", "distance_km": 11.4, "state": "added", "reason": "the sag may be deeper here"}


@pytest.fixture
def plan(app, survey, people):
    with app.extensions["bankside_database"].writing() as session:
        return put_plan(session, survey, people["lead"])


@pytest.fixture
def sheet(survey):
    return f"/surveys/{survey.id}/sheet"


@pytest.fixture
def change(app, survey, people, plan):
    """A function by which the lead saves tables of the plan."""

    def saved(reason="as the day goes", **tables):
        with app.extensions["bankside_database"].writing() as session:
            return save_tables(session, session.get(Survey, survey.id), tables, reason, people["lead"].id)

    return saved


def stations(*more, **changes):
    rows = copy.deepcopy(PLAN["stations"])
    for row in rows:
        row.update(changes.get(row["code"], {}))
    return [*rows, *more]


class Phone:
    """A crew's open field sheet: page() loads it, poll() asks for changes as htmx does and takes them in."""

    def __init__(self, browser, sheet):
        self.browser, self.sheet, self.have = browser, sheet, ""

    def page(self):
        return self._take(self.browser.get(self.sheet))

    def poll(self):
        return self._take(self.browser.get(f"{self.sheet}/news?have={self.have}", headers={"HX-Request": "true"}))

    def _take(self, answer):
        if found := re.search(r'hx-get="[^"]*have=([^"]+)"', answer.text):
            self.have = found.group(1)
        return answer


@pytest.fixture
def phone(browser_as, sheet, plan):
    """The crew's phone, after a first look at the sheet."""
    phone = Phone(browser_as("crew"), sheet)
    phone.page()
    return phone


def card(text, code):
    return re.search(rf'<li class="card stop" id="station-{code}">.*?</li>', text, re.DOTALL).group(0)


def test_first_look_marks_nothing(browser_as, sheet, plan):
    assert MARK not in browser_as("crew").get(sheet).text


def test_open_sheet_asks_every_fifteen_seconds_and_is_told_at_once_when_nothing_changed(phone):
    page = phone.page().text
    assert 'hx-trigger="every 15s"' in page and 'hx-swap="outerHTML"' in page
    assert (phone.poll().status_code, phone.poll().data) == (204, b"")


def test_unchanged_answer_costs_at_most_four_queries(app, phone):
    statements = []
    engine = app.extensions["bankside_database"].engine
    event.listen(engine, "before_cursor_execute", lambda *call: statements.append(call[2]))
    assert phone.poll().status_code == 204
    assert len(statements) <= 4


def test_added_station_reaches_the_open_sheet_with_its_mark_and_reason(phone, change):
    change(stations=stations(ADDED))
    answer = phone.poll()
    assert answer.status_code == 200 and "HX-Request" in answer.headers["Vary"]
    assert "<html" not in answer.text and answer.text.count('id="day"') == 1
    assert "D4A is new: the sag may be deeper here." in answer.text
    assert MARK in card(answer.text, "D4A") and MARK not in card(answer.text, "D4")
    assert phone.poll().status_code == 204


def test_update_is_no_look_and_the_page_after_the_look_no_longer_marks(phone, change):
    change(stations=stations(ADDED))
    assert MARK in phone.poll().text
    assert MARK in phone.page().text
    assert MARK not in phone.page().text


def test_each_person_has_looks_of_their_own(phone, change, browser_as, sheet):
    other = Phone(browser_as("office"), sheet)
    other.page()
    change(stations=stations(ADDED))
    phone.page()
    assert MARK not in phone.page().text
    assert MARK in other.page().text


def test_page_fetched_ahead_or_by_head_is_no_look(phone, change):
    change(stations=stations(ADDED))
    phone.browser.get(phone.sheet, headers={"Sec-Purpose": "prefetch"})
    phone.browser.get(phone.sheet, headers={"Sec-Fetch-Dest": "empty"})
    phone.browser.client.head(phone.sheet)
    assert MARK in phone.page().text


def test_look_is_stored_once_for_each_person(db, survey, people, phone, change):
    change(stations=stations(ADDED))
    phone.page()
    rows = db.scalars(select(Seen).where(Seen.survey_id == survey.id)).all()
    assert [(row.person_id, row.plan_number, row.release_at) for row in rows] == [(people["crew"].id, 2, RELEASE)]


def test_dropped_station_is_marked_where_it_now_stands(phone, change):
    change(stations=stations(D6={"state": "dropped", "reason": "the bank slid"}))
    page = phone.poll().text
    assert "D6 is dropped: the bank slid." in page and MARK in card(page, "D6")
    assert page.index(">Dropped<") < page.index('id="station-D6"')


def test_station_that_comes_back_or_leaves_the_plan_is_told(phone, change):
    change(stations=stations(D6={"state": "dropped", "reason": "the bank slid"}))
    phone.page()
    change(stations=[row for row in stations() if row["code"] != "D8"])
    page = phone.poll().text
    assert "D6 is back." in page and "D8 is no longer in the plan." in page


def test_moved_release_reaches_the_open_sheet_with_both_times(app, survey, phone):
    set_survey(app, survey, release_at=RELEASE + timedelta(minutes=40))
    page = phone.poll().text
    assert "Release: Wed 12 Aug 06:40, before: Wed 12 Aug 06:00." in page
    assert "The parcel comes 40 min later at D1, 40 min later at D8." in page
    assert MARK in card(page, "D3") and "it was Wed 12 Aug" in card(page, "D3")
    assert MARK not in card(page, "U1")


def test_measured_flow_moves_the_parcels_times_on_the_open_sheet(phone, change, people):
    before = card(phone.page().text, "D6")
    change("gauged at dawn", day=[{"river_flow_m3_s": 0.9}])
    page = phone.poll().text
    assert f"{people['lead'].name}: gauged at dawn" in page and "it was" in card(page, "D6")
    assert card(page, "D6") != before
    assert "Times follow what the day showed." in page and "later at D8" in page


def test_every_reason_since_the_look_is_told_once_with_who_gave_it(phone, change, people):
    for reason, flow in (("gauged at dawn", 0.9), ("gauged at dawn", 1.0), ("", 1.1), ("gate opened", 1.2)):
        change(reason, day=[{"river_flow_m3_s": flow}])
    page, name = phone.page().text, people["lead"].name
    assert page.count("gauged at dawn") == 1
    assert page.index(f"{name}: gauged at dawn") < page.index(f"{name}: gate opened")


def test_new_time_is_not_marked_where_the_station_is_read_already(app, survey, people, phone, change):
    with app.extensions["bankside_database"].writing() as session:
        new = NewReading("8e7f2d3c-0000-4000-8000-000000000002", "D6", RELEASE + timedelta(hours=2), do_mg_l=6.42)
        add_reading(session, survey, new, people["lead"].id, current_plan(session, survey.id), new.taken_at)
    change("gauged at dawn", day=[{"river_flow_m3_s": 0.9}])
    page = phone.poll().text
    assert MARK not in card(page, "D6") and MARK in card(page, "D7")


def test_station_given_to_a_person_says_so_to_them_and_to_others(phone, change, people, browser_as, sheet):
    change(stations=stations(D6={"crew": people["crew"].name}))
    page = phone.poll().text
    assert "D6 is for you now." in page and "For you" in card(page, "D6")
    other = browser_as("lead").get(sheet).text
    assert f"For {people['crew'].name}" in card(other, "D6") and "for you now" not in other


def test_reading_of_another_crew_reaches_the_open_sheet_without_a_mark(app, survey, people, phone):
    with app.extensions["bankside_database"].writing() as session:
        new = NewReading("8e7f2d3c-0000-4000-8000-000000000001", "D2", RELEASE + timedelta(hours=2), do_mg_l=6.42)
        add_reading(session, survey, new, people["lead"].id, current_plan(session, survey.id), new.taken_at)
    page = phone.poll().text
    assert "6.42 mg/L" in card(page, "D2") and MARK not in page


def test_first_plan_reaches_a_sheet_that_was_opened_without_one(app, survey, people, browser_as, sheet):
    phone = Phone(browser_as("crew"), sheet)
    assert "There is no plan yet" in phone.page().text
    with app.extensions["bankside_database"].writing() as session:
        put_plan(session, survey, people["lead"])
    assert "Next: U1" in phone.poll().text


def test_question_of_somebody_signed_out_is_refused_without_a_page(app, sheet, plan):
    answer = app.test_client().get(f"{sheet}/news?have=x", headers={"HX-Request": "true"})
    assert (answer.status_code, answer.data) == (401, b"")


def test_question_about_another_crews_survey_is_not_found(phone):
    assert phone.browser.get("/surveys/somewhere/sheet/news", headers={"HX-Request": "true"}).status_code == 404


def test_question_without_htmx_leads_to_the_sheet(phone):
    answer = phone.browser.get(f"{phone.sheet}/news")
    assert (answer.status_code, answer.location) == (303, phone.sheet)


def test_next_is_a_station_for_the_person_or_nobody_before_one_for_somebody_else(db, survey, people, change):
    everyone = {row["code"]: {"crew": "Bo Reed"} for row in PLAN["stations"]}
    version = change(stations=stations(**everyone | {"D2": {"crew": "Cleo Banks"}, "D4": {}}))
    assert next_stop(survey, version, [], "Cleo Banks").code == "D2"
    assert next_stop(survey, version, [], "Bo Reed").code == "U1"
    assert next_stop(survey, version, [], "Ann Rowe").code == "D4"
    version = change(stations=stations(**everyone))
    assert next_stop(survey, version, [], "Cleo Banks").code == "U1"


def release_form(**typed):
    return {"release_at": "2026-08-12T06:40", "was_at": "2026-08-12T06:00:00+02:00", **typed}


@pytest.mark.parametrize("htmx", [False, True])
def test_lead_moves_the_release_and_the_history_keeps_both(db, survey, browser_as, sheet, plan, htmx):
    answer = browser_as("lead").post(f"{sheet}/release", release_form(), htmx=htmx)
    assert (answer.status_code, answer.location) == (303, sheet)
    db.expire_all()
    assert db.get(Survey, survey.id).release_at == RELEASE + timedelta(minutes=40)
    line = db.scalar(select(History).where(History.what == "release time changed"))
    assert line.particulars == {"release_at": ["2026-08-12T04:00:00+00:00", "2026-08-12T04:40:00+00:00"]}


@pytest.mark.parametrize("typed", ["", "soon", "1890-01-01T06:00", "\u0000"])
def test_bad_release_is_named_and_stays_as_typed(db, survey, browser_as, sheet, plan, typed):
    answer = browser_as("lead").post(f"{sheet}/release", release_form(release_at=typed))
    assert answer.status_code == 422 and 'id="release_at-error"' in answer.text
    assert f'value="{typed}"' in answer.text or typed == "\u0000"
    assert '<details class="fold" id="release" open>' in answer.text
    assert db.get(Survey, survey.id).release_at == RELEASE


def test_release_that_somebody_else_moved_meanwhile_is_not_overwritten(db, survey, browser_as, sheet, plan):
    lead = browser_as("lead")
    lead.post(f"{sheet}/release", release_form())
    answer = lead.post(f"{sheet}/release", release_form(release_at="2026-08-12T07:15"))
    assert answer.status_code == 409 and "meanwhile" in answer.text and 'value="2026-08-12T07:15"' in answer.text
    db.expire_all()
    assert db.get(Survey, survey.id).release_at == RELEASE + timedelta(minutes=40)


def test_same_release_sent_twice_is_one_line_of_history(db, browser_as, sheet, plan):
    lead = browser_as("lead")
    assert [lead.post(f"{sheet}/release", release_form()).status_code for _ in range(2)] == [303, 303]
    assert len(db.scalars(select(History).where(History.what == "release time changed")).all()) == 1


def test_release_can_be_set_where_there_was_none(app, db, survey, browser_as, sheet, plan):
    set_survey(app, survey, release_at=None)
    assert browser_as("lead").post(f"{sheet}/release", release_form(was_at="")).status_code == 303
    db.expire_all()
    assert db.get(Survey, survey.id).release_at == RELEASE + timedelta(minutes=40)


def test_crew_neither_sees_nor_sends_the_release_form(browser_as, sheet, plan):
    crew = browser_as("crew")
    assert "Change the release time" not in crew.get(sheet).text
    assert crew.post(f"{sheet}/release", release_form()).status_code == 403


def test_release_of_another_crews_survey_is_not_found(browser_as):
    assert browser_as("lead").post("/surveys/somewhere/sheet/release", release_form()).status_code == 404


def test_snapshot_survey_has_no_release_form(app, survey, browser_as, sheet, plan):
    set_survey(app, survey, sampling="snapshot")
    assert "release time" not in browser_as("lead").get(sheet).text
