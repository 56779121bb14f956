"""The demo's day for tests: its survey and plan, its readings, and readings of its true river where a test asks."""

import uuid
from datetime import timedelta

from calc.sag import predict
from demo_survey import make
from webapp.plan import service as plan_service
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading
from webapp.surveys import service as survey_service
from webapp.surveys.forms import parse_survey

TRUE_RIVER = make.true_river()


def demo_survey(db, people):
    """Store the demo's survey and plan in a writing session, with all people on it; return the survey."""
    facts, errors = parse_survey(make.SURVEY)
    assert not errors
    survey = survey_service.create_survey(db, facts, people["office"].id)
    for role in ("lead", "crew"):
        survey_service.add_member(db, survey.id, people[role].id, people["office"].id)
    plan_service.save_tables(db, survey, make.PLAN, "The plan", people["office"].id)
    return survey


def demo_readings():
    """Return the demo's own readings so far as NewReadings."""
    names = ("taken_at", "do_mg_l", "water_temp_c", "depth_m", "position", "meter", "replicate")
    return [
        NewReading(str(uuid.uuid4()), row["station"], **{name: row[name] for name in names}) for row in make.readings()
    ]


def true_reading(code, distance_km, plan, error_mg_l=0.0):
    """Return a NewReading of the true river at a station, when the plan's parcel is there."""
    state = predict(TRUE_RIVER, distance_km)
    return NewReading(
        str(uuid.uuid4()),
        code,
        make.RELEASE + timedelta(hours=plan.at(distance_km).travel_time_h + 0.2),
        round(float(state.do_mg_l) + error_mg_l, 2),
        round(float(state.water_temp_c), 1),
        0.7,
        position="centre",
        meter="Meter A",
    )


def store(app, survey, plan_version, person, new):
    """Store a NewReading in a session of its own and return the Reading."""
    with app.extensions["bankside_database"].writing() as db:
        return add_reading(db, survey, new, person.id, plan_version, new.taken_at)
