"""Drift between two checks of a meter: graded, offered with its numbers before it is applied, and taken back."""

import re
import uuid

import pytest

from tests.webapp.metered import ZERO, judged, put_check, put_day
from webapp.errors import Conflict, NotAllowed
from webapp.models import History, MeterCheckEvent, Reading, ReadingEvent
from webapp.people.access import SignedIn
from webapp.readings.layers import final
from webapp.review import drifting, service
from webapp.review.forms import Correction, DriftChoice

WHY = "the end check shows it"


def offers(db, survey):
    db.rollback()
    db.expire_all()
    return drifting.offers_of(db, survey)


def choice(pair, batch=None, reason=WHY):
    return DriftChoice(*pair.check_ids, pair.seen, batch or str(uuid.uuid4()), reason)


def apply(db, survey, people, role="office", **more):
    (pair,), _ = offers(db, survey)
    return drifting.apply_drift(db, survey, choice(pair, **more), SignedIn(people[role]))


def values(db, survey):
    return [one.reading.do_mg_l for one in judged(db, survey).values()]


def test_appendix_a6_end_check_046_low_after_8_h_is_good_and_offers_a_ratio_that_grows_to_1_059(db, survey, people):
    put_day(db, survey, people, end=7.80, zero=0.05)
    (pair,), gone = offers(db, survey)
    assert pair.end.expected == pytest.approx(8.26, abs=0.005)
    assert (pair.grade, pair.state, pair.correction.method, gone) == ("good", "offered", "ratio", [])
    assert [line.scale for line in pair.lines] == pytest.approx(
        [1 + 0.0593 * part / 4 for part in (1, 2, 3, 4)], abs=2e-4
    )
    assert pair.lines[-1].scale == pytest.approx(1.059, abs=6e-4)
    assert [line.shift for line in pair.lines] == [0, 0, 0, 0]
    assert values(db, survey) == [5.0] * 4, "shown before it is applied"
    assert apply(db, survey, people) == 4
    assert values(db, survey) == pytest.approx([line.after_mg_l for line in pair.lines])
    assert {one.do_mg_l for one in db.query(Reading)} == {5.0}, "raw is kept"


def test_appendix_a6_error_of_2_3_is_not_reportable_and_no_correction_is_offered(db, survey, people):
    put_day(db, survey, people, end=8.26 - 2.3)
    (pair,), _ = offers(db, survey)
    assert (pair.grade, pair.state, pair.correction) == ("do not report", "not_reportable", None)
    with pytest.raises(Conflict, match="nothing left to correct"):
        apply(db, survey, people)
    assert {one.quality for one in judged(db, survey).values()} == {"bad"}


def test_zero_that_moved_too_gives_a_line_through_both_checks(db, survey, people):
    put_day(db, survey, people, end=7.80, zero=0.35)
    (pair,), _ = offers(db, survey)
    assert pair.correction.method == "two_point"
    last = pair.lines[-1]
    assert last.scale * 7.80 + last.shift == pytest.approx(pair.end.expected)
    assert last.scale * 0.35 + last.shift == pytest.approx(0, abs=1e-9)


def test_zero_check_after_an_adjustment_says_nothing_about_the_meter_before_it(db, survey, people):
    meter = put_day(db, survey, people, zero=None)
    put_check(db, survey, people, meter, 8.1, 8.26, "adjusted")
    put_check(db, survey, people, meter, 8.2, 0.35, **ZERO)
    (pair,), _ = offers(db, survey)
    assert pair.zero is None and pair.correction.method == "ratio"


def test_each_reading_keeps_what_the_correction_rests_on_and_history_has_one_line(db, survey, people):
    put_day(db, survey, people)
    batch = str(uuid.uuid4())
    apply(db, survey, people, batch=batch)
    events = db.query(ReadingEvent).all()
    (pair,), _ = offers(db, survey)
    assert len(events) == 4 and {one.kind for one in events} == {"drift"}
    for event in events:
        kept = event.particulars
        assert (kept["start_check"], kept["end_check"]) == pair.check_ids
        assert (kept["method"], kept["grade"], kept["batch"], event.reason) == ("ratio", "good", batch, WHY)
        assert kept["error"] == pytest.approx(-0.463, abs=5e-4)
        assert kept["end_h"] - kept["start_h"] == pytest.approx(8)
    line = db.query(History).filter_by(what="drift corrected").one()
    assert (line.particulars["readings"], line.particulars["meter"]) == (4, "Meter A")
    assert pair.state == "applied"
    assert all("drift_corrected" in one.reasons for one in judged(db, survey).values())


def test_drift_is_found_no_more_where_it_was_corrected(db, survey, people):
    put_day(db, survey, people)
    found = [{finding.name for finding in one.findings} for one in judged(db, survey).values()]
    assert all("drift_uncorrected" in names for names in found)
    apply(db, survey, people)
    db.commit()
    for one in judged(db, survey).values():
        assert "drift_uncorrected" not in {finding.name for finding in one.findings}
        assert "drift_corrected" in one.reasons


def test_same_form_sent_twice_is_one_correction(db, survey, people):
    put_day(db, survey, people)
    (pair,), _ = offers(db, survey)
    same = choice(pair)
    assert [drifting.apply_drift(db, survey, same, SignedIn(people["office"])) for _ in range(2)] == [4, 4]
    back = choice(pair)
    db.rollback(), db.expire_all()
    assert [drifting.undo_drift(db, survey, back, SignedIn(people["office"])) for _ in range(2)] == [4, 4]
    assert db.query(ReadingEvent).count() == 8
    assert values(db, survey) == [5.0] * 4


def test_correction_seen_before_something_changed_is_not_applied(db, survey, people):
    put_day(db, survey, people)
    (pair,), _ = offers(db, survey)
    reading = pair.lines[0].reading
    service.correct(db, survey.id, reading.id, Correction("do_mg_l", 5.4, "slip"), 0, SignedIn(people["office"]))
    db.rollback(), db.expire_all()
    with pytest.raises(Conflict, match="changed since you opened this page"):
        drifting.apply_drift(db, survey, choice(pair), SignedIn(people["office"]))


def test_who_took_the_readings_does_not_correct_them_for_drift(db, survey, people):
    put_day(db, survey, people, by="lead")
    with pytest.raises(NotAllowed, match="somebody else must correct them"):
        apply(db, survey, people, "lead")
    with pytest.raises(NotAllowed, match="by the lead or the office"):
        apply(db, survey, people, "crew")
    assert apply(db, survey, people, "office") == 4
    (pair,), _ = offers(db, survey)
    with pytest.raises(NotAllowed, match="somebody else must correct them"):
        drifting.undo_drift(db, survey, choice(pair), SignedIn(people["lead"]))


def test_number_corrected_afterwards_is_still_moved_along_the_line(db, survey, people):
    put_day(db, survey, people)
    apply(db, survey, people)
    reading = judged(db, survey)["D4"].reading
    service.correct(db, survey.id, reading.id, Correction("do_mg_l", 4.0, "slip"), 1, SignedIn(people["office"]))
    now = final(db.get(Reading, reading.id))
    assert now.do_mg_l == pytest.approx(4.0 * 1.0593, abs=1e-3)
    assert (now.before_drift_mg_l, now.raw["do_mg_l"], now.corrections[0].old_value) == (4.0, 5.0, 5.0)


def test_check_set_aside_afterwards_leaves_a_correction_that_no_longer_holds(db, survey, people):
    put_day(db, survey, people)
    apply(db, survey, people)
    (pair,), _ = offers(db, survey)
    kind = {"kind": "set_aside", "reason": "the bottle was not shaken", "made_by_id": people["office"].id}
    db.add(MeterCheckEvent(check_id=pair.end.check.id, **kind))
    db.commit()
    pairs, (gone,) = offers(db, survey)
    assert pairs == [] and len(gone.readings) == 4
    assert drifting.undo_drift(db, survey, choice(pair), SignedIn(people["office"])) == 4
    assert offers(db, survey) == ([], []) and values(db, survey) == [5.0] * 4


def test_zero_check_that_comes_later_changes_the_line_and_offers_it_anew(db, survey, people):
    meter = put_day(db, survey, people, zero=None)
    apply(db, survey, people)
    put_check(db, survey, people, meter, 8.1, 0.35, **ZERO)
    (pair,), _ = offers(db, survey)
    assert pair.state == "changed" and len(pair.open_lines) == 4
    assert apply(db, survey, people) == 4
    (pair,), _ = offers(db, survey)
    assert pair.state == "applied" and values(db, survey) == pytest.approx([line.after_mg_l for line in pair.lines])


@pytest.fixture
def page(app, db, survey, people, browser_as):
    """A function that opens the page of the day's drift as somebody, and one that posts what it offers."""
    put_day(db, survey, people)
    address = f"/surveys/{survey.id}/review/drift"

    def get(role):
        return browser_as(role).get(address)

    def post(role, end="", **change):
        browser = browser_as(role)
        shown = dict(re.findall(r'name="(start_check|end_check|seen)" value="([^"]*)"', browser.get(address).text))
        form = {"submission_id": str(uuid.uuid4()), **shown, "reason": WHY, **change}
        return browser.post(address + end, form)

    return get, post


def test_page_shows_every_number_before_anything_is_applied(page, db):
    get, _ = page
    text = " ".join(re.sub(r"<[^>]+>", " ", get("office").text).split())
    assert "Expected 8.26 mg/L Read 7.80 mg/L Error −0.46 mg/L (−5.6 %)" in text
    assert "Grade good" in text and "×1.059 at the check after" in text
    assert "D4 Wed 12 Aug 15:00 5.00 ×1.059 5.30 5.00" in text
    assert "Apply to 4 readings" in text
    assert "Apply to" not in get("crew").text
    assert db.query(ReadingEvent).count() == 0


def test_correction_is_applied_and_taken_back_on_the_page(page, db, survey, browser_as):
    get, post = page
    address = f"/surveys/{survey.id}/review"
    assert "Drift of the meters: 1 to decide" in browser_as("office").get(address).text
    assert post("office").status_code == 303
    assert "to decide" not in browser_as("office").get(address).text
    assert "Applied." in get("office").text
    assert values(db, survey)[-1] == pytest.approx(5.30, abs=0.005)
    assert post("office", "/undo").status_code == 303
    assert values(db, survey) == [5.0] * 4


def test_bad_form_for_drift_is_refused_and_stores_nothing(page, db):
    _, post = page
    assert "Enter the reason" in post("office", reason="").text
    assert post("office", submission_id="x").status_code == 422
    assert post("office", seen="another").status_code == 409
    assert "do not ask for a correction" in post("office", end_check="no-such").text
    assert post("office", "/undo").status_code == 409
    assert post("crew").status_code == 403
    assert db.query(ReadingEvent).count() == 0
