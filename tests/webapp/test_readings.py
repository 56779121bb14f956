from dataclasses import replace
from datetime import UTC, datetime

import pytest

from webapp.errors import Conflict, NotFound
from webapp.models import PlanVersion, Reading, ReadingEvent, Station
from webapp.plan.tables import EMPTY_PLAN
from webapp.readings import queries
from webapp.readings.layers import final, placed
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading, station_pressure_of

AT = datetime(2026, 8, 12, 8, 15, tzinfo=UTC)
FIRST = NewReading("0b8f6f2c-32cb-4a52-9a6f-0f5b0d3b1c11", "D1", AT, do_mg_l=6.4, water_temp_c=18.0, depth_m=0.7)


@pytest.fixture
def version(db, survey, people):
    """A plan of two stations, D1 at 2 km and D2 at 5 km."""
    rows = [{"code": "D1", "distance_km": 2.0}, {"code": "D2", "distance_km": 5.0}]
    tables = {**EMPTY_PLAN, "stations": rows}
    version = PlanVersion(survey_id=survey.id, number=1, tables=tables, made_by_id=people["lead"].id)
    db.add_all([version, *(Station(survey_id=survey.id, code=row["code"]) for row in rows)])
    db.commit()
    return version


@pytest.fixture
def store(db, survey, people, version):
    """A function that stores a NewReading by the crew."""
    return lambda new: add_reading(db, survey, new, people["crew"].id, version, AT)


def test_same_reading_sent_five_times_is_stored_once(db, survey, store):
    for _ in range(5):
        assert store(FIRST).id == FIRST.id
    assert len(queries.readings_of(db, survey.id)) == 1


@pytest.mark.parametrize("change", [{"do_mg_l": 6.5, "entered": {"do_mg_l": {"text": "6.5", "unit": "mg/L"}}},
                                    {"water_temp_c": 18.5}, {"station_code": "D2"}, {"note": "wind"}])  # fmt: skip
def test_same_id_with_other_content_is_a_conflict_and_changes_nothing(db, survey, store, change):
    store(FIRST)
    with pytest.raises(Conflict, match="stored already, with other values"):
        store(replace(FIRST, **change))
    assert [one.do_mg_l for one in queries.readings_of(db, survey.id)] == [6.4]


def test_reading_at_a_station_that_never_was_is_not_found(store):
    with pytest.raises(NotFound, match="no such station"):
        store(replace(FIRST, station_code="D9"))


def test_reading_of_another_survey_is_not_found(db, store):
    store(FIRST)
    with pytest.raises(NotFound, match="no such reading in this survey"):
        queries.get_reading(db, "another", FIRST.id)


def test_readings_come_in_the_order_they_were_taken(db, survey, store):
    store(FIRST)
    store(replace(FIRST, id="second", taken_at=AT.replace(hour=5)))
    assert [one.id for one in queries.readings_of(db, survey.id)] == ["second", FIRST.id]


def test_weather_pressure_is_reduced_to_the_station_and_the_entry_kept(db, survey, store):
    entered = {"pressure": {"text": "762", "unit": "mm[Hg]"}}
    reading = store(replace(FIRST, pressure_mmhg=762.0, pressure_source="weather", entered=entered))
    assert reading.pressure_mmhg == pytest.approx(762 * (1 - 2.25577e-5 * 210) ** 5.25588)
    assert queries.get_reading(db, survey.id, FIRST.id).entered == entered


def test_762_from_a_weather_report_at_500_m_is_718_at_the_station():
    new = replace(FIRST, pressure_mmhg=762.0, pressure_source="weather")
    assert station_pressure_of(new, 500.0) == pytest.approx(718, abs=0.5)


@pytest.mark.parametrize("source", ["meter", "barometer"])
def test_pressure_read_at_the_water_is_used_as_it_is(source):
    assert station_pressure_of(replace(FIRST, pressure_mmhg=733.0, pressure_source=source), 500.0) == 733.0


def test_missing_pressure_is_that_of_the_standard_atmosphere(store):
    reading = store(replace(FIRST, pressure_source="meter"))
    assert reading.pressure_source == "standard"
    assert reading.pressure_mmhg == pytest.approx(741.2, abs=0.1)


def test_oxygen_follows_from_the_meters_percent_where_only_that_was_read(store):
    reading = store(replace(FIRST, do_mg_l=None, do_percent=80.0, percent_basis="760", water_temp_c=20.0))
    assert reading.do_mg_l == pytest.approx(0.8 * 9.09, abs=0.01)  # 9.09 mg/L at 20 °C and 760 mmHg
    assert reading.do_percent == 80.0


def _decide(db, people, **event):
    db.add(ReadingEvent(reading_id=FIRST.id, reason="probe in the mud", made_by_id=people["office"].id, **event))
    db.commit()
    db.expire_all()


def test_corrections_apply_in_their_order_and_raw_values_stay(db, survey, people, store):
    store(FIRST)
    _decide(db, people, kind="corrected", field="do_mg_l", new_value=6.1, made_at=AT.replace(hour=9))
    _decide(db, people, kind="corrected", field="do_mg_l", new_value=6.2, made_at=AT.replace(hour=10))
    reading = final(queries.get_reading(db, survey.id, FIRST.id))
    assert (reading.do_mg_l, reading.raw["do_mg_l"], len(reading.corrections)) == (6.2, 6.4, 2)
    assert db.get(Reading, FIRST.id).do_mg_l == 6.4


def test_set_aside_reading_carries_its_reason_until_restored(db, survey, people, store):
    store(FIRST)
    _decide(db, people, kind="set_aside", made_at=AT.replace(hour=9))
    aside = final(queries.get_reading(db, survey.id, FIRST.id))
    assert (aside.state, aside.reason) == ("set aside", "probe in the mud")
    _decide(db, people, kind="restored", made_at=AT.replace(hour=10))
    assert final(queries.get_reading(db, survey.id, FIRST.id)).state == "used"


def test_only_readings_with_oxygen_and_a_place_are_drawn(db, survey, version, store):
    store(FIRST)
    store(replace(FIRST, id="no-oxygen", do_mg_l=None))
    stations = version.tables["stations"]
    (drawn,) = placed(queries.readings_of(db, survey.id), stations)
    assert (drawn.label, drawn.distance_km, drawn.do_mg_l, drawn.state) == ("D1", 2.0, 6.4, "used")
