import uuid
from datetime import UTC, datetime, timedelta

import pytest

from calc.oxygen import saturation_mg_l, standard_pressure_mmhg
from tests.webapp.plans import PLAN, put_plan
from webapp.models import ReadingEvent, Visit, VisitEntry, new_id
from webapp.plan.prediction import predict_plan
from webapp.plan.queries import stations_of
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading

START = datetime(2026, 8, 12, 6, 0, tzinfo=UTC)


@pytest.fixture
def version(db, survey, people):
    return put_plan(db, survey, people["lead"])


@pytest.fixture
def read(app, survey, people, version):
    """A function that stores a reading at a station."""

    def stored(code, do_mg_l, hours=0.0, water_temp_c=19.7):
        new = NewReading(str(uuid.uuid4()), code, START + timedelta(hours=hours), do_mg_l, water_temp_c, 1.0)
        with app.extensions["bankside_database"].writing() as session:
            return add_reading(session, survey, new, people["crew"].id, version, datetime.now(UTC))

    return stored


@pytest.fixture
def sag_text(browser_as, survey):
    """A function from a role to the text of the sag page."""
    return lambda role="crew": browser_as(role).get(f"/surveys/{survey.id}/sag").text


def test_signed_out_visitor_is_asked_to_sign_in(app, survey):
    assert app.test_client().get(f"/surveys/{survey.id}/sag").status_code == 302


def test_survey_of_another_crew_is_not_found(browser_as):
    assert browser_as("crew").get("/surveys/00000000-0000-0000-0000-000000000000/sag").status_code == 404


def test_without_plan_the_lead_is_sent_to_it_and_the_crew_to_the_lead(sag_text, survey):
    assert "This survey has no plan yet." in sag_text("lead")
    assert f'class="button" href="/surveys/{survey.id}/plan"' in sag_text("lead")
    assert "Ask your lead or the office." in sag_text("crew")
    assert f'class="button" href="/surveys/{survey.id}/plan"' not in sag_text("crew")


def test_incomplete_plan_says_what_it_needs(db, survey, people, sag_text):
    put_plan(db, survey, people["lead"], {**PLAN, "waters": PLAN["waters"][:1]})
    assert "Add the outfall under Waters that meet." in sag_text()


def test_plan_without_stations_is_no_error(db, survey, people, sag_text):
    put_plan(db, survey, people["lead"], {"reaches": [], "waters": [], "stations": []})
    assert "Add the reaches of the river" in sag_text()


def test_before_the_first_reading_the_plot_shows_the_prediction_alone(sag_text, version):
    text = sag_text()
    assert "Nothing was read yet: the plot shows the prediction alone." in text
    assert '<polyline class="line-plan"' in text
    assert "Predicted lowest oxygen 3.5 mg/L at 15.92 km below the outfall" in text
    assert 'class="mark-used"' not in text
    assert "along the river from the outfall" in text and "from the last reading" not in text


def test_answer_comes_first_then_the_lowest_reading_and_the_criterion(sag_text, read):
    read("D3", 4.4)
    read("D5", 3.0, 4)
    read("D6", 3.6, 6)
    before_the_plot = sag_text().split("<svg")[0]
    assert before_the_plot.index('class="notice answer') < before_the_plot.index("3.00 <span")
    assert "Below the criterion of 5.0 mg/L" in " ".join(before_the_plot.replace("</strong>", "").split())


@pytest.mark.parametrize(
    ("oxygen", "says"),
    [
        (
            (4.0, 3.5, 3.0),
            "Open below: the lowest reading, 3.0 mg/L at D5, is your last station. Go on downstream.",
        ),
        ((3.0, 3.5, 4.0), "Open above: the lowest reading, 3.0 mg/L at D3, is your first station. Read further up."),
    ],
)
def test_lowest_at_an_end_leaves_that_side_open(sag_text, read, oxygen, says):
    for code, do in zip(("D3", "D4", "D5"), oxygen, strict=True):
        read(code, do)
    assert says in sag_text()


def test_single_station_is_not_enough(sag_text, read):
    read("D4", 3.4)
    text = sag_text()
    assert "Not yet: 1 of at least 4 stations below the outfall with a reading that counts." in text
    assert 'class="line-today"' not in text


def test_reading_above_the_outfall_is_no_low_point(sag_text, read):
    read("U1", 2.0)
    assert "Nothing was read below the outfall yet that counts." in sag_text()


def test_reading_set_aside_is_drawn_but_not_told(app, people, sag_text, read):
    low = read("D5", 0.4)
    read("D6", 3.6, 2)
    with app.extensions["bankside_database"].writing() as session:
        session.add(
            ReadingEvent(reading_id=low.id, kind="set_aside", reason="Probe in mud", made_by_id=people["lead"].id)
        )
        session.commit()
    text = sag_text()
    assert 'class="mark-aside"' in text
    assert "3.60 <span" in text
    assert "0.40 <span" not in text


def test_stations_stand_with_reading_prediction_and_difference(sag_text, read):
    reading = read("D5", 3.0, water_temp_c=21.0)
    text = sag_text()
    assert f"/readings/{reading.id}/check" in text
    card = text.split("<strong>D5</strong>")[1].split("</li>")[0]
    expected = saturation_mg_l(21.0, standard_pressure_mmhg(210)) - predict_plan(PLAN, 210.0).at(12.4).deficit_mg_l
    assert f"predicted {expected:.2f} (" in card
    assert f"difference <strong>\u2212{expected - 3.0:.1f}</strong>" in card
    untouched = text.split("<strong>D8</strong>")[1].split("</li>")[0]
    assert "Not read yet" in untouched


def test_dropped_station_without_readings_is_left_out(db, survey, people, sag_text):
    stations = [
        {**row, "state": "dropped", "reason": "Flooded"} if row["code"] == "D7" else row for row in PLAN["stations"]
    ]
    put_plan(db, survey, people["lead"], {**PLAN, "stations": stations})
    assert "<strong>D7</strong>" not in sag_text()


def test_mixing_is_shown(sag_text, version):
    text = sag_text()
    assert "2.150 m³/s" in text
    assert "404 µS/cm" in text


def test_page_in_us_units_and_river_miles_shows_no_si(app, survey, sag_text, version):
    with app.extensions["bankside_database"].writing() as session:
        stored = session.get(type(survey), survey.id)
        stored.unit_system, stored.distance_rule, stored.outfall_mark = "us", "river_mile", 41.2
        session.commit()
    text = sag_text()
    assert "river mile 31.31" in text
    assert "75.93 ft³/s" in text
    assert " km" not in text
    assert "°C" not in text


def test_a_stage_that_rose_since_the_morning_is_told_where_the_lead_decides(db, survey, people, version, sag_text):
    station = stations_of(db, survey.id)["D3"].id
    for hours, stage in ((0, 0.41), (4, 0.55)):
        visit = Visit(id=new_id(), survey_id=survey.id, station_id=station, opened_by_id=people["crew"].id)
        facts = {"arrived_at": (START + timedelta(hours=hours)).isoformat(), "stage_m": stage}
        db.add_all([visit, VisitEntry(id=new_id(), visit_id=visit.id, author_id=people["crew"].id, facts=facts)])
    db.commit()
    page = sag_text("lead")
    assert "0.14 m" in page
    assert f"/surveys/{survey.id}/visits/" in page
