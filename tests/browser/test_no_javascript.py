"""Everything works with JavaScript off: each form is a form, each answer a page."""

import pytest
from playwright.sync_api import expect

from tests.browser.conftest import PHONE, sign_in, survey_address

WEIRS = "Name;Where (km);Drop (m);Water;Shape\nWillow weir;27;{drop};slightly polluted;sharp crest, vertical face"


@pytest.fixture
def plain(page_as):
    """A function from a role to a page without JavaScript, signed in as that role."""
    return lambda role: page_as(role, java_script_enabled=False)


def test_a_reading_is_saved_and_checked(browser, demo):
    context = browser.new_context(base_url=demo, java_script_enabled=False, **PHONE)
    page = context.new_page()
    sign_in(page, demo, "crew")
    page.get_by_role("link", name="Field sheet", exact=True).first.tap()
    page.get_by_role("link", name="Read here, D7").tap()
    page.get_by_label("Oxygen").fill("5,1")
    page.get_by_label("Water temperature").fill("20")
    page.get_by_role("button", name="Save reading").dblclick()
    page.get_by_role("heading", name="D7,").wait_for()
    assert "Saved on the server" in page.inner_text("main")
    assert "5.10 mg/L" in page.inner_text("main") and "Deficit" in page.inner_text("main")
    page.get_by_role("link", name="Field sheet").last.tap()
    expect(page.locator("#station-D7")).to_contain_text("1 reading,")
    context.close()


def test_a_visit_is_saved_gone_on_with_and_left(plain):
    page = plain("crew")
    survey = survey_address(page)
    page.goto(f"{survey}/sheet")
    page.get_by_role("link", name="Arrive, D9").tap()
    page.get_by_label("Depth there").fill("1,3")
    page.get_by_label("Velocity there").fill("0,9")
    page.get_by_label("Stage").fill("0,4x")
    page.get_by_role("button", name="Save visit").tap()
    expect(page.locator("#wading")).to_contain_text("Do not wade.")
    expect(page.locator("#stage_m-error")).to_contain_text("as a number")
    page.get_by_label("Stage").fill("0,4")
    page.get_by_role("button", name="Save visit").tap()
    expect(page.get_by_role("heading", name="Visit at D9")).to_be_visible()
    expect(page.locator("main")).to_contain_text("0.400 m")
    page.get_by_role("link", name="Leave").tap()
    page.get_by_role("button", name="Save visit").tap()
    expect(page.locator("main")).to_contain_text("Saved on the server. Cleo Banks, until")


def test_a_refused_reading_stays_as_typed(plain):
    page = plain("crew")
    page.goto(f"{survey_address(page)}/stations/D9/reading")
    page.get_by_label("Oxygen").fill("six")
    page.get_by_label("Water temperature").fill("20,5")
    page.get_by_role("button", name="Save reading").tap()
    expect(page.locator("#do_mg_l-error")).to_contain_text("as a number")
    assert page.get_by_label("Oxygen").input_value() == "six"
    assert page.get_by_label("Water temperature").input_value() == "20,5"


def test_the_sag_of_a_typed_row_is_shown_and_nothing_saved(plain):
    page = plain("lead")
    survey = survey_address(page)
    page.goto(f"{survey}/plan/waters/1/edit")
    planned = page.locator("#line").inner_text()
    page.get_by_label("BOD5").first.fill("124")
    page.get_by_role("button", name="Show the sag").tap()
    expect(page.locator("#line")).not_to_have_text(planned, use_inner_text=True)
    assert page.get_by_label("BOD5").first.input_value() == "124"
    page.goto(f"{survey}/plan/waters/1/edit")
    assert page.locator("#line").inner_text() == planned


def test_a_pasted_table_is_taken_once_it_is_right(plain):
    page = plain("lead")
    survey = survey_address(page)
    page.goto(f"{survey}/plan/weirs/import")
    page.get_by_label("Cells copied").fill(WEIRS.format(drop="high"))
    page.get_by_role("button", name="Check").tap()
    expect(page.get_by_role("alert")).to_contain_text("Nothing is imported until this is right")
    expect(page.get_by_role("alert")).to_contain_text("Row 2, Drop")
    page.get_by_label("Cells copied").fill(WEIRS.format(drop="0,9"))
    page.get_by_role("button", name="Check again").tap()
    expect(page.get_by_role("status")).to_contain_text("All of it can be taken")
    page.get_by_label("Why the plan changes").fill("drop levelled again")
    page.get_by_role("button", name="Save as version").tap()
    page.get_by_role("heading", name="Plan version").wait_for()
    expect(page.locator("#weirs")).to_contain_text("0.90 m")
    expect(page.get_by_text("drop levelled again")).to_be_visible()


def test_readings_are_filtered_and_set_aside(plain):
    page = plain("office")
    page.goto(f"{survey_address(page)}/readings")
    page.get_by_text("Filter").tap()
    page.get_by_label("Station", exact=True).select_option("D4")
    page.get_by_role("button", name="Show these").tap()
    page.locator("tbody").get_by_role("link", name="D4").tap()
    page.get_by_label("Set it aside, because").fill("the probe was not settled")
    page.get_by_role("button", name="Set aside").tap()
    expect(page.locator("main")).to_contain_text("Set aside: not used. the probe was not settled")
