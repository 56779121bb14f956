import html
import re
import uuid
from contextlib import contextmanager
from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest
from sqlalchemy import event

from tests.webapp.plans import put_plan
from webapp.models import Meter, Reading
from webapp.readings import queries
from webapp.surveys.service import remove_member

VIENNA = ZoneInfo("Europe/Vienna")


CHOICES = ("pressure_unit", "pressure_source", "position", "percent_basis", "velocity_method")


def typed(instant):
    return instant.astimezone(VIENNA).strftime("%Y-%m-%dT%H:%M")


def a_form(**more):
    """A reading near the plan, taken now."""
    return {
        "submission_id": str(uuid.uuid4()),
        "taken_at": typed(datetime.now(UTC)),
        "do_mg_l": "6,1",
        "water_temp_c": "19.8",
        "depth_m": "1.0",
        **more,
    }


@pytest.fixture
def address(db, survey, people):
    """The address of the reading form at D2 of a planned survey, its parcel released three hours ago."""
    survey = db.merge(survey)
    survey.release_at = datetime.now(UTC) - timedelta(hours=3)
    put_plan(db, survey, people["lead"])
    return f"/surveys/{survey.id}/stations/D2/reading"


@pytest.fixture
def crew(browser_as):
    return browser_as("crew")


@pytest.fixture
def stored(db, survey):
    """A function that returns every stored reading of the survey."""

    def read():
        db.rollback()  # see what was stored since the last look
        return queries.readings_of(db, survey.id)

    return read


def value_of(answer, name):
    return re.search(rf'name="{name}" value="([^"]*)"', answer.text).group(1)


def test_fresh_form_has_an_id_and_the_time(crew, address):
    answer = crew.get(address)
    assert answer.status_code == 200
    assert uuid.UUID(value_of(answer, "submission_id"))
    assert "data-fresh" in answer.text
    assert typed(datetime.now(UTC))[:13] in answer.text


def test_reading_is_saved_and_leads_to_its_check(crew, address, stored):
    form = a_form(note="wind from the west")
    answer = crew.post(address, form)
    assert answer.status_code == 303
    assert answer.headers["X-Stored-Id"] == form["submission_id"]
    (reading,) = stored()
    assert (reading.do_mg_l, reading.water_temp_c, reading.depth_m) == (6.1, 19.8, 1.0)
    assert reading.entered["do_mg_l"] == {"text": "6,1", "unit": "mg/L"}
    assert (reading.author.name, reading.station.code, reading.note) == ("Cleo Banks", "D2", "wind from the west")
    assert "6.10" in crew.get(answer.location).text


def test_river_without_any_oxygen_is_read_as_well(crew, address, stored):
    form = a_form(do_mg_l="0.0")
    asked = crew.post(address, form)
    assert asked.status_code == 422 and "is below" in asked.text
    kept = html.unescape(re.search(r'name="keep" value="([^"]*)"', asked.text).group(1))
    assert crew.post(address, {**form, "keep": kept}).status_code == 303
    assert [one.do_mg_l for one in stored()] == [0.0]


@pytest.mark.parametrize("blank", [" ", "\x00"])
def test_blank_percent_does_not_stand_for_oxygen(crew, address, stored, blank):
    answer = crew.post(address, a_form(do_mg_l="", do_percent=blank))
    assert answer.status_code == 422 and "Enter the oxygen." in answer.text
    assert stored() == []


def test_with_htmx_the_check_comes_in_place(crew, address):
    form = a_form()
    answer = crew.post(address, form, htmx=True)
    assert answer.status_code == 200
    assert answer.headers["X-Stored-Id"] == form["submission_id"]
    assert answer.headers["HX-Push-Url"].endswith(f"{form['submission_id']}/check")
    assert "<html" not in answer.text and "oxygen-now" in answer.text and "<svg" in answer.text


def test_save_does_not_wait_for_todays_sag_which_the_page_fetches_after_it(crew, address):
    for code, oxygen in (("D1", "6,8"), ("D3", "5,1"), ("D2", "6,1")):
        answer = crew.post(address.replace("D2", code), a_form(do_mg_l=oxygen), htmx=True)
        assert answer.status_code == 200, re.findall(r"<strong>([^<]+)", answer.text)
    assert "from today's sag" not in answer.text and "The same numbers as a table" not in answer.text
    assert answer.text.index('class="meaning"') < answer.text.index("<svg") < answer.text.index("<dt>Saturation")
    fetched = re.search(r'id="against-today" hx-get="([^"]+)"', answer.text)[1]
    part = crew.get(fetched, headers={"HX-Request": "true"}).text
    assert "the low point" in part and "from today's sag" in part
    assert '<div id="check-plot" hx-swap-oob="true">' in part and 'class="line-today"' in part
    assert '<div id="check-table" hx-swap-oob="true">' in part and "The same numbers as a table" in part
    assert "<html" not in part and "<html" in crew.get(fetched).text


def test_same_form_sent_five_times_is_one_reading_and_one_answer(crew, address, stored):
    form = a_form()
    answers = [crew.post(address, form) for _ in range(5)]
    assert {(one.status_code, one.location, one.headers["X-Stored-Id"]) for one in answers} == {
        (303, answers[0].location, form["submission_id"])
    }
    assert len(stored()) == 1


def test_same_id_with_other_content_is_refused_and_the_typing_kept(crew, address, stored):
    form = a_form()
    crew.post(address, form)
    answer = crew.post(address, {**form, "do_mg_l": "5.9"}, htmx=True)
    assert answer.status_code == 409
    assert "X-Stored-Id" not in answer.headers
    assert "stored already, with other values" in answer.text and value_of(answer, "do_mg_l") == "5.9"
    assert [one.do_mg_l for one in stored()] == [6.1]


@pytest.mark.parametrize(
    ("field", "text", "says"),
    [
        ("do_mg_l", "", "Enter the oxygen."),
        ("do_mg_l", "much", "Enter the oxygen as a number"),
        ("do_mg_l", "1,234", "Say which you mean"),
        ("do_mg_l", "-2", "must lie between -0.5 and 400"),
        ("water_temp_c", "", "Enter the water temperature."),
        ("water_temp_c", "nan", "Enter the water temperature as a number"),
        ("water_temp_c", "200", "must lie between"),
        ("depth_m", "101", "must lie between 0 and 100 m"),
        ("do_percent", "500", "must lie between -5 and 400 %"),
        ("conductance_us_cm", "-1", "must lie between 0 and 100000"),
        ("pressure", "5000", "must lie between 0 and 1200 mmHg"),
        ("pressure_unit", "psi", "Choose the unit of the air pressure"),
        ("pressure_source", "guess", "Choose the source of the air pressure"),
        ("position", "top", "Choose the position across the river"),
        ("percent_basis", "1000", "Choose the basis of the percent"),
        ("sensor_depth_m", "1.2", "under the bed"),
        ("velocity_m_s", "7", "must lie between -0.5 and 6 m/s"),
        ("velocity_method", "guess", "Choose the way the velocity was measured"),
        ("float_distance", "10", "Enter how long the float took"),
        ("float_time_s", "30", "Enter how far the float went"),
        ("taken_at", "", "Enter the time of the reading."),
        ("taken_at", "yesterday", "as date and time"),
        ("taken_at", "1871-01-01T10:00", "Check the year"),
        ("taken_at", "2199-01-01T10:00", "still to come"),
        ("note", "x" * 2001, "Shorten the note"),
        ("meter", "x" * 61, "Shorten the meter"),
        ("latitude", "north", "Enter the latitude as a number"),
        ("submission_id", "17", "without its id"),
        ("ph", "15", "must lie between 0 and 14"),
        ("distance_left_m", "-1", "must lie between 0 and 2000 m"),
        ("values", "6.1 six", "“six” is none"),
        ("soak_s", "-3", "must lie between 0 and 14400"),
        ("unstable_reason", "x" * 301, "Shorten the reason"),
        ("meter_other", "x" * 61, "Shorten the meter"),
    ],
)
def test_what_cannot_be_is_refused_beside_its_field_and_kept(crew, address, stored, field, text, says):
    for htmx in (False, True):
        answer = crew.post(address, a_form(**{field: text}), htmx=htmx)
        assert answer.status_code == 422
        assert says in answer.text
        assert "19.8" in answer.text or field == "water_temp_c"
        assert text in answer.text or field in CHOICES
    assert stored() == []


def test_pressure_without_its_source_is_asked_for(crew, address):
    assert "Say where the air pressure comes from" in crew.post(address, a_form(pressure="741")).text


def test_odd_value_is_asked_about_once_and_kept_with_the_question(crew, address, stored):
    form = a_form(do_mg_l="11.2")
    asked = crew.post(address, form)
    assert asked.status_code == 422
    assert "Not saved yet." in asked.text and "% saturation is above 120 %" in asked.text
    assert stored() == []
    keep = re.search(r'name="keep" value="([^"]+)"', asked.text).group(1).replace("&#34;", '"')
    assert crew.post(address, {**form, "keep": keep}).status_code == 303
    (reading,) = stored()
    assert "supersaturation" in {kept["name"] for kept in reading.kept_findings}


def test_saving_again_without_keeping_asks_again(crew, address, stored):
    form = a_form(do_mg_l="11.2")
    crew.post(address, form)
    assert crew.post(address, form).status_code == 422
    assert stored() == []


def test_new_odd_value_is_asked_about_although_another_was_kept(crew, address):
    form = a_form(do_mg_l="11.2")
    asked = crew.post(address, form)
    keep = re.search(r'name="keep" value="([^"]+)"', asked.text).group(1).replace("&#34;", '"')
    again = crew.post(address, {**form, "do_mg_l": "12.9", "keep": keep})
    assert again.status_code == 422 and "12.90 mg/L" in again.text
    other = crew.post(address, {**form, "keep": keep, "depth_m": "3.6"})
    assert "as feet are to metres" in other.text and "saturation is above" not in other.text


def test_fahrenheit_in_the_celsius_box_is_offered_converted_and_taken_in_one_tap(crew, address, stored):
    form = a_form(water_temp_c="68")
    asked = crew.post(address, form)
    assert asked.status_code == 422 and "Use 20 °C" in asked.text and 'name="keep"' not in asked.text
    assert crew.post(address, {**form, "use": "temperature_unit"}).status_code == 303
    assert [one.water_temp_c for one in stored()] == [20.0]


def test_value_beyond_any_river_cannot_be_kept(crew, address, stored):
    form = a_form(water_temp_c="68")
    assert crew.post(address, {**form, "keep": '["temperature_unit=68"]'}).status_code == 422
    assert stored() == []


def test_percent_in_the_oxygen_box_is_offered_as_oxygen(crew, address, stored):
    form = a_form(do_mg_l="68")
    asked = crew.post(address, form)
    assert "looks like percent" in asked.text and 'value="percent_as_concentration"' in asked.text
    crew.post(address, {**form, "use": "percent_as_concentration"})
    (reading,) = stored()
    assert 5.5 < reading.do_mg_l < 6.5 and reading.do_percent == 68


def test_oxygen_follows_from_percent_alone(crew, address, stored):
    answer = crew.post(address, a_form(do_mg_l="", do_percent="68"))
    assert "Worked out from the meter" in crew.get(answer.location).text
    assert 5.5 < stored()[0].do_mg_l < 6.5


def test_barometer_trap_at_500_m_is_asked_about_and_un_reduced_in_one_tap(db, crew, address, survey, stored):
    db.merge(survey).elevation_m = 500.0
    db.commit()
    form = a_form(pressure="762", pressure_source="barometer", pressure_unit="mm[Hg]")
    asked = crew.post(address, form)
    assert asked.status_code == 422 and "is a sea-level pressure" in asked.text
    assert "Use it as a weather value" in asked.text and '<details class="fold" open>' in asked.text
    saved = crew.post(address, {**form, "use": "sea_level_pressure"})
    (reading,) = stored()
    assert (reading.pressure_source, round(reading.pressure_mmhg)) == ("weather", 718)
    assert reading.entered["pressure"] == {"text": "762", "unit": "mm[Hg]"}
    assert "718 mmHg, from a weather report" in crew.get(saved.location).text


def test_inches_of_mercury_are_offered_and_taken(crew, address, stored):
    form = a_form(pressure="29.2", pressure_source="meter", pressure_unit="mm[Hg]")
    assert "Use 29.2 inHg" in crew.post(address, form).text
    crew.post(address, {**form, "use": "pressure_unit"})
    assert stored()[0].pressure_mmhg == pytest.approx(29.2 * 25.4)


def test_float_velocity_is_stored_as_the_mean_and_as_it_was_typed(crew, address, stored):
    crew.post(address, a_form(velocity_m_s="0.40", velocity_method="float"))
    crew.post(address, a_form(float_distance="10", float_time_s="25"))
    first, second = stored()
    assert first.velocity_m_s == pytest.approx(0.34) and second.velocity_m_s == pytest.approx(0.34)
    assert first.entered["velocity_m_s"]["text"] == "0.40"
    assert second.entered["float_time_s"]["text"] == "25" and second.velocity_method == "float"


def test_meter_and_pressure_source_are_remembered_but_no_measured_value(crew, address):
    crew.post(address, a_form(meter="Probe 7", pressure="988", pressure_unit="hPa", pressure_source="meter"))
    answer = crew.get(address)
    assert 'value="Probe 7"' in answer.text
    assert '<option value="meter" selected>' in answer.text and '<option value="hPa" selected>' in answer.text
    assert "988" not in answer.text


@pytest.fixture
def meters(db, survey):
    """Meter A in service, Meter B out of it."""
    db.add_all([Meter(survey_id=survey.id, name="Meter A"),
                Meter(survey_id=survey.id, name="Meter B", out_of_service=True)])  # fmt: skip
    db.commit()


def test_meter_is_chosen_from_those_in_service_and_the_only_one_is_chosen_already(crew, address, meters):
    page = crew.get(address).text
    assert '<option value="Meter A" selected>Meter A</option>' in page
    assert "Meter B" not in page and 'name="meter_other"' in page and "with Meter A" in page


@pytest.mark.parametrize(
    ("named", "says"),
    [
        ({"meter": "Meter B"}, "Meter B is out of service."),
        ({"meter": "Meter A", "meter_other": "Probe 9"}, "Probe 9 is no meter of this survey."),
    ],
)
def test_meter_that_is_unknown_or_out_of_service_is_asked_about_and_may_be_kept(
    crew, address, meters, stored, named, says
):
    form = a_form(**named)
    asked = crew.post(address, form)
    assert asked.status_code == 422 and says in asked.text
    keep = html.unescape(re.search(r'name="keep" value="([^"]+)"', asked.text)[1])
    assert crew.post(address, {**form, "keep": keep}).status_code == 303
    assert [one.meter for one in stored()] == [named.get("meter_other") or named["meter"]]


def test_form_does_not_offer_again_a_meter_that_was_taken_out_of_service(crew, address, meters):
    form = a_form(meter="Meter B")
    keep = html.unescape(re.search(r'name="keep" value="([^"]+)"', crew.post(address, form).text)[1])
    crew.post(address, {**form, "keep": keep})
    assert '<option value="Meter A" selected>' in crew.get(address).text


def test_registered_meter_is_known_however_its_name_is_written(crew, address, meters):
    assert crew.post(address, a_form(meter="meter a")).status_code == 303


def test_ph_vertical_soak_and_series_are_stored(crew, address, stored):
    form = a_form(ph="7,9", distance_left_m="3.5", sensor_depth_m="0.6", soak_s="210", do_mg_l="",
                  values="6.1@65/19.8 6.2@100/19.8 6.2@135/19.8 6.3@170/19.8 6.2@205/19.8")  # fmt: skip
    answer = crew.post(address, form)
    (reading,) = stored()
    assert (reading.ph, reading.distance_left_m, reading.soak_s, reading.stable) == (7.9, 3.5, 210.0, True)
    assert reading.series[0] == {"after_s": 65.0, "do_mg_l": 6.1, "water_temp_c": 19.8}
    page = crew.get(answer.location).text
    for words in ("Median of 5 values, 6.10 to 6.30 mg/L", "<dt>pH</dt><dd>7.9", "3.50 m from the left edge", "210 s"):
        assert words in page


def test_unlikely_ph_is_asked_about(crew, address):
    asked = crew.post(address, a_form(ph="9.6"))
    assert asked.status_code == 422 and "pH 9.6 is high" in asked.text


def test_same_values_typed_otherwise_under_one_id_are_refused(crew, address, stored):
    form = a_form(do_mg_l="", values="6.1 6.2")
    assert crew.post(address, form).status_code == 303
    assert crew.post(address, form).status_code == 303
    assert crew.post(address, {**form, "values": "6.2 6.2"}).status_code == 409
    assert len(stored()) == 1


def test_number_in_the_box_that_is_none_of_the_values_is_one_more(crew, address, stored):
    crew.post(address, a_form(do_mg_l="6.4", values="6.1 6.2"))
    (reading,) = stored()
    assert [one["do_mg_l"] for one in reading.series] == [6.1, 6.2, 6.4] and reading.do_mg_l == 6.2


def test_rough_position_is_told_and_not_asked_about(crew, address):
    answer = crew.post(address, a_form(latitude="48.1", longitude="16.4", position_radius_m="35"))
    assert answer.status_code == 303
    assert "The position is only known within 35 m." in crew.get(answer.location).text


def test_unstable_reading_that_waited_for_hours_is_taken_without_a_question(crew, address, stored):
    long_ago = datetime.now(UTC) - timedelta(hours=2)
    form = a_form(do_mg_l="", values="5.8 6.0 6.4 6.1 5.9", saved_at=long_ago.isoformat(), taken_at=typed(long_ago))
    assert crew.post(address, form).status_code == 303
    assert [one.stable for one in stored()] == [False]


def test_check_offers_the_next_point_and_the_repeat_and_their_forms_hold_no_measured_value(crew, address):
    answer = crew.post(address, a_form(position="left", meter="Probe 7", depth_m="1.0"), htmx=True)
    links = [html.unescape(one) for one in re.findall(r'href="(/[^"]+/reading\?[^"]+)"', answer.text)]
    assert [one.partition("?")[2] for one in links] == [
        "position=left&sensor_depth_m=0.2&meter=Probe+7", "position=left&sensor_depth_m=0.8&meter=Probe+7",
        "position=centre&meter=Probe+7", "position=right&meter=Probe+7",
        "position=left&meter=Probe+7&replicate=yes",
    ]  # fmt: skip
    page = crew.get(links[1])
    assert value_of(page, "sensor_depth_m") == "0.8" and '<option value="left" selected>' in page.text
    assert value_of(page, "do_mg_l") == value_of(page, "water_temp_c") == value_of(page, "depth_m") == ""
    assert "checked" in crew.get(links[-1]).text


def test_link_can_set_nothing_that_was_measured(crew, address):
    page = crew.get(address + "?do_mg_l=9.9&water_temp_c=1&note=hello&position=%3Cscript%3E")
    assert value_of(page, "do_mg_l") == "" and ">hello<" not in page.text and "<script>" not in page.text


def test_repeat_tells_its_difference_from_the_reading_at_the_same_point(crew, address):
    early = typed(datetime.now(UTC) - timedelta(minutes=6))
    crew.post(address, a_form(position="left", taken_at=early))
    crew.post(
        address, a_form(do_mg_l="6.3", position="right", taken_at=typed(datetime.now(UTC) - timedelta(minutes=3)))
    )
    answer = crew.post(address, a_form(do_mg_l="6.0", position="left", replicate="yes"))
    page = crew.get(answer.location).text
    assert "The repeat agrees:" in page and "\u22120.10 mg/L from" in page
    assert "A replicate is due" not in page


def test_check_tells_the_section_the_layers_and_whether_the_meter_was_checked(crew, address):
    for oxygen, conductance, where in (("6.1", "410", "left"), ("6.2", "415", "centre"), ("6.4", "470", "right")):
        form = a_form(do_mg_l=oxygen, conductance_us_cm=conductance, position=where, sensor_depth_m="0.2")
        answer = crew.post(address, form)
        assert answer.status_code == 303
    page = crew.get(answer.location).text
    assert "Not mixed: conductance is up to" in page
    assert "oxygen 0.30 mg/L apart, water 0.0 °C warmer or colder, conductance 13.9 % apart" in page
    assert "not checked before" in page
    deep = crew.post(address, a_form(do_mg_l="5.4", position="left", sensor_depth_m="0.8"))
    assert "Layered: the top" in crew.get(deep.location).text


def test_new_folds_keep_the_form_short(crew, address):
    page = crew.get(address).text
    assert page.count('<details class="fold">') == 3 and '<details class="fold" open>' not in page


def test_us_survey_takes_us_units(db, crew, address, survey, stored):
    db.merge(survey).unit_system = "us"
    db.commit()
    crew.post(address, a_form(water_temp_c="68", depth_m="3.28", units="us"))
    (reading,) = stored()
    assert reading.water_temp_c == pytest.approx(20) and reading.depth_m == pytest.approx(1, abs=0.001)


def test_form_that_waited_keeps_the_units_it_was_filled_in_with(db, crew, address, survey, stored):
    db.merge(survey).unit_system = "us"
    db.commit()
    crew.post(address, a_form(units="si"))
    assert [one.water_temp_c for one in stored()] == [19.8]


def test_late_reading_of_this_moment_is_saved_and_told_an_old_time_is_asked_about(crew, address, stored):
    long_ago = typed(datetime.now(UTC) - timedelta(hours=20))
    assert "early for the parcel" in crew.post(address, a_form(taken_at=long_ago)).text
    assert stored() == []
    assert crew.post(address.replace("D2", "D6"), a_form(do_mg_l="4.2")).status_code == 303


def test_replicate_that_differs_is_asked_about(crew, address):
    crew.post(address, a_form())
    assert "They should agree within 0.2" in crew.post(address, a_form(do_mg_l="6.5", replicate="yes")).text


@pytest.mark.parametrize("deed", ["get", "post"])
def test_another_crews_survey_is_not_found(db, survey, browser_as, people, address, deed):
    remove_member(db, survey.id, people["crew"].id, people["office"].id)
    crew = browser_as("crew")
    assert (crew.get(address) if deed == "get" else crew.post(address, a_form())).status_code == 404
    assert db.query(Reading).count() == 0


def test_station_or_reading_that_is_not_there_is_not_found(crew, address, survey):
    assert crew.get(address.replace("D2", "D99")).status_code == 404
    assert crew.post(address.replace("D2", "D99"), a_form()).status_code == 404
    assert crew.get(f"/surveys/{survey.id}/readings/none/check").status_code == 404


def test_stranger_is_sent_to_sign_in(app, address):
    assert "/sign-in" in app.test_client().get(address).location


def test_check_of_a_stored_reading_is_shown_again(crew, address, survey):
    form = a_form()
    crew.post(address, form)
    answer = crew.get(f"/surveys/{survey.id}/readings/{form['submission_id']}/check")
    for words in ("Saturation", "Deficit", "Predicted", "Difference", "Travel time", "standard for the elevation",
                  "fresh water assumed", "Another reading here", "Next: D3", "Field sheet",
                  "The same numbers as a table"):  # fmt: skip
        assert words in answer.text


def test_position_of_the_phone_is_stored_with_its_radius_and_survives_a_bad_field(crew, address, stored):
    where = {"latitude": "48.123456", "longitude": "-16.5", "position_radius_m": "12"}
    again = crew.post(address, a_form(**where, do_mg_l="much"))
    assert value_of(again, "longitude") == "-16.5" and "Position noted, within 12 m." in again.text
    crew.post(address, a_form(**where))
    assert (stored()[0].latitude, stored()[0].longitude, stored()[0].position_radius_m) == (48.123456, -16.5, 12.0)


def test_reading_without_a_complete_plan_says_what_is_missing(db, crew, survey, people, stored):
    put_plan(db, survey, people["lead"], tables={"reaches": [], "waters": [], "weirs": [], "access": [], "basis": [{}],
             "stations": [{"code": "D2", "distance_km": 3.4}]})  # fmt: skip
    address = f"/surveys/{survey.id}/stations/D2/reading"
    answer = crew.post(address, a_form(), htmx=True)
    assert answer.status_code == 200 and "Nothing to compare with" in answer.text and "<svg" not in answer.text


def test_saving_takes_few_queries(app, crew, address, queries_counted):
    with queries_counted() as counted:
        crew.post(address, a_form(), htmx=True)
    assert len(counted) <= 16, counted


@pytest.fixture
def queries_counted(app):
    """A function that returns a context holding the statements sent meanwhile."""

    @contextmanager
    def counting():
        statements = []
        engine = app.extensions["bankside_database"].engine

        def note(_connection, _cursor, statement, *_):
            statements.append(statement)

        event.listen(engine, "before_cursor_execute", note)
        yield statements
        event.remove(engine, "before_cursor_execute", note)

    return counting
