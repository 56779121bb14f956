"""An open field sheet follows the lead's changes by itself, and leaves the reader where they were."""

import time

import pytest

from tests.browser.conftest import PHONE, serving, sign_in, survey_address, watched


@pytest.fixture
def crew_and_lead(browser, tmp_path):
    """Two phones on a demo of their own: the crew's and the lead's."""
    with serving(tmp_path) as address:
        pages = []
        for role in ("crew", "lead"):
            context = browser.new_context(base_url=address, **PHONE)
            pages.append(watched(context.new_page()))
            sign_in(pages[-1], address, role)
        yield pages
        for page in pages:
            page.context.close()


def add_station(lead, survey, code, km):
    lead.goto(f"{survey}/plan/stations/new")
    lead.get_by_label("Code", exact=True).fill(code)
    lead.get_by_label("Where, below the outfall").fill(km)
    lead.get_by_label("State").select_option("added on site")
    lead.get_by_label("Reason").fill("the sag may be deeper here")
    lead.get_by_label("Why the plan changes").fill("the sag may be deeper here")
    lead.get_by_role("button", name="Save as version").click()
    lead.get_by_role("heading", name="Plan version").wait_for()


def where(page, selector):
    return page.locator(selector).evaluate("one => one.getBoundingClientRect().top")


def test_added_station_reaches_the_open_sheet_within_twenty_seconds_and_disturbs_nobody(crew_and_lead):
    crew, lead = crew_and_lead
    survey = survey_address(crew)
    crew.goto(f"{survey}/sheet")
    crew.evaluate("window.neverReloaded = true")
    crew.get_by_text("More cautions").click()
    link = crew.locator("#read-D5")
    link.scroll_into_view_if_needed()
    link.focus()
    crew.mouse.wheel(0, 120)
    crew.wait_for_timeout(300)
    top = where(crew, "#station-D5")
    add_station(lead, survey, "D2A", "8.2")
    saved = time.monotonic()
    crew.locator("#station-D2A").wait_for(timeout=20_000)
    assert time.monotonic() - saved <= 20
    assert "New since you looked" in crew.locator("#station-D2A").inner_text()
    assert crew.evaluate("window.neverReloaded")
    assert crew.evaluate("document.activeElement.id") == "read-D5"
    assert crew.locator("details.fold", has_text="More cautions").get_attribute("open") is not None
    assert where(crew, "#station-D5") == pytest.approx(top, abs=2)
    assert crew.console_errors == []


def test_moved_release_reaches_the_open_sheet_and_its_mark_ends_with_the_page_after_the_look(crew_and_lead):
    crew, lead = crew_and_lead
    survey = survey_address(crew)
    crew.goto(f"{survey}/sheet")
    lead.goto(f"{survey}/sheet")
    lead.get_by_text("Change the release time").click()
    before = lead.get_by_label("The parcel leaves the outfall at").input_value()
    lead.get_by_label("The parcel leaves the outfall at").fill(f"{before[:-2]}{(int(before[-2:]) + 23) % 60:02d}")
    lead.get_by_role("button", name="Save release time").click()
    news = crew.get_by_role("region", name="New since you looked")
    news.wait_for(timeout=20_000)
    assert "Release:" in news.inner_text()
    crew.reload()
    assert news.count() == 1
    crew.reload()
    assert news.count() == 0
