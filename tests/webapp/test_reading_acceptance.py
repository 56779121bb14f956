"""What a crew may expect of a reading, as the trade's acceptance list has it: one test for each line of the list."""

import html
import re
import uuid
from datetime import UTC, datetime, timedelta

import pytest

from tests.webapp.plans import put_plan
from webapp.readings import queries
from webapp.readings.judging import judgement_of
from webapp.readings.new import NewReading
from webapp.readings.service import add_reading


@pytest.fixture
def version(db, survey, people):
    survey = db.merge(survey)
    survey.release_at = datetime.now(UTC) - timedelta(hours=3)
    return put_plan(db, survey, people["lead"])


@pytest.fixture
def crew(browser_as):
    return browser_as("crew")


@pytest.fixture
def save(crew, survey, version):
    """A function that sends a reading at D2; what the form holds may be changed by name."""

    def sent(**more):
        now = datetime.now(UTC).isoformat(timespec="minutes")
        form = {"submission_id": str(uuid.uuid4()), "taken_at": now, "do_mg_l": "6.1", "water_temp_c": "19.8", **more}
        return form, crew.post(f"/surveys/{survey.id}/stations/D2/reading", form)

    return sent


@pytest.fixture
def stored(db, survey):
    """A function that returns the readings that are stored."""

    def read():
        db.rollback()
        return queries.readings_of(db, survey.id)

    return read


def asked(answer):
    """Return what a refused save asks about, as one text."""
    assert answer.status_code == 422
    return html.unescape(" ".join(re.findall(r"<strong>([^<]+)</strong>", answer.text)))


def keeping(answer):
    """Return what the button that keeps the reading sends."""
    return html.unescape(re.search(r'name="keep" value="([^"]+)"', answer.text)[1])


def test_762_mmhg_at_500_m_warns_of_a_sea_level_value_offers_718_and_tells_the_effect(db, survey, save, stored):
    db.merge(survey).elevation_m = 500.0
    db.commit()
    _, answer = save(pressure="762", pressure_source="barometer", pressure_unit="mm[Hg]", water_temp_c="20")
    assert "sea-level pressure" in asked(answer)
    effect = float(re.search(r"saturation ([\d.]+) mg/L too high", answer.text)[1])
    assert effect == pytest.approx(0.54, abs=0.02)  # field table: 0.54 mg/L at 500 m
    save(pressure="762", pressure_source="barometer", pressure_unit="mm[Hg]", water_temp_c="20",
         use="sea_level_pressure")  # fmt: skip
    (reading,) = stored()
    assert (round(reading.pressure_mmhg), reading.entered["pressure"]["text"]) == (718, "762")


def test_295_in_the_mmhg_box_is_offered_as_inches_of_mercury(save):
    _, answer = save(pressure="29.5", pressure_source="meter", pressure_unit="mm[Hg]")
    assert "inHg" in asked(answer) and "Use 29.5 inHg" in answer.text


def test_68_between_stations_of_20_degrees_is_offered_as_fahrenheit(db, survey, people, version, save, stored):
    for code in ("D1", "D3"):
        new = NewReading(str(uuid.uuid4()), code, datetime.now(UTC), do_mg_l=6.2, water_temp_c=20.2)
        add_reading(db, survey, new, people["crew"].id, version, new.taken_at)
    _, answer = save(water_temp_c="68")
    assert "nearby it is 20.2 °C" in asked(answer) and "Use 20 °C" in answer.text
    save(water_temp_c="68", use="temperature_unit")
    assert 20.0 in [one.water_temp_c for one in stored()]


@pytest.mark.parametrize("text", ["8,1", "8.1"])
def test_decimal_comma_and_decimal_point_are_the_same_number(save, stored, text):
    assert save(do_mg_l=text)[1].status_code == 303
    assert [one.do_mg_l for one in stored()] == [8.1]


def test_1_234_is_asked_about_wherever_it_is_typed(save, stored):
    for field in ("do_mg_l", "values", "conductance_us_cm"):
        assert "Say which you mean: 1,234" in html.unescape(save(**{field: "1,234"})[1].text)
    assert stored() == []


@pytest.mark.parametrize("box", ["", "6.2"])
def test_five_values_within_the_limit_are_stable_and_their_median_is_the_reading(crew, save, stored, box):
    _, answer = save(do_mg_l=box, values="6.1 6.3 6.2 6.2 6.2")
    assert answer.status_code == 303
    (reading,) = stored()
    assert (reading.do_mg_l, reading.stable, len(reading.series)) == (6.2, True, 5)
    assert reading.entered["values"]["text"] == "6.1 6.3 6.2 6.2 6.2"
    assert "stable." in crew.get(answer.location).text


def test_values_from_58_to_64_are_not_stable_and_saved_with_a_reason_only(crew, save, stored):
    form, answer = save(do_mg_l="", values="5.8 6.0 6.4 6.1 5.9")
    assert "Not stable" in asked(answer) and 'name="unstable_reason"' in answer.text
    again = save(**{**form, "keep": keeping(answer)})[1]
    assert again.status_code == 422 and "Say why it is saved although it had not settled." in again.text
    assert stored() == []
    kept = save(**{**form, "keep": keeping(answer), "unstable_reason": "gusts on the pool"})[1]
    (reading,) = stored()
    assert (reading.do_mg_l, reading.stable, reading.unstable_reason) == (6.0, False, "gusts on the pool")
    assert "unstable" in {one["name"] for one in reading.kept_findings}
    page = crew.get(kept.location).text
    assert "not stable" in page and "gusts on the pool" in page


@pytest.mark.parametrize("text", ["0.00", "-0.05"])
def test_no_oxygen_is_stored_as_it_was_read_and_told_as_below_the_limit(db, crew, survey, save, stored, text):
    form, answer = save(do_mg_l=text)
    saved = save(**{**form, "keep": keeping(answer)})[1]
    (reading,) = stored()
    assert reading.do_mg_l == float(text) and reading.entered["do_mg_l"]["text"] == text
    assert "below_limit" in judgement_of(db, survey).by_id[reading.id].reasons
    assert "tell from zero" in crew.get(saved.location).text


def test_182_percent_of_saturation_is_asked_about_and_taken(crew, save, stored):
    form, answer = save(do_mg_l="16.2", note="bubbles on the weed, meter read twice")
    assert "182 % saturation" in asked(answer)
    saved = save(**{**form, "keep": keeping(answer)})[1]
    (reading,) = stored()
    assert reading.do_mg_l == 16.2 and "supersaturation" in {one["name"] for one in reading.kept_findings}
    assert "182 %" in crew.get(saved.location).text
