"""A paper sheet's readings at the stations of tests.webapp.plans, and a survey that holds them."""

from datetime import UTC, datetime, timedelta

from tests.webapp.plans import put_plan
from webapp.people.access import SignedIn
from webapp.plan.queries import current_plan
from webapp.readings.queries import readings_of
from webapp.review import service
from webapp.review.forms import Correction
from webapp.review.rows import rows_of

TAKEN = datetime(2026, 8, 12, 4, 30, tzinfo=UTC)
ROWS = (
    {"station": "U1", "taken_at": TAKEN, "do_mg_l": 8.1, "water_temp_c": 19.5, "depth_m": 0.9, "pressure": 742.0,
     "pressure_source": "barometer", "position": "centre", "note": "=cmd|'/c calc'!A1", "meter": "Meter A",
     "latitude": 48.2, "longitude": -15.625, "replicate": False},
    {"station": "D3", "taken_at": TAKEN + timedelta(hours=7), "do_mg_l": 4.25, "water_temp_c": 20.5, "depth_m": 1.1,
     "conductance_us_cm": 431.0, "note": "-"},
    {"station": "D4", "taken_at": TAKEN + timedelta(hours=11), "do_mg_l": 0.05, "water_temp_c": 20.7},
    {"station": "D5", "taken_at": TAKEN + timedelta(hours=13), "do_percent": 51.0, "water_temp_c": 20.6,
     "velocity_m_s": 0.3, "velocity_method": "float"},
)  # fmt: skip


def put_readings(db, survey, people):
    """Store the plan and ROWS in a writing session, as the crew's; return the ids by station code."""
    put_plan(db, survey, people["lead"])
    service.import_readings(db, survey, ROWS, people["crew"].id)
    ids = {row.final.station_code: row.final.id for row in rows(db, survey)}
    db.rollback()  # the session must not go on reading the database as it was now
    return ids


def rows(db, survey):
    """Return the survey's readings as the table shows them, as they are stored now."""
    db.rollback()
    db.expire_all()
    return rows_of(survey, current_plan(db, survey.id), readings_of(db, survey.id))


def correct(db, survey, people, reading_id, value, field="do_mg_l", based_on=0, reason="slip of the pen"):
    """Correct a number as the office."""
    person = SignedIn(people["office"])
    return service.correct(db, survey.id, reading_id, Correction(field, value, reason), based_on, person)


def set_aside(db, survey, people, reading_id, based_on=0, reason="the probe hung in the air"):
    """Set a reading aside as the office."""
    return service.set_aside(db, survey.id, reading_id, reason, based_on, SignedIn(people["office"]))
