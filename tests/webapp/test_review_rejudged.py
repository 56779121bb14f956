"""A survey judged again after a decision: what is taken over from before is what judging it anew would say."""

from datetime import timedelta

from tests.webapp.metered import START, put_check, put_day
from webapp.models import Reading, Survey
from webapp.people.access import SignedIn
from webapp.readings import judging, queries
from webapp.readings.kept import readings_kept
from webapp.readings.layers import final
from webapp.review import service
from webapp.review.forms import Correction

SAID = ("quality", "reasons", "severity", "findings", "of_itself", "kept", "repeats_id", "visit_no", "author")


def said(judgement):
    return {
        one.reading.id: [getattr(one, name) for name in SAID] + [one.bracket.state, one.reading.do_mg_l]
        for one in judgement.by_id.values()
    }


def both(db, survey):
    """Return what is said with what was found before, and without."""
    db.rollback()
    db.expire_all()
    survey = db.get(Survey, survey.id)
    going_on = said(judging.judgement_of(db, survey))
    judging.forget()
    anew = said(judging.judgement_of(db, survey))
    assert going_on == anew
    return anew


def test_survey_judged_on_after_each_decision_is_as_judged_anew(db, survey, people):
    meter = put_day(db, survey, people, end=8.20)
    office = SignedIn(people["office"])
    row = {"station": "D3", "taken_at": START + timedelta(hours=6.2), "do_mg_l": 9.9, "water_temp_c": 20.0,
           "meter": "Meter A", "replicate": True}  # fmt: skip
    first = both(db, survey)
    service.import_readings(db, survey, [row], people["crew"].id)
    second = both(db, survey)
    ids = {one.station.code: one.id for one in db.query(Reading).filter_by(replicate=False)}
    service.correct(db, survey.id, ids["D2"], Correction("do_mg_l", 7.9, "slip"), 0, office)
    third = both(db, survey)
    service.set_aside(db, survey.id, ids["D3"], "in the air", 0, office)
    fourth = both(db, survey)
    service.keep(db, survey.id, ids["D1"], "fine", 0, office)
    fifth = both(db, survey)
    db.rollback()
    put_check(db, survey, people, meter, 3, 7.7, "field")
    sixth = both(db, survey)
    told = [first, second, third, fourth, fifth, sixth]
    assert all(one != other for one, other in zip(told, told[1:], strict=False)), "each of them changed something"


def test_plain_readings_say_what_the_others_say(db, survey, people):
    put_day(db, survey, people)
    reading_id = db.query(Reading).first().id
    service.set_aside(db, survey.id, reading_id, "in the air", 0, SignedIn(people["office"]))
    plain, others = queries.plain_readings_of(db, survey.id), queries.readings_of(db, survey.id)
    assert [final(one) for one in plain] == [final(one) for one in others]
    for one, other in zip(plain, others, strict=True):
        columns = [name for name in one._fields if name not in ("station", "author", "events")]
        assert [getattr(one, name) for name in columns] == [getattr(other, name) for name in columns]
        assert [event.id for event in one.events] == [event.id for event in other.events]
        assert (one.author.name, one.station.code) == (other.author.name, other.station.code)


def test_readings_loaded_again_are_the_same_objects_but_those_decided_about(db, survey, people):
    put_day(db, survey, people)
    first = queries.plain_readings_of(db, survey.id)
    service.keep(db, survey.id, first[1].id, "fine", 0, SignedIn(people["office"]))
    second = queries.plain_readings_of(db, survey.id, first)
    assert [one is other for one, other in zip(first, second, strict=True)] == [at != 1 for at in range(len(first))]
    assert [event.kind for event in second[1].events] == ["kept"]


def test_a_decision_leaves_what_is_said_of_far_readings_as_it_was(db, survey, people):
    put_day(db, survey, people)
    before = judging.judgement_of(db, survey)
    first, *others = before.by_id
    service.keep(db, survey.id, first, "fine", 0, SignedIn(people["office"]))
    after = judging.judgement_of(db, survey)
    assert after.by_id[first].reading.review == "kept"
    assert any(after.by_id[one] is before.by_id[one] for one in others)


def test_a_reading_that_was_rolled_back_is_not_kept_in_memory(db, survey, people):
    put_day(db, survey, people)
    stored = len(readings_kept(db, survey.id)[0])
    row = db.query(Reading).first()
    same = {
        name: getattr(row, name) for name in ("survey_id", "station_id", "plan_version_id", "author_id", "taken_at")
    }
    db.add(Reading(id="lost", **same))
    db.flush()
    assert len(readings_kept(db, survey.id)[0]) == stored + 1
    db.rollback()
    assert "lost" not in {one.id for one in readings_kept(db, survey.id)[1]}
