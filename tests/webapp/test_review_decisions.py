"""Corrections, readings set aside and used again: each a layer with who and why, over a reading that stays."""

from functools import cache

import pytest

from tests.webapp.sheets import put_readings, rows
from webapp.models import History, Reading, ReadingEvent, Survey

WHY = "slip of the pen"


@pytest.fixture
def ids(db, survey, people):
    """Four readings of the crew, by station code."""
    return put_readings(db, survey, people)


@pytest.fixture
def act(browser_as, survey, ids):
    """A function that posts a decision about the reading at a station: act("crew", "correct", form, code="D3")."""
    browser = cache(browser_as)

    def post(role, deed, form, code="D3", htmx=False):
        return browser(role).post(f"/surveys/{survey.id}/readings/{ids[code]}/{deed}", form, htmx=htmx)

    return post


def form(**more):
    return {"based_on": "0", "reason": WHY, **more}


def correction(**more):
    return form(field="do_mg_l", value="4,52", **more)


def row_at(db, survey, code):
    return next(row for row in rows(db, survey) if row.final.station_code == code)


def test_correction_is_a_layer_and_raw_stays(act, db, survey, people):
    assert act("lead", "correct", correction()).status_code == 303
    row = row_at(db, survey, "D3")
    assert (row.final.do_mg_l, row.final.raw["do_mg_l"], row.reading.do_mg_l) == (4.52, 4.25, 4.25)
    (event,) = row.reading.events
    assert (event.kind, event.field, event.old_value, event.new_value) == ("corrected", "do_mg_l", 4.25, 4.52)
    assert (event.reason, event.made_by_id) == (WHY, people["lead"].id)
    line = db.query(History).filter_by(what="reading corrected").one()
    assert line.particulars == {"field": "do_mg_l", "old": 4.25, "new": 4.52, "reason": WHY}


def test_corrections_stack_and_the_last_one_counts(act, db, survey):
    act("lead", "correct", correction())
    second = {"based_on": "1", "field": "do_mg_l", "value": "4.6", "reason": "the meter's log says so"}
    assert act("office", "correct", second).status_code == 303
    row = row_at(db, survey, "D3")
    assert row.final.do_mg_l == 4.6
    assert [(one.old_value, one.new_value) for one in row.final.corrections] == [(4.25, 4.52), (4.52, 4.6)]


def test_correction_is_typed_in_the_unit_shown(act, db, survey):
    db.get(Survey, survey.id).unit_system = "us"
    db.commit()
    assert act("lead", "correct", form(field="water_temp_c", value="70.7")).status_code == 303
    assert row_at(db, survey, "D3").final.water_temp_c == pytest.approx(21.5)


def test_number_that_never_was_can_be_taken_away(act, db, survey):
    answer = act("lead", "correct", form(field="conductance_us_cm", value="", nothing="yes"))
    assert answer.status_code == 303
    row = row_at(db, survey, "D3")
    assert row.final.conductance_us_cm is None and row.final.raw["conductance_us_cm"] == 431.0


def test_number_that_was_not_recorded_can_be_added(act, db, survey):
    assert act("lead", "correct", form(field="depth_m", value="0.9"), code="D4").status_code == 303
    assert row_at(db, survey, "D4").final.depth_m == 0.9


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"value": ""}, "Enter the oxygen."),
        ({"value": "deep"}, "as a number"),
        ({"value": "31"}, "must lie between -0.5 and 30"),
        ({"value": "nan"}, "as a number"),
        ({"value": "1,234"}, "two ways"),
        ({"value": "4.25"}, "That is what it says already."),
        ({"value": "4.3", "nothing": "yes"}, "Either enter a value, or tick"),
        ({"reason": ""}, "Enter the reason"),
        ({"reason": "x" * 501}, "Shorten the reason"),
    ],
)
@pytest.mark.parametrize("htmx", [False, True])
def test_bad_correction_is_named_beside_its_field_and_typing_stays(act, db, change, message, htmx):
    sent = {**correction(), **change}
    answer = act("lead", "correct", sent, htmx=htmx)
    assert answer.status_code == 422
    assert message in answer.text.replace("&#39;", "'")
    assert f'value="{sent["value"]}"' in answer.text and f'value="{sent["reason"]}"' in answer.text
    assert db.query(ReadingEvent).count() == 0


@pytest.mark.parametrize("field", ["", "latitude", "note", "id", "events", "do_mg_l\x00x"])
def test_only_numbers_can_be_corrected(act, db, field):
    assert act("lead", "correct", form(field=field, value="1")).status_code == 422
    assert db.query(ReadingEvent).count() == 0


def test_reading_is_set_aside_and_used_again_with_reasons(act, db, survey):
    assert act("office", "set-aside", form(reason="the probe hung in the air")).status_code == 303
    row = row_at(db, survey, "D3")
    assert (row.final.set_aside, row.final.reason) == (True, "the probe hung in the air")
    assert act("office", "restore", form(based_on="1", reason="the log shows it was under water")).status_code == 303
    row = row_at(db, survey, "D3")
    assert not row.final.set_aside and [one.kind for one in row.reading.events] == ["set_aside", "restored"]


@pytest.mark.parametrize("deed", ["set-aside", "restore"])
def test_decision_without_reason_is_refused_beside_the_field(act, db, deed):
    answer = act("lead", deed, form(reason="  "))
    assert answer.status_code == 422
    assert "Enter the reason" in answer.text
    assert db.query(ReadingEvent).count() == 0


def test_setting_aside_what_is_aside_and_using_what_is_used_conflict(act, db):
    assert "in use already" in act("lead", "restore", form()).text
    act("lead", "set-aside", form())
    answer = act("lead", "set-aside", form(based_on="1", reason="once more"))
    assert answer.status_code == 409 and "set aside already" in answer.text
    assert db.query(ReadingEvent).count() == 1


@pytest.mark.parametrize("htmx", [False, True])
def test_decision_on_a_page_that_is_out_of_date_conflicts_and_keeps_typing(act, db, htmx):
    act("office", "correct", correction())
    late = {**correction(), "value": "4,9", "reason": "mine is better"}
    answer = act("lead", "correct", late, htmx=htmx)
    assert answer.status_code == 409
    assert "decided about this reading since you opened it" in answer.text
    assert 'value="4,9"' in answer.text and 'value="mine is better"' in answer.text
    assert db.query(ReadingEvent).count() == 1


@pytest.mark.parametrize("based_on", ["", "-1", "x", "²", "99999999999", "7"])
def test_decision_that_does_not_say_what_it_is_based_on_conflicts(act, db, based_on):
    assert act("lead", "correct", {**correction(), "based_on": based_on}).status_code == 409
    assert db.query(ReadingEvent).count() == 0


@pytest.mark.parametrize(("deed", "sent"), [("correct", correction()), ("set-aside", form())])
def test_same_decision_sent_twice_is_one(act, db, deed, sent):
    assert act("lead", deed, sent).status_code == 303
    assert act("lead", deed, sent).status_code == 303
    assert db.query(ReadingEvent).count() == 1


def test_crew_may_decide_about_their_own_readings_only(act, db, people, survey, ids):
    assert act("crew", "correct", correction()).status_code == 303
    db.get(Reading, ids["D4"]).author_id = people["lead"].id
    db.commit()
    for deed in ("correct", "set-aside", "restore"):
        answer = act("crew", deed, {**correction(), "based_on": "0"}, code="D4")
        assert answer.status_code == 403
    assert db.query(ReadingEvent).count() == 1


def test_page_of_anothers_reading_offers_the_crew_no_decision(browser_as, db, people, survey, ids):
    db.get(Reading, ids["D4"]).author_id = people["lead"].id
    db.commit()
    crew = browser_as("crew")
    assert "ask the lead or the office" in crew.get(f"/surveys/{survey.id}/readings/{ids['D4']}").text
    assert "Set aside</button>" in crew.get(f"/surveys/{survey.id}/readings/{ids['D3']}").text


def test_htmx_gets_the_reading_alone(act):
    answer = act("lead", "correct", correction(), htmx=True)
    assert answer.status_code == 200
    assert answer.text.lstrip().startswith('<section id="reading">')
    assert "corrected from 4.25 mg/L" in " ".join(answer.text.split())


def test_page_shows_every_layer(act, browser_as, survey, ids):
    act("lead", "correct", correction())
    page = " ".join(browser_as("crew").get(f"/surveys/{survey.id}/readings/{ids['D3']}").text.split())
    assert "Oxygen corrected from 4.25 mg/L to 4.52 mg/L" in page
    assert "by Linus Ford" in page and WHY in page
    assert f"/surveys/{survey.id}/readings/{ids['D3']}/check" in page


def test_correct_link_opens_the_form_for_that_number(browser_as, survey, ids):
    address = f"/surveys/{survey.id}/readings/{ids['D3']}"
    lead = browser_as("lead")
    assert "Correct: Depth of the water" in lead.get(f"{address}?correct=depth_m").text
    assert "Correct: " not in lead.get(f"{address}?correct=nonsense").text


@pytest.mark.parametrize("deed", ["", "/correct", "/set-aside", "/restore"])
def test_reading_of_another_survey_is_not_found(browser_as, survey, ids, deed):
    lead = browser_as("lead")
    for address in (f"/surveys/{survey.id}/readings/no-such", f"/surveys/elsewhere/readings/{ids['D3']}"):
        answer = lead.post(address + deed, correction()) if deed else lead.get(address)
        assert answer.status_code == 404
