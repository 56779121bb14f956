from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from calc.sag import critical_point
from calc.settings import Settings
from demo_survey import make
from tests.webapp.days import TRUE_RIVER, demo_readings, demo_survey, store, true_reading
from tests.webapp.test_estimate import VERSION, reading
from webapp.display import Show
from webapp.models import Survey
from webapp.plan.prediction import predict_plan
from webapp.plan.queries import current_plan
from webapp.readings.layers import final
from webapp.readings.queries import readings_of
from webapp.sag.codes import code_for
from webapp.sag.decisions import choose_station
from webapp.sag.estimate import estimate_of
from webapp.sag.evidence import visits_of
from webapp.sag.forms import Choice
from webapp.sag.leave import closing_list, may_we_leave
from webapp.sag.moved import against_today, moved_low_point
from webapp.sag.service import sag_of
from webapp.sag.where_next import key_of
from webapp.sag.words import plainly, stretch

SURVEY = Survey(
    id="s", river="Alder Brook", time_zone="UTC", elevation_m=210.0, sampling="same_parcel", distance_rule="downstream",
    unit_system="si", release_at=datetime(2026, 8, 12, 4, tzinfo=UTC),
)  # fmt: skip
SHOW = Show()
# August, with the demo's parcel nine hours on its way: daylight limits nothing that is offered.
NOW = make.RELEASE + timedelta(hours=9)


def leave_of(*readings):
    """The Leave of readings on the plan of the tests."""
    return may_we_leave(SHOW, VERSION, estimate_of(SURVEY, VERSION, Settings(), readings), readings)


def test_nothing_read_is_not_yet():
    assert leave_of().headline == "Not yet: nothing that counts was read below the outfall."


def test_reading_above_the_outfall_alone_is_not_yet():
    assert leave_of(reading("U1", 8.0)).headline == "Not yet: nothing that counts was read below the outfall."


def test_lowest_at_the_last_station_is_open_below():
    readings = [reading(code, do, 30 * at) for at, (code, do) in enumerate((("D2", 6), ("D3", 5), ("D4", 4.25)))]
    leave = leave_of(*readings)
    assert leave.word == "open below"
    assert leave.headline == "Open below: the lowest reading, 4.2 mg/L at D4, is your last station. Go on downstream."
    assert "3 of at least 4 stations below the outfall with a reading that counts." in leave.missing
    assert not leave.settled


def test_lowest_at_the_first_station_is_open_above():
    readings = [reading(code, do, 30 * at) for at, (code, do) in enumerate((("D3", 3.0), ("D4", 3.6), ("D5", 4.2)))]
    assert leave_of(*readings).headline == (
        "Open above: the lowest reading, 3.0 mg/L at D3, is your first station. Read further up."
    )


def test_replicate_and_section_at_the_lowest_station_fulfil_that_clause_of_the_trades_rule():
    section = [reading("D4", 4.0, at, position) for at, position in enumerate(("left", "centre", "right"))]
    again = reading("D4", 4.05, 5, "centre")
    clause = {one.key: one for one in leave_of(reading("D3", 5.0), *section, again).trade}
    assert clause["f"].holds is True
    clause = {one.key: one for one in leave_of(reading("D3", 5.0), reading("D4", 4.0, 9)).trade}
    assert clause["f"].said == "the lowest station lacks a section check and a replicate"


def closing(*readings):
    """The close-out list's states and words of readings."""
    stations = [{"code": "U1", "distance_km": -0.6}, {"code": "D3", "distance_km": 6.9}]
    return [(one.done, one.says) for one in closing_list(visits_of(readings, {"U1", "D3"}), stations)]


def test_close_out_list_tells_what_is_open():
    assert closing(reading("U1", 8.0), reading("D3", 4.0, 60, meter="")) == [
        (False, "U1, the first station, was not read again yet."),
        (False, "No replicate was read yet."),
        (False, "The meter was not noted at D3."),
    ]


def test_close_out_list_praises_no_reading_before_there_is_one():
    assert closing()[-1] == (False, "No reading to have a time and a meter yet.")


def test_close_out_list_tells_what_is_done_and_that_the_day_changed_the_anchor():
    done = closing(reading("U1", 8.0), reading("D3", 4.0, 60), reading("D3", 4.1, 63), reading("U1", 8.5, 400))
    assert done == [
        (
            True,
            "U1, the first station, was read again: +0.5 mg/L against before. The day itself changed oxygen, so "
            "stations read hours apart compare poorly.",
        ),
        (True, "Replicates at D3."),
        (True, "Every reading has its time and meter."),
    ]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("The reading at 6.9 km is lower.", "The reading at D3 is lower."),
        ("The gap from 6.9 to 10.5 km is wide: halve it.", "The gap from D3 to D4 is wide: halve it."),
        ("The reading at 8.0 km is lower.", "The reading at river mile 36.23 is lower."),
    ],
)
def test_sentences_of_calc_name_stations_or_the_distances_shown(text, said):
    show = Show("us", "river_mile", 41.2)
    assert plainly(show, text, [(6.9, "D3"), (10.5, "D4")]) == said
    assert " km" not in stretch(show, 6.9, 10.5)


STATIONS = [{"code": code, "distance_km": km} for code, km in (("U1", -0.6), ("D1", 0.9), ("D6", 17.1), ("D9", 28.9))]


@pytest.mark.parametrize(
    ("distance_km", "known", "code"),
    [
        (18.8, (), "D6A"),
        (18.8, ("D6A", "d6b"), "D6C"),
        (31.4, (), "D10"),
        (31.4, ("D10",), "D11"),
        (0.3, (), "D0"),
        (-1.0, (), "U0"),
    ],
)
def test_code_of_an_added_station_stands_beside_its_neighbours_and_is_new(distance_km, known, code):
    assert code_for(distance_km, STATIONS, known) == code


def test_codes_without_numbers_give_a_plain_new_one():
    assert code_for(2.0, [{"code": "Bridge", "distance_km": 1.0}], ("S01",)) == "S02"


def today_of(*readings):
    return estimate_of(SURVEY, VERSION, Settings(), readings)


def test_lower_reading_moves_the_low_point_and_says_by_how_much():
    readings = [reading("D2", 6.0), reading("D3", 5.0, 60), reading("D4", 4.0, 120)]
    low = reading("D5", 2.4, 180)
    before, after = today_of(*readings), today_of(*readings, low)
    said = moved_low_point(SHOW, before, after)
    change = after.estimate.critical_do_mg_l.median - before.estimate.critical_do_mg_l.median
    assert change < -0.1
    assert said.startswith("This reading moved the low point ") and f"{-change:.1f} mg/L lower" in said
    against = against_today(SHOW, before, after, low, 12.4)
    assert against.difference_mg_l == pytest.approx(2.4 - against.expected.do_mg_l)
    assert against.difference_mg_l < 0


def test_reading_as_expected_leaves_the_low_point_where_it_was():
    readings = [reading("D2", 6.0), reading("D3", 5.0, 60), reading("D4", 4.0, 120), reading("D6", 4.2, 240)]
    before = today_of(*readings)
    again = reading("D4", round(before.at(10.5).do_mg_l, 2), 500)
    assert moved_low_point(SHOW, before, today_of(*readings, again)).startswith(
        "This reading leaves the low point where it was"
    )


def test_with_fewer_than_two_stations_there_is_no_sag_of_today():
    against = against_today(SHOW, today_of(), today_of(reading()), reading(), 6.9)
    assert (against.expected, against.difference_mg_l) == (None, None)
    assert against.says == "Today's sag begins with the second station read below the outfall."


def test_warmer_water_is_compared_at_its_own_temperature():
    today = today_of(reading("D2", 6.0), reading("D3", 5.0, 60))
    assert today.at(5.0, 26.0).do_mg_l < today.at(5.0, 20.0).do_mg_l < today.at(5.0, 14.0).do_mg_l


def test_following_where_next_twice_turns_open_into_held_with_the_true_low_point_inside(app, people):
    database, planned = app.extensions["bankside_database"], predict_plan(make.PLAN, make.ELEVATION_M)
    with database.writing() as db:
        survey = demo_survey(db, people)
        plan = current_plan(db, survey.id)
    for new in demo_readings():
        store(app, survey, plan, people["crew"], new)
    answers, errors = [], np.random.default_rng(11).normal(0, make.READ_SD_MG_L, 2)
    for error in errors:
        with database.writing() as db:
            sag = sag_of(db, survey, Show.of(survey), NOW)
            answers.append(sag.leave.word)
            offer = sag.where.offers[0]
            asked = Choice("00000000-0000-0000-0000-00000000000" + str(len(answers)), sag.mark, key_of(offer), "")
            code = choose_station(db, survey, sag, asked, people["lead"].id)
        store(app, survey, plan, people["crew"], true_reading(code, offer.distance_km, planned, error))
    with database.reading() as db:
        sag = sag_of(db, survey, Show.of(survey), NOW)
        taken = [final(one).station_code for one in readings_of(db, survey.id)][-2:]
    truth, place = critical_point(TRUE_RIVER), sag.today.estimate.critical_km
    assert (answers, sag.leave.word) == (["open below", "open below"], "held"), taken
    assert place.low < truth.distance_km < place.high
    assert sag.today.estimate.critical_do_mg_l.low < truth.do_mg_l < sag.today.estimate.critical_do_mg_l.high
    assert sag.leave.headline.startswith("Held: the low point, 3.")
