"""Marking a survey as reviewed, approving it and opening it again: who may, what is kept, what makes it a draft."""

import hashlib
import uuid
from types import SimpleNamespace

import pytest

from tests.webapp.sheets import correct, put_readings
from webapp.approval import queries, service
from webapp.approval.forms import Asked, parse_step
from webapp.dataset.service import dataset_of, zip_of
from webapp.errors import Conflict, NotAllowed, NotFound
from webapp.models import SurveyEvent
from webapp.people.access import SignedIn
from webapp.surveys.service import add_member, remove_member


@pytest.fixture
def read(db, survey, people):
    """The readings of the survey, the crew's; their ids by station code."""
    return put_readings(db, survey, people)


def step(db, survey, reason="", seen=None, event_id=None):
    db.rollback()
    return Asked(event_id or str(uuid.uuid4()), queries.mark_of(db, survey.id) if seen is None else seen, reason)


def reviewed(db, survey, people, by="lead"):
    return service.mark_reviewed(db, survey, step(db, survey, "all of it"), SignedIn(people[by]))


def approved(db, survey, people, by="office"):
    return service.approve(db, survey, step(db, survey, "for the permit"), SignedIn(people[by]))


def state(db, survey):
    db.rollback()
    return queries.state_of(db, survey.id)


def test_a_survey_goes_from_draft_over_reviewed_to_approved_and_back(db, survey, people, read, browser_as):
    assert state(db, survey).kind == "draft"
    version = dataset_of(db, survey).version
    event = reviewed(db, survey, people)
    assert (state(db, survey).kind, event.version, event.reason) == ("reviewed", version, "all of it")
    asked = step(db, survey, "for the permit")
    event, again = (service.approve(db, survey, asked, SignedIn(people["office"])) for _ in range(2))
    assert event is again  # sent twice, it is one
    assert state(db, survey).kind == "approved"
    kept = queries.get_frozen(db, survey.id, event.id)
    again = dataset_of(db, survey)  # the same version exported twice is the same bytes
    assert (again.file_name, zip_of(again)) == (kept.file_name, kept.content)
    assert kept.sha256 == hashlib.sha256(kept.content).hexdigest()
    service.reopen(db, survey, step(db, survey, "a bottle came late"), SignedIn(people["office"]))
    assert state(db, survey).kind == "draft"
    correct(db, survey, people, read["D3"], 4.4)
    answer = browser_as("office").get(f"/surveys/{survey.id}/approval/{event.id}/dataset.zip")
    assert answer.data == kept.content
    assert kept.file_name in answer.headers["Content-Disposition"]
    assert browser_as("lead").get(f"/surveys/{survey.id}/approval/{event.id}/dataset.zip").status_code == 403
    assert [event.kind for event, _ in queries.events_of(db, survey.id)] == ["reopened", "approved", "reviewed"]


def test_any_change_to_a_reviewed_survey_makes_it_a_draft(db, survey, people, read):
    reviewed(db, survey, people)
    correct(db, survey, people, read["D3"], 4.4)
    now = state(db, survey)
    assert (now.kind, now.changed_what) == ("draft", "reading corrected")
    with pytest.raises(Conflict, match="mark it as reviewed first"):
        approved(db, survey, people)


def test_who_is_on_a_survey_is_no_change_of_it(db, survey, people, read):
    event = reviewed(db, survey, people)
    with pytest.raises(NotFound, match="No dataset is kept here"):
        queries.get_frozen(db, survey.id, event.id)
    with pytest.raises(Conflict, match="of another survey"):
        service.mark_reviewed(db, SimpleNamespace(id="another"), Asked(event.id, "", ""), SignedIn(people["lead"]))
    remove_member(db, survey.id, people["crew"].id, people["office"].id)
    assert state(db, survey).kind == "reviewed"
    approved(db, survey, people)
    add_member(db, survey.id, people["crew"].id, people["office"].id)
    assert state(db, survey).kind == "approved"


def test_pages_that_would_change_an_approved_survey_say_so_before_anything_is_typed(
    db, survey, people, read, browser_as
):
    office, says = browser_as("office"), "Nothing of it changes until the office opens it again."
    pages = [f"/surveys/{survey.id}/{path}" for path in ("settings", "review", f"readings/{read['D3']}")]
    assert not any(says in office.get(page).text for page in pages)
    reviewed(db, survey, people)
    approved(db, survey, people)
    db.commit()
    assert all(says in office.get(page).text for page in pages)


def test_whoever_marked_it_as_reviewed_does_not_approve_it(db, survey, people, read):
    reviewed(db, survey, people, by="office")
    with pytest.raises(NotAllowed, match="You marked it as reviewed"):
        approved(db, survey, people)


def standing(authors=(), asked=0):
    return SimpleNamespace(readings=4, authors=frozenset(authors), asked=asked)


def test_the_author_of_a_reading_does_not_approve_it(people):
    marked = queries.State("reviewed", SurveyEvent(made_by_id=people["lead"].id))
    office, crew = people["office"], people["crew"]
    assert service.why_not_approve(marked, standing([crew.id]), office) == ""
    assert "You recorded readings" in service.why_not_approve(marked, standing([office.id, crew.id]), office)
    assert "You marked it as reviewed" in service.why_not_approve(marked, standing(), people["lead"])


def test_an_open_question_holds_back_review_and_approval(people):
    marked, draft = queries.State("reviewed", SurveyEvent(made_by_id="another")), queries.State("draft", None)
    assert "Questions to the crew are open" in service.why_not_approve(marked, standing(asked=1), people["office"])
    assert "Questions to the crew are open" in service.why_not_review(draft, standing(asked=1))
    assert service.why_not_review(draft, standing()) == ""


def test_what_changed_since_the_page_was_opened_is_looked_at_first(db, survey, people, read):
    asked = step(db, survey)
    correct(db, survey, people, read["D3"], 4.4)
    with pytest.raises(Conflict, match="changed since this page was opened"):
        service.mark_reviewed(db, survey, asked, SignedIn(people["lead"]))
    reviewed(db, survey, people)
    asked = step(db, survey)
    correct(db, survey, people, read["D3"], 4.5, based_on=1)
    reviewed(db, survey, people)
    with pytest.raises(Conflict, match="changed since this page was opened"):
        service.approve(db, survey, asked, SignedIn(people["office"]))


def test_what_stands_against_it_is_told(db, survey, people, read):
    told = service.standing_of(db, survey)
    assert (told.readings, told.not_looked, told.asked) == (4, 4, 0)
    assert told.missing
    assert set(told.missing).isdisjoint(read)
    assert not told.clear
    assert ("D4", "oxygen was lowest here") in [(one.code, one.why) for one in told.critical]
    assert told.complete.complete is False


def test_the_reason_to_open_again_is_needed_and_a_form_without_its_id_is_refused():
    good = {"submission_id": str(uuid.uuid4()), "seen": "1-"}
    assert parse_step(good)[0].reason == ""
    assert set(parse_step(good, reason_needed=True)[1]) == {"reason"}
    assert set(parse_step({"reason": "x"})[1]) == {"submission_id"}


def test_the_pages_take_a_survey_through_its_steps(db, survey, people, read, browser_as):
    address = f"/surveys/{survey.id}/approval"
    lead, office, crew = browser_as("lead"), browser_as("office"), browser_as("crew")
    page = lead.get(address).text
    assert office.get("/surveys/nowhere/approval").status_code == 404
    assert "4 of 4 readings were not looked at" in page
    assert "Mark as reviewed" in page
    assert lead.post(f"{address}/review", form_of(db, survey, "looked")).status_code == 303
    assert crew.post(f"{address}/review", form_of(db, survey)).status_code == 403
    assert lead.post(f"{address}/approve", form_of(db, survey)).status_code == 403
    assert "<button>Approve</button>" in office.get(address).text
    silent = office.post(f"{address}/approve", form_of(db, survey))  # with four readings that nobody looked at
    assert (silent.status_code, 'id="reason-error"' in silent.text) == (422, True)
    assert office.post(f"{address}/approve", form_of(db, survey, "for the permit")).status_code == 303
    assert "Approved</strong> by Olive Reed" in crew.get(f"/surveys/{survey.id}/readings").text
    page = office.get(address).text
    assert "Download what was approved" in page
    assert "by Olive Reed" in page
    assert "Download what was approved" not in crew.get(address).text
    refused = office.post(f"{address}/reopen", form_of(db, survey))
    assert refused.status_code == 422
    assert 'id="reason-error"' in refused.text
    assert office.post(f"{address}/reopen", form_of(db, survey, "late bottle")).status_code == 303
    stale = office.post(f"{address}/reopen", form_of(db, survey, "late bottle") | {"seen": "old"})
    assert stale.status_code == 409
    assert db.query(SurveyEvent).count() == 3


def form_of(db, survey, reason=""):
    asked = step(db, survey, reason)
    return {"submission_id": asked.id, "seen": asked.seen, "reason": reason}


def test_what_was_prepared_before_a_change_is_worked_out_again(db, survey, people, read):
    prepared = service.prepare(db, survey)
    correct(db, survey, people, read["D3"], 4.4)
    event = service.mark_reviewed(db, survey, step(db, survey), SignedIn(people["lead"]), prepared)
    assert event.version != prepared.version


@pytest.mark.parametrize("endpoint", ["approval.review", "approval.approve", "approval.reopen", "settings.change"])
def test_what_takes_long_is_worked_out_before_standing_in_the_writers_line(app, endpoint):
    assert app.view_functions[endpoint].reads_only
