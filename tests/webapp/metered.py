"""A day with one meter: its checks, and readings between them, stored as the crew's."""

from datetime import UTC, datetime, timedelta

from tests.webapp.plans import put_plan
from webapp.models import Meter, MeterCheck
from webapp.readings.judging import judgement_of
from webapp.review import service

# Air-saturated water at 25.0 °C and 760 mmHg holds 8.26 mg/L.
AIR = {"standard": "air_saturated_water", "water_temp_c": 25.0, "pressure_mmhg": 760.0}
ZERO = {"kind": "zero", "standard": "zero_solution"}
START = datetime(2026, 8, 12, 5, 0, tzinfo=UTC)
PLACES = ("D1", "D2", "D3", "D4")


def put_meter(db, survey, name="Meter A"):
    """Store a meter and return it."""
    meter = Meter(survey_id=survey.id, name=name)
    db.add(meter)
    db.commit()
    return meter


def put_check(db, survey, people, meter, hours, value, kind="end_of_day", **more):
    """Store a check so many hours after START and return it."""
    given = AIR | {"kind": kind} | more
    author = people["crew"].id
    at = START + timedelta(hours=hours)
    check = MeterCheck(survey_id=survey.id, meter_id=meter.id, author_id=author, checked_at=at, value=value, **given)
    db.add(check)
    db.commit()
    return check


def put_day(db, survey, people, end=7.80, zero=0.05, by="crew"):
    """Store the plan and a day on it as put_drift does; return the meter."""
    put_plan(db, survey, people["lead"])
    return put_drift(db, survey, people, end, zero, by)


def put_drift(db, survey, people, end=7.80, zero=0.05, by="crew"):
    """Store a read-back, four readings 2 h apart and the checks that end the day after 8 h; return the meter.

    end and zero are what the meter read at the end in air-saturated water and in zero solution; None for no check.
    """
    meter = put_meter(db, survey)
    put_check(db, survey, people, meter, 0, 8.26, "read_back")
    rows = [
        {"station": code, "taken_at": START + timedelta(hours=2 * place), "do_mg_l": 5.0, "water_temp_c": 20.0,
         "pressure": 742.0, "pressure_source": "barometer", "meter": "Meter A"}
        for place, code in enumerate(PLACES, 1)
    ]  # fmt: skip
    service.import_readings(db, survey, rows, people[by].id)
    if end is not None:
        put_check(db, survey, people, meter, 8, end)
    if zero is not None:
        put_check(db, survey, people, meter, 8.1, zero, **ZERO)
    return meter


def judged(db, survey):
    """Return the survey's Judged by station code, as they are stored now."""
    db.rollback()
    db.expire_all()
    return {one.reading.station_code: one for one in judgement_of(db, survey).by_id.values()}
