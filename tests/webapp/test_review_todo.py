"""The office's review: what needs a look, worst first, what speaks for it, and what reviewer and crew say."""

import html
import re
from datetime import timedelta
from urllib.parse import parse_qsl

import pytest

from tests.webapp.metered import START, judged, put_check, put_day
from webapp.display import Show
from webapp.errors import Conflict, NotAllowed
from webapp.models import History, ReadingEvent, SurveyEvent
from webapp.people.access import SignedIn
from webapp.readings.judging import judgement_of
from webapp.review import bulk, forms, listing, service

WHY = "the stations beside agree"


@pytest.fixture
def day(db, survey, people):
    """Four readings between two passing checks, a replicate at D3 that is far off, and D6 after the last check."""
    meter = put_day(db, survey, people, end=8.20)
    rows = [
        {"station": "D3", "taken_at": START + timedelta(hours=6.2), "do_mg_l": 9.9, "water_temp_c": 20.0,
         "pressure": 742.0, "pressure_source": "barometer", "meter": "Meter A", "replicate": True},
        {"station": "D6", "taken_at": START + timedelta(hours=9), "do_mg_l": 4.9, "water_temp_c": 20.0,
         "pressure": 742.0, "pressure_source": "barometer", "meter": "Meter A"},
    ]  # fmt: skip
    service.import_readings(db, survey, rows, people["crew"].id)
    return meter


def by_place(db, survey):
    """Return the Judged by station; D3's replicate as "D3r"."""
    db.rollback()
    db.expire_all()
    found = judgement_of(db, survey).by_id.values()
    return {one.reading.station_code + ("r" if one.reading.replicate else ""): one for one in found}


def plain(answer):
    return " ".join(html.unescape(re.sub(r"<[^>]+>", " ", answer.text)).split())


def todo(browser_as, survey, query="", role="office"):
    return browser_as(role).get(f"/surveys/{survey.id}/review{query}")


def test_list_is_worst_first_with_what_is_odd_in_a_sentence(browser_as, db, survey, day):
    answer = todo(browser_as, survey)
    codes = re.findall(r"<strong>([UD]\d)</strong> <span", answer.text)
    worst = sorted(by_place(db, survey).values(), key=lambda one: (-one.severity, one.reading.taken_at))
    assert codes == [one.reading.station_code for one in worst] and codes[0] == "D3"
    text = plain(answer)
    assert "0 of 6 looked at." in text and "6 readings, worst first." in text
    assert "higher than the next station upstream" in text
    assert "it does not lie between two passing meter checks" in text


def test_list_is_filtered_on_the_server_and_what_cannot_be_read_filters_nothing(db, survey, day):
    expected = {
        "reason=not_bracketed": 1, "station=D3": 2, "meter=Meter+A": 6, "meter=Other": 0, "review=kept": 0,
        "day=2026-08-12": 6, "day=2026-08-13": 0, "day=soon": 6, "review=nonsense": 6, "page=3": 6, "author=nobody": 0,
        "reason=%00": 6,
    }  # fmt: skip
    judged, show, found = by_place(db, survey).values(), Show.of(survey), {}
    for query in expected:
        filters, _ = forms.parse_filters(dict(parse_qsl(query)), show, "todo")
        found[query] = len(listing.matching(judged, filters, show))
    assert found == expected


def test_crew_has_no_review_and_readings_offer_it_to_the_office_with_the_count(browser_as, survey, day):
    assert todo(browser_as, survey, role="crew").status_code == 403
    address = f"/surveys/{survey.id}/readings"
    assert "Review: 6 to look at" in browser_as("lead").get(address).text
    assert "to look at" not in plain(browser_as("crew").get(address)).replace("To look at", "")


def test_reviewer_goes_through_the_list_without_returning(browser_as, db, survey, day):
    office = browser_as("office")
    worst = sorted(by_place(db, survey).values(), key=lambda one: (-one.severity, one.reading.taken_at))
    first = f"/surveys/{survey.id}/readings/{worst[0].reading.id}"
    assert worst[1].reading.id in office.get(f"{first}?list=on").text
    answer = office.post(f"{first}/keep?list=on", {"based_on": "0", "why_kept": WHY})
    assert answer.status_code == 303 and f"/readings/{worst[1].reading.id}?" in answer.headers["Location"]
    page = plain(office.get(answer.headers["Location"]))
    assert "decided. Here is the next." in page
    assert "1 of 6 looked at." in plain(todo(browser_as, survey))


def test_one_screen_shows_all_that_speaks_for_a_reading(browser_as, db, survey, people, day):
    odd = by_place(db, survey)["D3r"].reading
    text = plain(browser_as("office").get(f"/surveys/{survey.id}/readings/{odd.id}"))
    assert "It repeats : D3" in text and "+4.90" in text
    assert "Upstream : D2" in text and "Downstream : D4" in text
    assert "Between two passing checks." in text and "Before: Meter A, read back" in text
    assert "After: Meter A, end check" in text
    assert "The plan expects" in text and "higher than the next station upstream" in text
    assert "Recorded at the water by Cleo Banks" in text
    for deed in ("Let it stand", "Ask the crew", "Set it aside", "Correct the oxygen"):
        assert deed in text


def test_kept_reading_is_good_and_needs_no_look(db, survey, people, day):
    one = by_place(db, survey)["D3r"].reading
    service.keep(db, survey.id, one.id, WHY, 0, SignedIn(people["office"]))
    now = by_place(db, survey)["D3r"]
    assert (now.quality, now.severity, now.reading.reviewer_id) == ("good", 0, people["office"].id)
    assert db.query(History).filter_by(what="reading kept").one().particulars == {"reason": WHY}
    assert service.keep(db, survey.id, one.id, WHY, 0, SignedIn(people["office"])).id == one.id
    with pytest.raises(Conflict, match="let it stand already"):
        service.keep(db, survey.id, one.id, "again", 1, SignedIn(people["office"]))
    assert db.query(ReadingEvent).count() == 1


def test_reviewer_is_not_the_author(db, survey, people, browser_as):
    put_day(db, survey, people, by="lead")
    one, lead = judged(db, survey)["D1"].reading, SignedIn(people["lead"])
    for deed in (service.keep, service.ask):
        with pytest.raises(NotAllowed, match="somebody else must review it"):
            deed(db, survey.id, one.id, WHY, 0, lead)
    with pytest.raises(NotAllowed, match="by the lead or the office"):
        service.keep(db, survey.id, one.id, WHY, 0, SignedIn(people["crew"]))
    assert "somebody else reviews it" in browser_as("lead").get(f"/surveys/{survey.id}/readings/{one.id}").text
    assert service.set_aside(db, survey.id, one.id, WHY, 0, lead).events[0].kind == "set_aside"
    assert judged(db, survey)["D1"].reading.review == "open"


def test_question_reaches_the_crew_and_its_answer_the_reviewer(browser_as, db, survey, people, day):
    one = by_place(db, survey)["D3r"].reading
    address = f"/surveys/{survey.id}/readings/{one.id}"
    office, crew = browser_as("office"), browser_as("crew")
    assert office.post(f"{address}/ask", {"based_on": "0", "question": "Was it 4.9?"}).status_code == 303
    assert "Questions for you" in crew.get(f"/surveys/{survey.id}/readings").text
    assert "Olive Reed asks: Was it 4.9?" in plain(crew.get(f"{address}/check"))
    own = office.post(f"{address}/answer", {"based_on": "1", "answer": "surely"})
    assert own.status_code == 403
    assert crew.post(f"{address}/answer", {"based_on": "1", "answer": ""}).status_code == 422
    assert crew.post(f"{address}/answer", {"based_on": "1", "answer": "Yes, 4.9"}).status_code == 303
    assert crew.post(f"{address}/answer", {"based_on": "1", "answer": "Yes, 4.9"}).status_code == 303
    assert crew.post(f"{address}/answer", {"based_on": "2", "answer": "no"}).status_code == 409
    assert "Questions for you" not in crew.get(f"/surveys/{survey.id}/readings").text
    page = plain(office.get(address))
    assert "The crew was asked by Olive Reed" in page and "Answered by Cleo Banks" in page and "Yes, 4.9" in page
    assert by_place(db, survey)["D3r"].reading.review == "answered"
    assert [event.kind for event in db.query(ReadingEvent).order_by(ReadingEvent.made_at)] == ["asked", "answered"]


@pytest.mark.parametrize("deed", ["keep", "ask", "answer"])
def test_what_a_reviewer_says_is_refused_without_words_on_a_stale_page_and_elsewhere(browser_as, db, survey, day, deed):
    one = by_place(db, survey)["D1"].reading
    name = {"keep": "why_kept", "ask": "question", "answer": "answer"}[deed]
    office, address = browser_as("office"), f"/surveys/{survey.id}/readings/{one.id}/{deed}"
    refused = office.post(address, {"based_on": "0", name: " "})
    assert refused.status_code == 422 and f'id="{name}-error"' in refused.text or deed == "answer"
    assert office.post(address, {"based_on": "3", name: "stale"}).status_code == 409
    assert office.post(address.replace(survey.id, "elsewhere"), {"based_on": "0", name: "x"}).status_code == 404
    assert db.query(ReadingEvent).count() == 0


def test_only_readings_without_a_question_of_their_own_are_kept_together(db, survey, people, day):
    found = by_place(db, survey)
    asked = found["D2"].reading.id
    service.ask(db, survey.id, asked, "Which bank?", 0, SignedIn(people["office"]))
    found = by_place(db, survey)
    alone = {place: bulk.why_alone(one, people["office"].id) for place, one in found.items()}
    assert alone["D2"] == "a question about it is open"
    assert "it does not lie between two passing meter checks" in alone["D6"]
    assert "a repeat differs" in alone["D3r"]
    assert bulk.why_alone(found["D1"], people["crew"].id) == "you took it yourself"
    mild = [place for place, why in alone.items() if not why]
    counts = {one.reading.id: one.reading.decisions for one in found.values()}
    office = SignedIn(people["office"])
    kept, left_out = bulk.keep_many(db, survey, counts, WHY, office)
    assert kept == len(mild) and kept + len(left_out) == 6 and all(one.why for one in left_out)
    assert {place for place, one in by_place(db, survey).items() if one.reading.review == "kept"} == set(mild)
    assert bulk.keep_many(db, survey, counts, WHY, office)[0] == kept, "sent twice, kept once"
    assert db.query(ReadingEvent).filter_by(kind="kept").count() == kept
    assert db.query(History).filter_by(what="readings kept").one().particulars == {"readings": kept, "reason": WHY}


def test_ticked_readings_are_kept_on_the_page_which_says_what_was_left_out(browser_as, db, survey, people, day):
    office, address = browser_as("office"), f"/surveys/{survey.id}/review"
    found = by_place(db, survey)
    mild = [place for place, one in found.items() if not bulk.why_alone(one, people["office"].id)]
    assert "Tick the readings" in office.post(address, {"why_kept": WHY}).text
    ticks = [f"{found[place].reading.id}.0" for place in (mild[0], "D3r")]
    refused = office.post(address, {"ticked": ticks, "why_kept": ""}).text
    assert "Enter the reason" in refused and f'value="{ticks[0]}" checked' in refused
    text = plain(office.post(address, {"ticked": [*ticks, "x", "no-such.0", ".", "\u00b2.\u00b2"], "why_kept": WHY}))
    assert "1 reading was kept. 1 was left out:" in text and "a repeat differs by more than usual" in text
    db.rollback()
    service.ask(db, survey.id, found[mild[1]].reading.id, "Which bank?", 0, SignedIn(people["lead"]))
    stale = plain(office.post(address, {"ticked": [f"{found[mild[1]].reading.id}.0"], "why_kept": WHY}))
    assert "somebody decided about it since you opened the page" in stale
    answer = office.post(address, {"all_that_fit": "yes", "why_kept": WHY})
    assert answer.status_code == 303
    rest = plain(office.get(answer.headers["Location"]))
    assert re.search(rf"{len(mild) - 2} readings? (was|were) kept\.", rest), rest
    assert browser_as("crew").post(address, {"ticked": ticks, "why_kept": WHY}).status_code == 403


def test_table_shows_and_filters_quality_checks_and_review(browser_as, db, survey, people, day):
    service.keep(db, survey.id, by_place(db, survey)["D3r"].reading.id, WHY, 0, SignedIn(people["office"]))
    put_check(db, survey, people, day, 20, 8.25, "as_found")
    office, address = browser_as("office"), f"/surveys/{survey.id}/readings"

    def codes(query):
        return re.findall(r"<strong>([UD]\d)</strong>", office.get(f"{address}?{query}").text)

    text = plain(office.get(address))
    assert "between two passing checks" in text and "looked at" in text and "good" in text
    assert codes("quality=good") == ["D3"] and codes("review=kept") == ["D3"]
    assert codes("checks=not_bracketed") == []
    assert len(codes("checks=bracketed")) == 6 and len(codes("meter=Meter+A")) == 6


def test_approved_survey_takes_no_decision_and_each_page_says_why(browser_as, db, survey, people, day):
    one = by_place(db, survey)["D1"].reading
    db.add(SurveyEvent(survey_id=survey.id, kind="approved", version="v1", reason="done", made_by_id=people["lead"].id))
    db.commit()
    office, base = browser_as("office"), f"/surveys/{survey.id}"
    kept = office.post(f"{base}/readings/{one.id}/keep", {"based_on": "0", "why_kept": WHY})
    asked = office.post(f"{base}/readings/{one.id}/ask?list=on", {"based_on": "0", "question": "Which bank?"})
    bulk_kept = office.post(f"{base}/review", {"ticked": f"{one.id}.0", "why_kept": WHY})
    for answer in (kept, asked, bulk_kept):
        assert answer.status_code == 409 and "approved" in plain(answer)
    assert db.query(ReadingEvent).count() == 0
