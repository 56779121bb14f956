import uuid
from dataclasses import asdict
from datetime import date, timedelta

import pytest

from calc import quality_meter
from calc.settings import Settings
from tests.webapp.meter_day import START, MeterDay, new_check, new_meter
from tests.webapp.plans import put_plan
from webapp.display import Show
from webapp.errors import Conflict, NotAllowed, NotFound
from webapp.meters import closing, queries, service, words
from webapp.meters.asking import asks
from webapp.meters.state import in_order, meter_states, unregistered
from webapp.meters.steps import next_step
from webapp.meters.verdicts import judged_checks
from webapp.models import MeterCheck
from webapp.people.access import SignedIn
from webapp.readings.judging import judgement_of
from webapp.readings.queries import readings_of
from webapp.surveys.queries import history_of

VIENNA = Show(time_zone="Europe/Vienna")
SETTINGS = Settings()


@pytest.fixture
def day(app, survey, people, db):
    put_plan(db, survey, people["lead"])
    db.rollback()
    return MeterDay(app, survey, people)


@pytest.fixture
def judged(day):
    """A function to the survey's checks, judged."""

    def now():
        with day.database.reading() as db:
            return in_order(judged_checks(queries.checks_of(db, day.survey.id), SETTINGS))

    return now


@pytest.fixture
def state(day, judged):
    """A function to the one meter's state so many hours into the day."""

    def at(hours, **more):
        with day.database.reading() as db:
            meters, readings = queries.meters_of(db, day.survey.id), readings_of(db, day.survey.id)
            now = START + timedelta(hours=hours)
            return meter_states(VIENNA, meters, judged(), readings, SETTINGS, now, **more)[0]

    return at


@pytest.fixture
def readings_judged(day):
    """A function to (bracket, quality, reasons, grade) of each reading of the survey."""

    def now():
        with day.database.reading() as db:
            found = judgement_of(db, db.merge(day.survey)).by_id.values()
            return [(one.bracket.state, one.quality, one.reasons, one.grade) for one in found]

    return now


@pytest.fixture
def closings(day):
    """A function to what the close-out list says of the meters so many hours into the day."""

    def at(hours, lowest_mg_l=None):
        with day.database.reading() as db:
            readings, now = readings_of(db, day.survey.id), START + timedelta(hours=hours)
            return closing.closing_of(db, day.survey, VIENNA, SETTINGS, readings, lowest_mg_l, now)

    return at


def says(closings):
    return [(one.done, one.says) for one in closings]


def test_words_cover_what_calc_judges():
    assert set(words.KINDS) == set(words.SHORT_KINDS) == set(words.BUTTONS) == set(quality_meter.KINDS)
    assert set(words.STANDARDS) == set(quality_meter.STANDARDS)
    assert set(words.PARAMETERS) == set(quality_meter.PARAMETERS)


def test_check_keeps_what_was_expected_and_said_with_the_settings_of_the_time(day):
    check = day.check(day.meter(), value=7.8)
    assert check.expected == pytest.approx(8.26, abs=0.005)
    assert (check.judged["settings"], check.judged["passes"]) == (1, False)
    assert "0.46 mg/L low (5.6 %), more than the 0.20 mg/L that passes" in check.judged["says"]


def test_weather_report_is_converted_to_the_elevation_before_it_tells_what_to_expect(day):
    check = day.check(day.meter(), pressure_source="weather")
    assert check.pressure_mmhg == pytest.approx(741, abs=1)
    assert check.expected == pytest.approx(8.05, abs=0.02)


def test_check_without_pressure_goes_by_the_standard_of_the_elevation(day):
    check = day.check(day.meter(), pressure_mmhg=None)
    assert check.pressure_source == "standard"
    assert check.pressure_mmhg == pytest.approx(741, abs=1)


def test_same_check_sent_twice_is_one_and_other_content_is_refused(day, judged):
    new, crew = new_check(day.meter()), day.people["crew"].id
    for _ in range(2):
        with day.database.writing() as db:
            assert service.add_check(db, day.survey, new, crew, START).id == new.id
    assert len(judged()) == 1
    other = new_check(day.meter("Meter B"), value=8.1)
    with day.database.writing() as db, pytest.raises(Conflict, match="stored already, with other values"):
        service.add_check(db, day.survey, type(new)(**{**vars(other), "id": new.id}), crew, START)


def test_check_of_another_surveys_meter_is_refused(day):
    with day.database.writing() as db, pytest.raises(NotFound, match="no such meter"):
        service.add_check(db, day.survey, new_check(new_meter()), day.people["crew"].id, START)


def test_name_that_is_taken_is_refused_however_it_is_written(day):
    day.meter("Meter A")
    with pytest.raises(Conflict, match="There is a meter “METER A” already"):
        day.meter("METER A")


def test_same_meter_form_sent_twice_is_one_meter(day):
    new = new_meter()
    for _ in range(2):
        with day.database.writing() as db:
            service.add_meter(db, day.survey, new, day.people["crew"].id)
    with day.database.reading() as db:
        assert len(queries.meters_of(db, day.survey.id)) == 1


def test_change_of_a_meter_keeps_its_name_and_is_remembered(day):
    meter = day.meter(serial="17-204")
    with day.database.writing() as db:
        service.change_meter(db, day.survey, meter.id, new_meter("Meter Z", serial="17-205"), day.people["lead"].id)
    with day.database.reading() as db:
        changed = queries.get_meter(db, day.survey.id, meter.id)
        assert (changed.name, changed.serial) == ("Meter A", "17-205")
        (line, who) = queries.changes_of(db, day.survey.id, meter.id)[-1]
        assert (line.what, who, line.particulars["serial"]) == ("meter changed", "Linus Ford", ["17-204", "17-205"])


def test_check_is_set_aside_and_used_again_by_its_author_and_remembered(day, judged):
    check = day.check(day.meter())
    crew = SignedIn(day.people["crew"])
    with day.database.writing() as db:
        service.set_aside(db, day.survey.id, check.id, "bubble on the cap", 0, crew)
    assert (judged()[0].set_aside, judged()[0].reason) == (True, "bubble on the cap")
    with day.database.writing() as db:
        service.restore(db, day.survey.id, check.id, "it was not", 1, crew)
    assert not judged()[0].set_aside
    with day.database.reading() as db:
        assert [one.what for one in history_of(db, day.survey.id)][-2:] == [
            "meter check set aside",
            "meter check used again",
        ]


def test_crew_decides_about_no_check_of_others_and_lead_about_any(day):
    check = day.check(day.meter(), by="office")
    with day.database.writing() as db, pytest.raises(NotAllowed, match="your own checks"):
        service.set_aside(db, day.survey.id, check.id, "no", 0, SignedIn(day.people["crew"]))
    with day.database.writing() as db:
        service.set_aside(db, day.survey.id, check.id, "no", 0, SignedIn(day.people["lead"]))


def test_decision_on_a_check_that_moved_on_is_refused_and_the_same_twice_is_one(day):
    check, crew = day.check(day.meter()), SignedIn(day.people["crew"])
    for _ in range(2):
        with day.database.writing() as db:
            assert len(service.set_aside(db, day.survey.id, check.id, "bubble", 0, crew).events) == 1
    with day.database.writing() as db, pytest.raises(Conflict, match="Somebody decided about this check"):
        service.set_aside(db, day.survey.id, check.id, "another reason", 0, crew)
    with day.database.writing() as db, pytest.raises(Conflict, match="set aside already"):
        service.set_aside(db, day.survey.id, check.id, "another reason", 1, crew)


def ask(day, judged, meter, *args, **more):
    """What is asked about a check with the pressure that is standard here, where nothing else is said."""
    new = new_check(meter, *args, **{"pressure_mmhg": 741.0, **more})
    return [one.name for one in asks(day.survey, VIENNA, SETTINGS, new, judged, new.checked_at)]


def test_adjusting_without_a_check_as_found_is_asked_about(day, judged):
    meter = day.meter()
    assert ask(day, judged(), meter, kind="adjusted") == ["as_found_missing"]
    day.check(meter, -24)
    day.check(meter, -0.1, "zero", 0.1, standard="zero_solution")
    assert ask(day, judged(), meter, kind="adjusted") == ["as_found_missing"]
    day.check(meter, -0.1)
    assert ask(day, judged(), meter, kind="adjusted") == []


def test_check_as_found_before_midnight_counts_for_adjusting_after_it(day, judged):
    meter = day.meter()
    day.check(meter, 18.3)
    assert ask(day, judged(), meter, 18.7, kind="adjusted") == []


def test_end_check_after_adjusting_is_asked_about(day, judged):
    meter = day.meter()
    day.check(meter)
    day.check(meter, 10, "after_cleaning")
    assert ask(day, judged(), meter, 10.1, "end_of_day") == ["end_check_late"]


def test_barometer_trap_and_unit_slips_are_asked_about(day, judged):
    meter = day.meter()
    typed = {"entered": {"pressure": {"text": "29.5", "unit": "mm[Hg]"}}}
    assert ask(day, judged(), meter, pressure_mmhg=29.5, **typed) == ["pressure_unit"]
    assert ask(day, judged(), meter, pressure_mmhg=762.0) == ["sea_level_pressure"]
    assert ask(day, judged(), meter, pressure_mmhg=762.0, pressure_source="weather") == []
    assert ask(day, judged(), meter, pressure_mmhg=710.0) == ["pressure_against_elevation"]


def test_expired_standard_is_asked_about_from_the_day_after(day, judged):
    meter, today = day.meter(), date(2026, 8, 12)
    zero = {"kind": "zero", "standard": "zero_solution", "value": 0.1}
    assert ask(day, judged(), meter, **zero, expires_on=today.isoformat()) == []
    assert ask(day, judged(), meter, **zero, expires_on="2026-08-11") == ["standard_expired"]


def test_what_waited_on_a_phone_for_hours_is_not_asked_about(day):
    new = new_check(day.meter(), kind="adjusted")
    late = new.checked_at + timedelta(hours=5)
    assert asks(day.survey, VIENNA, SETTINGS, new, [], late, saved_at=new.checked_at) == []


def test_meter_goes_through_the_trades_order(day, state):
    meter = day.meter()
    day.check(meter, -24, "zero", 0.1, standard="zero_solution")
    assert (state(0).says, state(0).next_kind) == ("No check yet today: check it as found first.", "as_found")
    day.check(meter, 0, value=7.8)
    assert (state(0.1).says, state(0.1).next_kind) == (
        "Not ready: as found 0.46 mg/L low at 05:30. Adjust it, then read it back.",
        "adjusted",
    )
    day.check(meter, 0.1, "adjusted")
    assert (state(0.1).says, state(0.1).next_kind) == ("Adjusted at 05:36: read it back.", "read_back")
    day.check(meter, 0.1, "read_back", 8.31)
    assert (state(0.1).ready, state(0.1).says) == (True, "Ready: read back 0.05 mg/L high at 05:36.")
    assert state(0.1).next_kind == "field"
    day.check(meter, 8, "end_of_day", 8.2)
    assert state(8).says == "Closed: end check 0.06 mg/L low at 13:30, grade excellent."
    assert state(8).next_kind == "after_cleaning"


def test_zero_check_is_due_before_low_water_and_comes_after_the_read_back(day, state):
    meter = day.meter()
    day.check(meter, -72, "zero", 0.1, standard="zero_solution")
    day.check(meter, 0, "read_back")
    assert state(0.1, lowest_mg_l=4.0).due == ()
    (due,) = state(0.1, lowest_mg_l=1.2).due
    assert due.says == "A zero check is due: there last was one 3 days ago. This survey expects 1.2 mg/L."
    assert state(0.1, lowest_mg_l=1.2).next_kind == "zero"


@pytest.mark.parametrize(
    ("hours", "reading", "reason"),
    [
        (4.5, {}, "4.5 h have passed"),
        (1.0, {"water_temp_c": 14.0}, "the water is 11.0 °C colder"),
        (1.0, {"pressure_mmhg": 748.0, "pressure_source": "meter"}, "the pressure differs by 12 mmHg"),
    ],
)
def test_recheck_is_due_when_conditions_moved(day, state, hours, reading, reason):
    meter = day.meter()
    day.check(meter, -1, "zero", 0.1, standard="zero_solution")
    day.check(meter)
    assert state(0.9).due == ()
    day.reading("D1", 0.9, **reading)
    assert reason in state(hours).due[0].says


def test_new_cap_asks_for_a_recheck(day, state):
    meter = day.meter(cap_changed_on="2026-08-13")
    day.check(meter)
    assert any("something was changed" in one.says for one in state(1).due)


def test_morning_after_a_day_without_end_check_says_so(day, state):
    meter = day.meter()
    day.check(meter)
    day.reading("D1", 2)
    day.reading("D2", 4)
    assert state(25).says == "End check missing since Wed 12 Aug 05:30: check it as found, before anything else."
    assert state(25).lines == ("2 readings wait for a check after: questionable until then.",)


def test_meter_out_of_service_is_asked_nothing(day, state):
    day.meter(out_of_service=True)
    assert (state(0).ready, state(0).says, state(0).due) == (None, "Out of service.", ())


def test_two_rows_of_one_name_are_one_meter(day, judged):
    first = day.meter()
    with day.database.writing() as db:
        db.add(type(first)(id=str(uuid.uuid4()), survey_id=day.survey.id, name="meter a"))
        db.commit()
    day.check(first)
    with day.database.reading() as db:
        states = meter_states(VIENNA, queries.meters_of(db, day.survey.id), judged(), [], SETTINGS, START)
    assert [one.ready for one in states] == [True]


def test_meter_that_readings_name_but_nobody_registered_is_told(day):
    day.meter("Meter A")
    day.reading("D1", 1, meter="meter a")
    day.reading("D1", 2, meter="Meter B")
    with day.database.reading() as db:
        assert unregistered(queries.meters_of(db, day.survey.id), queries.names_read_with(db, day.survey.id)) == [
            "Meter B"
        ]


def test_day_without_end_check_leaves_every_reading_questionable_and_says_so(day, closings, readings_judged):
    meter = day.meter()
    day.check(meter, -1, "zero", 0.1, standard="zero_solution")
    day.check(meter, 0.1, "read_back", 8.2)
    for hours, code in enumerate(("D1", "D2", "D3"), 1):
        day.reading(code, hours)
    (line,) = closings(3.5)
    assert (line.done, line.meter, line.kind) == (False, meter.id, "end_of_day")
    assert line.says == "Meter A has no end check since 05:36: all its readings today count as questionable."
    judged = readings_judged()
    assert [(state, quality) for state, quality, _, _ in judged] == [("no_check_after", "questionable")] * 3
    assert all("not_bracketed" in reasons for _, _, reasons, _ in judged)
    day.check(meter, 4, "end_of_day", 8.1)
    assert all(state == "bracketed" and "not_bracketed" not in reasons for state, _, reasons, _ in readings_judged())


def test_field_check_closes_the_readings_before_it(day, closings):
    meter = day.meter()
    day.check(meter, -1, "zero", 0.1, standard="zero_solution")
    day.check(meter)
    day.reading("D1", 1)
    day.check(meter, 2, "field")
    day.reading("D2", 3)
    assert says(closings(3.5)) == [
        (False, "Meter A has no end check since 07:30: its reading since then counts as questionable.")
    ]


def test_end_check_that_passes_closes_the_day(day, closings):
    meter = day.meter()
    day.check(meter)
    day.reading("D1", 1)
    day.check(meter, 8, "end_of_day", 8.1)
    assert says(closings(8))[0] == (
        True,
        "Meter A was checked after its last reading, at 13:30: 0.16 mg/L low, so the readings before it are closed.",
    )


def test_meter_adjusted_before_its_end_check_closes_nothing(day, closings):
    meter = day.meter()
    day.check(meter)
    day.reading("D1", 1)
    day.check(meter, 8, "after_cleaning")
    assert says(closings(8))[0] == (
        False,
        "Meter A was cleaned at 13:30 before it was checked: all its readings today count as questionable.",
    )


def test_meter_never_checked_is_named_even_if_it_is_not_registered(day, closings):
    day.reading("D1", 1, meter="Meter B")
    (line,) = closings(2)
    assert (line.done, line.meter) == (False, "")
    assert line.says == "Meter B was never checked: all its readings today count as questionable."


def test_checks_that_are_due_stand_in_the_close_out_list(day, closings):
    meter = day.meter()
    day.check(meter)
    day.reading("D1", 1)
    due = [(one.kind, one.says) for one in closings(5.5, lowest_mg_l=1.2)[1:]]
    assert [kind for kind, _ in due] == ["field", "zero"]
    assert due[0][1].startswith("Meter A: Since the last meter check 5.5 h have passed.")


def test_end_check_0_46_low_after_eight_hours_is_good_and_asks_for_zero_and_a_correction(
    day, judged, closings, readings_judged
):
    meter = day.meter()
    day.check(meter)
    day.reading("D1", 1)
    day.check(meter, 8, "end_of_day", 7.8)
    end = judged()[-1]
    assert (end.verdict.grade, end.verdict.correctable, end.verdict.reportable) == ("good", True, True)
    assert next_step(VIENNA, end).kind == "zero"
    ((state, _, reasons, grade),) = readings_judged()
    assert (state, grade, "drift_uncorrected" in reasons) == ("drift", "good", True)
    assert closings(8)[0].says == (
        "Meter A was checked after its last reading, at 13:30: 0.46 mg/L low, grade good, so the readings before it "
        "ask for a correction."
    )


def test_end_check_2_3_low_is_not_to_be_reported(day, judged, closings, readings_judged):
    meter = day.meter()
    day.check(meter)
    day.reading("D1", 1)
    day.check(meter, 8, "end_of_day", 5.96)
    end = judged()[-1]
    assert (end.verdict.grade, end.verdict.reportable) == ("do not report", False)
    assert words.verdict_word(end.verdict) == "Does not pass: do not report"
    assert "too far off" in next_step(VIENNA, end).says
    ((state, quality, reasons, _),) = readings_judged()
    assert (state, quality, "not_reportable" in reasons) == ("not_reportable", "bad", True)
    assert "too far off for the readings before it to be reported" in closings(8)[0].says


@pytest.mark.parametrize(
    ("more", "kind", "begins"),
    [
        ({"value": 8.2}, "", "It reads right as it is"),
        ({"value": 7.8}, "adjusted", "Adjust it to 8.26 mg/L, then read it back."),
        ({"kind": "adjusted"}, "read_back", "Read it back now"),
        ({"value": 7.8, "action": "adjusted"}, "read_back", "Read it back now"),
        ({"kind": "read_back"}, "", "It is ready for the first station."),
        ({"kind": "read_back", "value": 7.8}, "adjusted", "It does not hold."),
        ({"kind": "field", "value": 8.5}, "", "It is fit to go on."),
        ({"kind": "field", "value": 8.8}, "field", "Wait a minute and check again."),
        ({"kind": "zero", "standard": "zero_solution", "value": 0.1}, "", "Rinse well now"),
        ({"kind": "zero", "standard": "zero_solution", "value": 0.4}, "zero", "Rinse, take fresh solution"),
        ({"kind": "end_of_day"}, "after_cleaning", "The readings before it are closed."),
        ({"kind": "after_cleaning"}, "", "What it was off before cleaning"),
        ({"action": "withdrawn", "value": 2.0}, "", "The meter is out of use."),
        ({"water_temp_c": None}, "as_found", "It can't be judged"),
        (
            {"kind": "end_of_day", "parameter": "temperature", "standard": "reference_thermometer", "value": 25.0,
             "compared": 24.0},
            "end_of_day",
            "Repeat the check.",
        ),
    ],
)  # fmt: skip
def test_next_step_after_a_check(more, kind, begins):
    values = asdict(new_check(new_meter(), **more))
    del values["kept"]
    (judged,) = judged_checks([MeterCheck(**values, events=[])], SETTINGS)
    step = next_step(VIENNA, judged)
    assert step.kind == kind
    assert step.says.startswith(begins)


@pytest.mark.parametrize("kind", ["as_found", "read_back"])
def test_next_step_after_passing_is_the_zero_check_that_is_due(kind):
    values = asdict(new_check(new_meter(), kind=kind))
    del values["kept"]
    (judged,) = judged_checks([MeterCheck(**values, events=[])], SETTINGS)
    step = next_step(VIENNA, judged, zero_due=True)
    assert step.kind == "zero" and "A zero check is due: make it now." in step.says


def test_meters_of_another_survey_come_without_their_checks_and_once(day, judged, db, survey, people):
    day.check(day.meter("Meter A", serial="17-204"))
    day.meter("Meter B")
    other = type(survey)(name="Reed Beck", river="Reed Beck", time_zone="UTC", created_by_id=people["office"].id)
    with day.database.writing() as session:
        session.add(other)
        session.commit()
    there = MeterDay.__new__(MeterDay)
    there.database, there.survey, there.people = day.database, other, people
    there.meter("METER B")
    for count in (1, 0):
        with day.database.writing() as session:
            assert len(service.bring_meters(session, other, survey, people["crew"].id)) == count
    with day.database.reading() as session:
        brought = queries.meters_of(session, other.id)
        assert [(one.name, one.serial) for one in brought] == [("METER B", ""), ("Meter A", "17-204")]
        assert queries.checks_of(session, other.id) == []
