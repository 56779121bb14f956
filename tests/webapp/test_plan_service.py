import copy
from datetime import UTC, datetime

import pytest

from tests.webapp.plans import PLAN
from webapp.errors import Conflict
from webapp.models import History, Reading, Station
from webapp.plan import queries, service


def save(db, survey, people, tables, reason="", **more):
    return service.save_tables(db, survey, copy.deepcopy(tables), reason, people["lead"].id, **more)


@pytest.fixture
def writing(app):
    """A function that makes a fresh writing session, as each request has one."""
    sessions = []

    def make():
        for session in sessions:  # a refused save leaves its session holding the writers' lock
            session.close()
        sessions.append(app.extensions["bankside_database"].writing())
        return sessions[-1]

    yield make
    for session in sessions:
        session.close()


def read_at(db, survey, people, code):
    station = queries.stations_of(db, survey.id)[code]
    version = queries.current_plan(db, survey.id)
    db.add(
        Reading(
            survey_id=survey.id,
            station_id=station.id,
            plan_version_id=version.id,
            taken_at=datetime(2026, 8, 12, 6, tzinfo=UTC),
            author_id=people["crew"].id,
            do_mg_l=6.1,
        )
    )
    db.commit()


def test_each_save_is_a_new_version_and_the_one_before_stays(writing, survey, people):
    save(writing(), survey, people, PLAN, "First plan")
    save(writing(), survey, people, {"weirs": []}, "The weir is gone")
    db = writing()
    versions = queries.plan_versions(db, survey.id)
    assert [(one.number, one.reason, one.made_by.name) for one in versions] == [
        (2, "The weir is gone", "Linus Ford"),
        (1, "First plan", "Linus Ford"),
    ]
    assert versions[0].tables["weirs"] == [] and len(versions[1].tables["weirs"]) == 1
    assert versions[0].tables["reaches"] == versions[1].tables["reaches"]


def test_a_save_is_remembered_in_the_history_with_what_changed(writing, survey, people):
    save(writing(), survey, people, PLAN, "First plan")
    save(writing(), survey, people, {"weirs": []}, "The weir is gone")
    line = writing().query(History).filter_by(what="plan changed").order_by(History.at.desc()).first()
    assert line.person_id == people["lead"].id
    assert line.particulars == {"number": 2, "reason": "The weir is gone", "tables": ["Weirs"]}


def test_rows_are_kept_down_the_river_without_what_is_empty_or_unknown(writing, survey, people):
    rows = [
        {"name": "Low weir", "distance_km": 9.0, "drop_m": 1.0, "shape": "", "quality": None, "colour": "red"},
        {"name": "High weir", "distance_km": 2.0, "drop_m": 0.5},
    ]
    version = service.replace_table(writing(), survey, "weirs", rows, "", people["lead"].id)
    assert version.tables["weirs"] == [
        {"name": "High weir", "distance_km": 2.0, "drop_m": 0.5},
        {"name": "Low weir", "distance_km": 9.0, "drop_m": 1.0},
    ]


def test_the_river_and_the_outfall_come_first_among_the_waters(writing, survey, people):
    rows = [
        {"kind": "withdrawal", "distance_km": 1.0, "flow_m3_s": 0.1},
        {"kind": "outfall", "flow_m3_s": 0.3},
        {"kind": "upstream", "flow_m3_s": 1.0},
    ]
    version = service.replace_table(writing(), survey, "waters", rows, "", people["lead"].id)
    assert [row["kind"] for row in version.tables["waters"]] == ["upstream", "outfall", "withdrawal"]


def test_every_code_gets_an_identity_once(writing, survey, people):
    save(writing(), survey, people, PLAN)
    save(writing(), survey, people, {"stations": [*PLAN["stations"], {"code": "D9", "distance_km": 29.0}]})
    codes = [one.code for one in writing().query(Station).filter_by(survey_id=survey.id)]
    assert sorted(codes) == ["D1", "D2", "D3", "D4", "D5", "D6", "D7", "D8", "D9", "U1"]


def test_a_code_is_one_code_however_it_is_spelt(writing, survey, people):
    save(writing(), survey, people, {"stations": [{"code": "D1", "distance_km": 1.0}]})
    version = save(writing(), survey, people, {"stations": [{"code": "d1", "distance_km": 1.0}]})
    assert version.tables["stations"] == [{"code": "D1", "distance_km": 1.0}]
    twice = [{"code": "D1", "distance_km": 1.0}, {"code": "d1", "distance_km": 2.0}]
    with pytest.raises(Conflict, match="Station D1 stands twice"):
        save(writing(), survey, people, {"stations": twice})


def test_a_station_with_readings_stays_in_the_plan(writing, survey, people):
    save(writing(), survey, people, PLAN)
    read_at(writing(), survey, people, "D3")
    without = [row for row in PLAN["stations"] if row["code"] != "D3"]
    with pytest.raises(Conflict, match="Readings were taken at D3"):
        save(writing(), survey, people, {"stations": without}, "not needed")
    dropped = [
        {**row, "state": "dropped", "reason": "no way down"} if row["code"] == "D3" else row for row in PLAN["stations"]
    ]
    assert save(writing(), survey, people, {"stations": dropped}, "not needed").number == 2


def test_a_code_is_never_given_to_another_place(writing, survey, people):
    save(writing(), survey, people, {"stations": [{"code": "D1", "distance_km": 1.0}]})
    save(writing(), survey, people, {"stations": []})
    with pytest.raises(Conflict, match="The code D1 was given to another place in version 1"):
        save(writing(), survey, people, {"stations": [{"code": "D1", "distance_km": 3.0}]})
    assert save(writing(), survey, people, {"stations": [{"code": "D1", "distance_km": 1.0}]}).number == 3


def test_once_readings_exist_a_change_needs_its_reason(writing, survey, people):
    save(writing(), survey, people, PLAN)
    read_at(writing(), survey, people, "D3")
    with pytest.raises(service.ReasonNeeded, match="say why it changes"):
        save(writing(), survey, people, {"weirs": []}, "  ")
    assert save(writing(), survey, people, {"weirs": []}, "Washed away").number == 2


def test_a_change_of_an_older_version_is_refused_with_who_was_quicker(writing, survey, people):
    save(writing(), survey, people, PLAN, "First plan")
    with pytest.raises(service.Overtaken, match="Linus Ford saved version 1 of the plan meanwhile \\(First plan\\)"):
        save(writing(), survey, people, {"weirs": []}, based_on=0)
    assert queries.current_plan(writing(), survey.id).number == 1
