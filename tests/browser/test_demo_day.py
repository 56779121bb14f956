"""The demo day on phones, tap by tap, from the crew's sign-in to the office's dataset."""

import csv
import zipfile

import pytest
from frictionless import Package
from playwright.sync_api import expect

from calc.oxygen import saturation_mg_l, station_pressure_mmhg
from tests.browser.conftest import survey_address

ELEVATION_M = 310.0
READ_IN_THE_MORNING = 8


def test_a_day_from_the_sign_in_to_the_dataset(phone_of, tmp_path):
    crew = phone_of("crew")
    survey = survey_address(crew)
    _reads_d5_with_a_weather_reports_pressure(crew)
    _goes_on_to_d6_and_keeps_an_unlikely_value(crew)
    planned = _parcel_at_d7(crew, survey)
    lead = phone_of("lead")
    _sees_the_reading_on_the_sag_page(lead, survey)
    _changes_the_plan_on_site(lead)
    assert _parcel_at_d7(crew, survey) != planned
    office = phone_of("office")
    _corrects(office, survey)
    _sets_aside(office, survey)
    _takes_the_dataset_home(office, survey, tmp_path)


def _reads_d5_with_a_weather_reports_pressure(page):
    page.get_by_role("link", name="Field sheet", exact=True).first.tap()
    page.get_by_role("link", name="Read at D5").tap()
    page.get_by_label("Oxygen").fill("4,05")
    page.get_by_label("Water temperature").fill("20,1")
    page.get_by_label("Depth of the water here").fill("0.8")
    page.get_by_text("More about this reading").tap()
    page.get_by_label("Air pressure as shown").fill("762")
    page.get_by_label("Where it comes from").select_option("weather")
    page.evaluate("window.stillHere = true")
    page.get_by_role("button", name="Save reading").tap()
    page.get_by_text("Saved on the server").wait_for()
    assert page.evaluate("window.stillHere") is True
    pressure = float(station_pressure_mmhg(762.0, ELEVATION_M))
    saturation = float(saturation_mg_l(20.1, pressure))
    shown = page.inner_text("#reading")
    assert f"{pressure:.0f} mmHg, from a weather report" in shown
    assert f"{100 * 4.05 / saturation:.0f} % of {saturation:.2f} mg/L" in shown
    assert f"{saturation - 4.05:.2f} mg/L" in shown
    assert "4.05 mg/L" in shown and "Difference" in shown
    assert page.locator("svg.sag").first.is_visible()


def _goes_on_to_d6_and_keeps_an_unlikely_value(page):
    page.get_by_role("link", name="Next: D6").tap()
    page.get_by_role("heading", name="Reading at D6").wait_for()
    page.get_by_label("Oxygen").fill("3.5")
    page.get_by_label("Water temperature").fill("31")
    page.get_by_role("button", name="Save reading").tap()
    page.get_by_text("Not saved yet.").wait_for()
    assert page.get_by_label("Water temperature").input_value() == "31"
    page.get_by_role("button", name="as it is").or_(page.get_by_role("button", name="as they are")).tap()
    page.get_by_text("Saved on the server").wait_for()
    assert page.get_by_role("heading", name="Asked, and kept").is_visible()


def _parcel_at_d7(page, survey):
    page.goto(f"{survey}/sheet")
    return page.locator("#station-D7 .small").first.inner_text()


def _sees_the_reading_on_the_sag_page(page, survey):
    page.goto(survey + "/sag")
    assert "mg/L at D6" in page.locator(".oxygen-now").inner_text()
    assert page.get_by_role("link", name="Read 4.05 at").is_visible()
    expect(page.locator("svg.sag").first.locator(".mark-used")).to_have_count(READ_IN_THE_MORNING + 2)


def _changes_the_plan_on_site(page):
    page.get_by_role("link", name="Plan", exact=True).tap()
    page.get_by_text("Reaches ·").tap()
    page.get_by_role("link", name="Change Long straight").tap()
    before = page.locator("#line").inner_text()
    page.get_by_label("Mean velocity").fill("0,30")
    expect(page.locator("#line")).not_to_have_text(before, use_inner_text=True)
    page.get_by_role("button", name="Save as version 2").tap()
    page.get_by_text("Nothing was saved yet.").wait_for()
    assert page.get_by_label("Mean velocity").input_value() == "0,30"
    page.get_by_label("Why the plan changes").first.fill("slower than planned, by a float at D4")
    page.get_by_role("button", name="Save as version 2").tap()
    page.get_by_role("heading", name="Plan version 2").wait_for()
    assert page.get_by_text("slower than planned, by a float at D4").is_visible()


def _corrects(page, survey):
    page.goto(survey + "/readings")
    page.get_by_role("link", name="D6").tap()
    page.get_by_role("link", name="Correct water temperature").tap()
    page.get_by_label("Water temperature", exact=True).fill("21,0")
    page.get_by_role("button", name="Save correction").tap()
    page.get_by_text("Nothing was saved yet.").wait_for()
    page.get_by_label("Reason").fill("the meter's log says 21.0")
    page.get_by_role("button", name="Save correction").tap()
    page.get_by_text("corrected from 31.0 °C").wait_for()
    assert page.get_by_text("the meter's log says 21.0").is_visible()


def _sets_aside(page, survey):
    page.goto(survey + "/readings?station=D3")
    page.locator("#readings-table tbody").get_by_role("link", name="D3").tap()
    page.get_by_label("Set it aside, because").fill("percent and mg/L do not fit together")
    page.get_by_role("button", name="Set aside").tap()
    page.get_by_text("Set aside: not used.").wait_for()


def _takes_the_dataset_home(page, survey, folder):
    page.goto(survey + "/readings")
    page.get_by_role("link", name="Dataset").tap()
    with page.expect_download() as download:
        page.get_by_role("link", name="Download the zip").tap()
    download.value.save_as(folder / "dataset.zip")
    with zipfile.ZipFile(folder / "dataset.zip") as file:
        file.extractall(folder / "dataset")
    report = Package(str(folder / "dataset" / "datapackage.json")).validate()
    assert report.valid, report.flatten(["rowNumber", "fieldName", "message"])
    with (folder / "dataset" / "readings.csv").open(encoding="utf-8", newline="") as file:
        latest = {row["station_code"]: row for row in csv.DictReader(file)}
    assert (latest["D5"]["do_mg_l_as_typed"], latest["D5"]["do_mg_l_final"]) == ("4,05", "4.05")
    assert float(latest["D5"]["pressure_mmhg_final"]) == pytest.approx(
        float(station_pressure_mmhg(762.0, ELEVATION_M)), abs=0.01
    )
    assert (latest["D6"]["water_temp_c_raw"], latest["D6"]["water_temp_c_final"]) == ("31", "21")
    assert "percent and mg/L do not fit together" in latest["D3"].values()


def test_an_impossible_value_is_refused_beside_its_field_and_typing_stays(page_as):
    page = page_as("crew")
    page.goto(f"{survey_address(page)}/stations/D9/reading")
    page.get_by_label("Oxygen").fill("7,9")
    page.get_by_label("Water temperature").fill("1,234")
    page.get_by_label("Depth of the water here").fill("-3")
    page.get_by_text("More about this reading").tap()
    page.get_by_label("Note").fill("gravel, clear")
    page.get_by_role("button", name="Save reading").tap()
    page.get_by_text("Nothing was saved yet.").wait_for()
    assert "1.234 or 1234" in page.locator("#water_temp_c-error").inner_text()
    assert "must lie between" in page.locator("#depth_m-error").inner_text()
    assert page.evaluate("document.activeElement.id") == "water_temp_c"
    typed = [page.locator(f"#{name}").input_value() for name in ("do_mg_l", "water_temp_c", "depth_m", "note")]
    assert typed == ["7,9", "1,234", "-3", "gravel, clear"]
    assert page.console_errors == []


def test_five_quick_taps_on_save_give_one_reading(page_as):
    page = page_as("crew")
    survey = survey_address(page)
    page.goto(f"{survey}/stations/D8/reading")
    page.get_by_label("Oxygen").fill("7.4")
    page.get_by_label("Water temperature").fill("19.9")
    button = page.get_by_role("button", name="Save reading")
    button.scroll_into_view_if_needed()
    place = button.bounding_box()
    _slow_down(page, latency_ms=1200)
    for _ in range(5):
        page.touchscreen.tap(place["x"] + place["width"] / 2, place["y"] + place["height"] / 2)
    page.get_by_text("Saved on the server").wait_for()
    page.goto(f"{survey}/sheet")
    expect(page.locator("#station-D8")).to_contain_text("1 reading,")
    assert page.console_errors == []


def _slow_down(page, latency_ms):
    network = {"offline": False, "latency": latency_ms, "downloadThroughput": -1, "uploadThroughput": -1}
    page.context.new_cdp_session(page).send("Network.emulateNetworkConditions", network)
