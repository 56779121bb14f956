"""A meter, its checks and its readings for tests: water at 25.0 °C and 760 mmHg, where saturation is 8.26 mg/L."""

import uuid
from datetime import UTC, datetime, timedelta

from webapp.meters import service
from webapp.meters.new import NewCheck, NewMeter
from webapp.plan.queries import current_plan
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading

# 05:30 on the morning of the survey, in its zone.
START = datetime(2026, 8, 12, 3, 30, tzinfo=UTC)


def new_meter(name="Meter A", **more):
    return NewMeter(str(uuid.uuid4()), name, **more)


def new_check(meter, hours=0.0, kind="as_found", value=8.26, **more):
    """A check so many hours into the day, against air-saturated water where nothing else is said."""
    air = {"water_temp_c": 25.0, "pressure_mmhg": 760.0, "pressure_source": "meter"}
    return NewCheck(
        str(uuid.uuid4()),
        meter.id,
        START + timedelta(hours=hours),
        kind,
        **{"standard": "air_saturated_water", "value": value, **air, **more},
    )


class MeterDay:
    """Stores the meters, checks and readings of a survey, each in a session of its own."""

    START = START

    def __init__(self, app, survey, people):
        self.database = app.extensions["bankside_database"]
        self.survey, self.people = survey, people

    def meter(self, name="Meter A", **more):
        with self.database.writing() as db:
            return service.add_meter(db, self.survey, new_meter(name, **more), self.people["crew"].id)

    def check(self, meter, *args, by="crew", **more):
        new = new_check(meter, *args, **more)
        with self.database.writing() as db:
            return service.add_check(db, self.survey, new, self.people[by].id, new.checked_at)

    def reading(self, code, hours, meter="Meter A", water_temp_c=20.0, **more):
        taken_at = START + timedelta(hours=hours)
        new = NewReading(str(uuid.uuid4()), code, taken_at, 6.0, water_temp_c, meter=meter, **more)
        with self.database.writing() as db:
            plan = current_plan(db, self.survey.id)
            return add_reading(db, self.survey, new, self.people["crew"].id, plan, taken_at)
