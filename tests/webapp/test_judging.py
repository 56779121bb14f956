import uuid
from datetime import UTC, datetime, timedelta

import pytest

from tests.webapp.plans import put_plan
from webapp.models import Meter, MeterCheck, ReadingEvent, Survey, Visit, VisitEntry, new_id
from webapp.plan.prediction import prediction_of
from webapp.plan.queries import current_plan, stations_of
from webapp.readings.judging import judgement_of
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading

DAY = datetime(2026, 8, 12, 4, tzinfo=UTC)


@pytest.fixture
def day(db, survey, people):
    """A planned survey with one meter, and functions that record on it."""
    return Day(db, db.merge(survey), people)


class Day:
    def __init__(self, db, survey, people):
        self.db, self.survey, self.people = db, survey, people
        put_plan(db, survey, people["lead"])
        self.plan = current_plan(db, survey.id)
        self.meter = Meter(id=new_id(), survey_id=survey.id, name="Meter A")
        db.add(self.meter)
        db.commit()

    def read(self, hour, do_mg_l=6.0, code="D2", **more):
        more = {"water_temp_c": 19.8, "depth_m": 1.0, "meter": "meter a", **more}
        new = NewReading(str(uuid.uuid4()), code, DAY + timedelta(hours=hour), do_mg_l, **more)
        return add_reading(self.db, self.survey, new, self.people["crew"].id, self.plan, new.taken_at).id

    def check(self, hour, kind, value, standard="air_saturated_water", **more):
        more = {"water_temp_c": 25.0, "pressure_mmhg": 760.0, **more}
        check = MeterCheck(id=new_id(), survey_id=self.survey.id, meter_id=self.meter.id, kind=kind, value=value,
                           standard=standard, checked_at=DAY + timedelta(hours=hour),
                           author_id=self.people["crew"].id, **more)  # fmt: skip
        self.db.add(check)
        self.db.commit()
        return check.id

    def decide(self, reading_id, kind, by="office", **more):
        event = ReadingEvent(id=new_id(), reading_id=reading_id, kind=kind, reason="looked at",
                             made_by_id=self.people[by].id, **more)  # fmt: skip
        self.db.add(event)
        self.db.commit()
        self.db.expire_all()

    def visit(self, hour, code="D2", left=None, by="crew", **facts):
        station = stations_of(self.db, self.survey.id)[code]
        visit = Visit(id=new_id(), survey_id=self.survey.id, station_id=station.id, opened_by_id=self.people[by].id)
        facts["arrived_at"] = (DAY + timedelta(hours=hour)).isoformat()
        if left is not None:
            facts["left_at"] = (DAY + timedelta(hours=left)).isoformat()
        self.db.add_all([visit, VisitEntry(id=new_id(), visit_id=visit.id, author_id=visit.opened_by_id, facts=facts)])
        self.db.commit()
        return visit.id

    def judged(self, reading_id):
        return self.judgement().by_id[reading_id]

    def judgement(self):
        return judgement_of(self.db, self.survey)


def test_between_two_passing_checks_nothing_is_said_against_a_reading(day):
    day.check(0, "as_found", 8.22)
    reading = day.read(3)
    day.check(8, "end_of_day", 8.10)
    judged = day.judged(reading)
    assert judged.bracket.state == "bracketed"
    assert judged.reasons == ("pressure_assumed",)
    assert judged.quality == "not_checked"
    assert judged.grade == "excellent"


def test_a_day_without_an_end_check_leaves_every_reading_questionable(day):
    day.check(0, "as_found", 8.22)
    readings = [day.read(3), day.read(4, code="D3", do_mg_l=5.9)]
    found = [day.judged(one) for one in readings]
    assert [one.quality for one in found] == ["questionable", "questionable"]
    assert all("not_bracketed" in one.reasons for one in found)


def test_a_reviewers_word_does_not_make_up_for_a_missing_check(day):
    reading = day.read(3)
    day.decide(reading, "kept")
    assert day.judged(reading).quality == "questionable"
    assert day.judged(reading).severity == 0


def test_drift_is_questionable_until_corrected_and_then_only_told(day):
    day.check(0, "read_back", 8.26)
    reading = day.read(4, 6.0)
    day.check(8, "end_of_day", 7.80)
    assert day.judged(reading).reasons[0] == "drift_uncorrected"
    assert day.judged(reading).grade == "good"
    day.decide(reading, "drift", particulars={"scale": 1.0295, "shift": 0.0})
    judged = day.judged(reading)
    assert judged.reading.do_mg_l == pytest.approx(6.177)
    assert judged.reading.raw["do_mg_l"] == 6.0
    assert judged.reasons == ("drift_corrected", "pressure_assumed")
    assert judged.quality == "not_checked"


def test_beyond_what_is_reported_a_reading_is_bad(day):
    day.check(0, "read_back", 8.26)
    reading = day.read(4)
    day.check(8, "end_of_day", 5.96)
    assert (day.judged(reading).quality, day.judged(reading).grade) == ("bad", "do not report")


def test_a_reviewer_makes_a_bracketed_reading_good_and_its_author_does_not(day):
    day.check(0, "as_found", 8.22)
    reading = day.read(3)
    day.check(8, "end_of_day", 8.10)
    day.decide(reading, "kept")
    assert day.judged(reading).quality == "good"
    day.decide(reading, "corrected", by="crew", field="do_mg_l", old_value=6.0, new_value=6.1)
    assert day.judged(reading).quality == "not_checked"


def test_readings_belong_to_the_visit_they_were_taken_on_also_past_midnight(day):
    first = day.visit(17.9, left=18.3)  # 21:54 to 22:18 UTC, past midnight in Vienna
    second = day.visit(20)
    early, late, loose = day.read(18.2), day.read(20.5), day.read(2)
    assert [day.judged(one).visit_id for one in (early, late, loose)] == [first, second, ""]
    assert [day.judged(one).visit_no for one in (loose, early, late)] == [1, 2, 3]


def test_two_crews_at_one_station_keep_their_own_visits(day):
    by_lead, by_crew = day.visit(3, by="lead"), day.visit(3.01)
    assert day.judged(day.read(3.2)).visit_id == by_crew
    assert by_lead != by_crew


def test_a_section_that_is_not_mixed_speaks_against_each_of_its_points(day):
    points = [day.read(3 + at / 60, do, position=where, conductance_us_cm=400 + 60 * at)
              for at, (where, do) in enumerate((("left", 6.4), ("centre", 6.0), ("right", 5.6)))]  # fmt: skip
    assert day.judged(points[0]).section.mixed is False
    assert all("not_mixed" in day.judged(one).reasons for one in points)


def test_what_is_judged_once_is_kept_until_something_changes(day):
    reading = day.read(3)
    assert day.judgement() is day.judgement()
    before = day.judgement()
    day.check(0, "as_found", 8.22)
    assert day.judgement() is not before
    assert day.judged(reading).check_before.check.value == 8.22


def test_a_section_whose_mean_is_far_from_the_mass_balance_is_not_mixed(day):
    mixed = prediction_of(day.survey, day.plan).mixing.conductance_us_cm
    points = [day.read(3, position=where, conductance_us_cm=0.8 * mixed) for where in ("left", "centre", "right")]
    assert day.judged(points[0]).section.says.startswith("Not mixed: mean conductance is 20 % from the mass balance")
    nearer = [day.read(9, position=where, conductance_us_cm=0.95 * mixed) for where in ("left", "centre", "right")]
    assert day.judged(nearer[0]).section.mixed is True


def test_a_request_that_rolls_back_leaves_what_is_kept_readable(day):
    check = day.check(0, "as_found", 8.22)
    reading = day.read(3)
    kept, survey_id = day.judgement(), day.survey.id
    day.db.rollback()
    day.db.close()
    day.survey = day.db.get(Survey, survey_id)
    assert day.judgement() is kept
    assert kept.by_id[reading].check_before.check.id == check
    assert kept.checks[0].check.meter.name == "Meter A"
