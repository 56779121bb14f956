"""What the acceptance list expects of the river: the table of saturation, the low point at the last station."""

import copy
import csv
import io
import uuid
from datetime import UTC, datetime, timedelta

import pytest

from calc.oxygen import saturation_mg_l
from tests.calc.rows import rows
from tests.webapp.plans import PLAN, put_plan
from tests.webapp.test_sag_decisions import form_for
from webapp.dataset.service import dataset_of
from webapp.plan.queries import current_plan, stations_of
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading

CODES = ("S07", "S08", "S09", "S10", "S11", "S12", "S13", "S14", "S15")
START = datetime(2026, 8, 12, 6, 0, tzinfo=UTC)


def test_the_pocket_table_of_saturation_is_met_to_a_hundredth():
    table = rows("do_field_table.csv", "t_c", "p_mmhg", "do_sat_mg_l")
    assert len(table) == 43
    off = [row for row in table if abs(saturation_mg_l(*row[:2]) - row[2]) > 0.01]
    assert off == []


@pytest.fixture
def last_is_lowest(db, survey, people):
    """The survey with stations S07 to S15, read down to S12, which is the lowest; its stations' ids by code."""
    plan = copy.deepcopy(PLAN)
    for row, code in zip(plan["stations"], CODES, strict=True):
        row["code"] = code
    # Daylight is a limit of the day, and this test runs at any hour: the crew is where no sun sets.
    plan["day"] = [{"latitude": 89.0 if datetime.now(UTC).month in range(4, 10) else -89.0, "longitude": 0.0}]
    version = put_plan(db, db.merge(survey), people["lead"], plan)
    for at, (code, do_mg_l) in enumerate((("S09", 5.6), ("S10", 4.9), ("S11", 4.2), ("S12", 3.4))):
        new = NewReading(str(uuid.uuid4()), code, START + timedelta(hours=at), do_mg_l, 19.7)
        add_reading(db, survey, new, people["crew"].id, version, new.taken_at)
    ids = {code: station.id for code, station in stations_of(db, survey.id).items()}
    db.rollback()
    return ids


def test_lowest_at_the_last_station_is_not_bracketed_by_clause_c_and_a_station_added_keeps_every_code(
    browser_as, db, survey, last_is_lowest
):
    lead = browser_as("lead")
    page = lead.get(f"/surveys/{survey.id}/sag").text
    assert "Open below: the lowest reading, 3.4 mg/L at S12, is your last station." in page
    assert "two stations downstream that rise in order are missing" in page  # clause c
    form = form_for(page, "Twin poplars", reason="does it rise?")
    assert lead.post(f"/surveys/{survey.id}/sag/station", form).status_code == 303
    db.expire_all()
    order = [row["code"] for row in sorted(current_plan(db, survey.id).tables["stations"], key=_distance)]
    assert order == [*CODES[:6], "S12A", *CODES[6:]]
    after = {code: station.id for code, station in stations_of(db, survey.id).items()}
    assert {code: after[code] for code in last_is_lowest} == last_is_lowest
    readings = dataset_of(db, survey).files["readings.csv"].decode("utf-8")
    read = [row["station_code"] for row in csv.DictReader(io.StringIO(readings, newline=""))]
    assert read == ["S09", "S10", "S11", "S12"]


def _distance(row):
    return row["distance_km"]
