import uuid
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from calc.sag import critical_point
from calc.settings import Settings
from demo_survey import make
from tests.webapp.days import TRUE_RIVER, demo_readings, demo_survey, store, true_reading
from tests.webapp.plans import PLAN, put_plan
from webapp.models import PlanVersion, ReadingEvent
from webapp.plan.prediction import predict_plan, prediction_of
from webapp.plan.queries import current_plan
from webapp.readings.layers import FinalReading
from webapp.readings.queries import readings_of
from webapp.sag.estimate import estimate_of, fit_settings
from webapp.sag.evidence import counted, visits_of

START = datetime(2026, 8, 12, 6, 0, tzinfo=UTC)
VERSION = PlanVersion(id="v", number=1, tables=PLAN)


def reading(code="D3", do=4.0, minutes=0, position="", meter="A", temp=20.0, set_aside=False):
    """A FinalReading of these values."""
    numbers = dict.fromkeys(
        ("depth_m", "do_percent", "conductance_us_cm", "pressure_mmhg", "sensor_depth_m", "velocity_m_s", "latitude",
         "longitude", "position_radius_m"))  # fmt: skip
    return FinalReading(
        id=str(uuid.uuid4()), station_code=code, taken_at=START + timedelta(minutes=minutes), position=position,
        meter=meter, replicate=False, do_mg_l=do, water_temp_c=temp, **numbers, raw={}, set_aside=set_aside,
        reason="", corrections=(),
    )  # fmt: skip


def test_section_across_the_river_counts_as_its_mean():
    section = [reading(do=5.0, position="left"), reading(do=4.6), reading(do=4.2, position="right")]
    assert [(one.code, one.distance_km, one.do_mg_l) for one in counted(section, VERSION)] == [
        ("D3", 6.9, pytest.approx(4.6))
    ]


def test_repeats_at_one_place_of_a_section_do_not_weigh_more_than_the_other_places():
    section = [reading(do=5.0, position="left"), reading(do=4.0), reading(do=4.2, minutes=2)]
    assert counted(section, VERSION)[0].do_mg_l == pytest.approx((5.0 + 4.1) / 2)


def test_replicates_stay_apart_and_share_a_visit():
    first, second = counted([reading(do=4.0), reading(do=4.1, minutes=3)], VERSION)
    assert first.visit == second.visit
    assert (first.do_mg_l, second.do_mg_l) == (4.0, 4.1)


def test_station_read_again_hours_later_is_another_visit():
    first, second = counted([reading(), reading(minutes=121)], VERSION)
    assert first.visit != second.visit


def test_two_meters_at_a_station_are_two_visits():
    assert [visit.meter for visit in visits_of([reading(), reading(meter="B", minutes=1)], {"D3"})] == ["A", "B"]


@pytest.mark.parametrize("other", [{"set_aside": True}, {"do": None}, {"code": "X9"}])
def test_what_is_set_aside_without_oxygen_or_without_a_place_does_not_count(other):
    assert counted([reading(**other)], VERSION) == ()


def test_order_of_the_readings_does_not_matter():
    readings = [reading(), reading("D4", 3.5, 60), reading("D5", 3.2, 120)]
    assert counted(readings, VERSION) == counted(readings[::-1], VERSION)


def test_thresholds_of_the_survey_reach_the_estimate():
    chosen = fit_settings(Settings(leave_stations=6.0, leave_place_percent=30.0, estimate_error_mg_l=0.2))
    assert (chosen.fewest_stations, chosen.place_half, chosen.noise_mg_l) == (6, 0.3, 0.2)


@pytest.fixture
def day(app, people):
    """A function from readings to the demo's survey, its plan version, and all readings stored on it."""

    def stored(news):
        with app.extensions["bankside_database"].writing() as db:
            survey = demo_survey(db, people)
            plan = current_plan(db, survey.id)
        for new in news:
            store(app, survey, plan, people["crew"], new)
        with app.extensions["bankside_database"].reading() as db:
            return survey, plan, readings_of(db, survey.id)

    return stored


def test_estimate_of_the_demo_draws_the_sag_below_the_plan_where_it_was_read(day):
    survey, plan, readings = day(demo_readings())
    today = estimate_of(survey, plan, Settings(), readings)
    assert today.stations_read == 4
    assert today.estimate.fit.word == "fits"
    here = today.at(10.3)
    assert here.low_mg_l < here.do_mg_l < here.high_mg_l
    assert here.high_mg_l < prediction_of(survey, plan).at(10.3).do_mg_l
    assert today.at(99.0) is None and today.at(None) is None


def test_estimate_is_kept_until_a_reading_is_set_aside(app, people, day):
    survey, plan, readings = day(demo_readings())
    today = estimate_of(survey, plan, Settings(), readings)
    assert estimate_of(survey, plan, Settings(), list(readings)) is today
    with app.extensions["bankside_database"].writing() as db:
        low = next(one for one in readings if one.station.code == "D4")
        db.add(ReadingEvent(reading_id=low.id, kind="set_aside", reason="Mud", made_by_id=people["lead"].id))
        db.commit()
        assert estimate_of(survey, plan, Settings(), readings_of(db, survey.id)).stations_read == 3


def test_readings_all_along_the_true_river_find_its_low_point(day):
    plan = predict_plan(make.PLAN, make.ELEVATION_M)
    places = [(code, make.WHERE[place]) for code, place in make.STATION_PLACES]
    errors = np.random.default_rng(4).normal(0, 0.06, len(places))
    news = [true_reading(code, km, plan, error) for (code, km), error in zip(places, errors, strict=True)]
    survey, version, readings = day(news)
    estimate, truth = estimate_of(survey, version, Settings(), readings).estimate, critical_point(TRUE_RIVER)
    assert estimate.critical_km.low < truth.distance_km < estimate.critical_km.high
    assert estimate.critical_do_mg_l.low < truth.do_mg_l < estimate.critical_do_mg_l.high


def test_plan_that_is_not_ready_gives_its_reasons(db, survey, people):
    version = put_plan(db, survey, people["lead"], {**PLAN, "waters": PLAN["waters"][:1]})
    assert estimate_of(survey, version, Settings(), []).missing == ("Add the outfall under Waters that meet.",)


def test_before_the_first_reading_the_estimate_is_the_plan_with_its_doubts(day):
    survey, version, readings = day([])
    today = estimate_of(survey, version, Settings(), readings)
    assert not today.enough
    assert today.estimate.critical_km.low < prediction_of(survey, version).critical.distance_km
