"""A survey with at least one of everything that can be stored, beside a paper sheet's readings."""

import io
import zipfile
from datetime import timedelta

from tests.conftest import SURVEY_FORM
from tests.webapp import servers
from tests.webapp.sheets import TAKEN, correct, put_readings, set_aside
from webapp.dataset import service
from webapp.models import (
    Bottle,
    HandOver,
    LabResult,
    Meter,
    MeterCheck,
    MeterCheckEvent,
    Reading,
    ReadingEvent,
    Survey,
    SurveyEvent,
    Visit,
    VisitEntry,
)
from webapp.plan.queries import current_plan, stations_of

PRIVATE_PHONE = "0650 1234567"
NOTE = "=cmd|'/c calc'!A1"


def put_everything(db, survey, people):
    """Store it in a writing session; return the ids of the paper sheet's readings by station."""
    ids = put_readings(db, survey, people)
    correct(db, survey, people, ids["D3"], 4.52)
    set_aside(db, survey, people, ids["D5"], reason='\'the probe hung in the "air",\nfor a while')
    servers.add_settings_and_decision(db, survey, people["office"])
    stations, plan = stations_of(db, survey.id), current_plan(db, survey.id)
    checks = put_meter(db, survey, people["crew"])
    readings = put_section(db, survey, people["crew"], stations["D2"], plan)
    db.add(
        ReadingEvent(
            reading_id=readings[0],
            kind="drift",
            reason="the meter drifted",
            made_by_id=people["office"].id,
            made_at=TAKEN + timedelta(days=1),
            particulars={"scale": 1.0294, "shift": 0.1, "method": "ratio", "start_check": checks[0],
                         "end_check": checks[1], "batch": "b"},
        )
    )  # fmt: skip
    put_visit(db, survey, people, stations["D2"])
    put_bottle(db, survey, people["crew"], stations["D2"])
    event = {"survey_id": survey.id, "made_by_id": people["office"].id}
    db.add(
        SurveyEvent(kind="reviewed", version="draft-12-abc", reason=NOTE, made_at=TAKEN + timedelta(days=2), **event)
    )
    db.commit()
    return ids


def put_meter(db, survey, person):
    """Store a meter that drifts by 0.46 mg/L over the day; return the ids of the two checks."""
    meter = Meter(survey_id=survey.id, name="Meter A", method="optical", maker="+Ä", serial="0042", note=NOTE)
    db.add(meter)
    db.flush()
    row = {"survey_id": survey.id, "meter_id": meter.id, "author_id": person.id, "standard": "air_saturated_water"}
    water = {"water_temp_c": 25.0, "pressure_mmhg": 760.0, "pressure_source": "barometer", "expected": 8.26}
    checks = [
        MeterCheck(checked_at=TAKEN - timedelta(hours=1), kind="as_found", value=8.25, **row, **water),
        MeterCheck(checked_at=TAKEN + timedelta(hours=7), kind="end_of_day", value=7.8, lot="=1", **row, **water,
                   entered={"value": {"text": "7,80", "unit": "mg/L"}}, judged={"says": "off", "settings": 1}),
    ]  # fmt: skip
    db.add_all(checks)
    db.flush()
    for kind in ("set_aside", "restored"):
        db.add(MeterCheckEvent(check_id=checks[0].id, kind=kind, reason="-", made_by_id=person.id))
    return [one.id for one in checks]


def put_section(db, survey, person, station, plan):
    """Store left, centre and right with raw values, and a replicate; return the ids."""
    series = [{"after_s": None, "do_mg_l": 6.1, "water_temp_c": None},
              {"after_s": 75.5, "do_mg_l": 1 / 3 + 6, "water_temp_c": 20.300000000000004}]  # fmt: skip
    made = [
        Reading(
            survey_id=survey.id, station_id=station.id, plan_version_id=plan.id, author_id=person.id, meter="meter a",
            taken_at=TAKEN + timedelta(hours=3, minutes=place), position=position, do_mg_l=6.2 + place / 3, ph=7.4,
            water_temp_c=20.0 + place, conductance_us_cm=431.0, pressure_mmhg=741.0, pressure_source="barometer",
            series=series, soak_s=95.0, stable=place != 1, unstable_reason="'gusts",
            distance_left_m=2.5 * min(place, 2), replicate=place == 3, longitude=-0.1, latitude=48.0,
            note="  two\r\nlines ",
            kept_findings=[{"name": "step_against_neighbour", "says": "=1", "reason": "-"}],
        )
        for place, position in enumerate(("left", "centre", "right", "right"))
    ]  # fmt: skip
    db.add_all(made)
    db.flush()
    return [one.id for one in made]


def put_visit(db, survey, people, station):
    """Store a visit that two people tell of in different words."""
    visit = Visit(survey_id=survey.id, station_id=station.id, opened_by_id=people["crew"].id)
    db.add(visit)
    db.flush()
    arrived = (TAKEN + timedelta(hours=2, minutes=50)).isoformat()
    facts = {"arrived_at": arrived, "platform": "wade", "stage_m": 0.415, "crew": NOTE, "status": "partial",
             "partial_reason": "hail"}  # fmt: skip
    entered = {"stage_m": {"text": "41,5", "unit": "cm"}, "crew": {"text": NOTE, "unit": ""}}
    db.add_all(
        [
            VisitEntry(visit_id=visit.id, author_id=people["crew"].id, facts=facts, entered=entered),
            VisitEntry(visit_id=visit.id, author_id=people["lead"].id, facts={"stage_m": 0.43}, reason="read anew"),
        ]
    )


def put_bottle(db, survey, person, station):
    """Store two bottles, their hand-over, and a result below the limit that a later one replaces."""
    row = {"survey_id": survey.id, "author_id": person.id}
    filled = TAKEN + timedelta(hours=3)
    bottles = [
        Bottle(
            station_id=station.id, code=code, analysis="bod5", collected_at=filled, replicate_of=of, full=full, **row
        )
        for code, of, full in (("D2-1", "", True), ("D2-2", "D2-1", None))
    ]
    db.add_all(bottles)
    db.flush()
    ids = [one.id for one in bottles]
    db.add(HandOver(bottles=ids, gave="Cleo", took="@lab", at=filled + timedelta(hours=5), temperature_c=4.5, **row))
    began = filled + timedelta(hours=49)
    for place, result in enumerate(({"censor": "less_than", "limit_value": 2.0}, {"value": 3.1}, {"value": 3.4})):
        db.add(
            LabResult(
                bottle_id=ids[place // 2],
                started_at=began,
                made_at=began + timedelta(days=5, minutes=place),
                quality={"blank_mg_l": 0.1},
                laboratory="'Lab",
                **row,
                **result,
            )
        )


def unpacked(people_file, folders):
    """Return the folder with the unpacked dataset of a survey with one of everything, and private things."""
    form = {**SURVEY_FORM, "safety_note": f"Ring {PRIVATE_PHONE}"}
    folder = folders.mktemp("package")
    with servers.server_with_survey(people_file, folders.mktemp("source"), form) as (database, survey, people):
        with database.writing() as db:
            put_everything(db, survey, people)
        with database.reading() as db:
            content = service.zip_of(service.dataset_of(db, db.get(Survey, survey.id)))
    zipfile.ZipFile(io.BytesIO(content)).extractall(folder)
    return folder
