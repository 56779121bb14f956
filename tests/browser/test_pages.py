"""Every page as each person sees it: wide enough, large enough, readable by all, in light and dark."""

import re

import pytest
from playwright.sync_api import expect

from tests.browser import look
from tests.browser.conftest import PHONE, survey_address, watched

READINGS = "Station;Time;Oxygen (mg/L)\nD4;12.8.2026 13:10;{oxygen}"
WEIRS = "Name;Where (km);Drop (m);Water;Shape\nWillow weir;27;{drop};slightly polluted;sharp crest, vertical face"


def at(path):
    """Return an opener of a page of the survey, or of the whole application where the path begins with /."""
    return lambda page, survey: page.goto(path if path.startswith("/") else f"{survey}/{path}")


def first(path, link):
    """Return an opener of the page behind the first link on another page whose address looks like that."""

    def opened(page, survey):
        at(path)(page, survey)
        page.goto(next(one for one in _addresses(page) if re.search(link, one)))

    return opened


def _addresses(page):
    return page.eval_on_selector_all("main a", "links => links.map((one) => one.getAttribute('href'))")


def sent(path, button, heard, **typed):
    """Return an opener that fills in a form's fields by their names, sends it, and waits for words of the answer."""

    def opened(page, survey):
        at(path)(page, survey)
        look.unfold(page)
        for name, text in typed.items():
            page.locator(f"main [name={name}]").first.fill(text)
        page.get_by_role("button", name=button).first.tap()
        expect(page.locator("main")).to_contain_text(heard)

    return opened


CREW = {
    "surveys": at("/"),
    "field sheet": at("sheet"),
    "reading form": at("stations/D5/reading"),
    "reading refused": sent("stations/D5/reading", "Save reading", "Nothing was saved", do_mg_l="six"),
    "reading asked about": sent(
        "stations/D9/reading", "Save reading", "Not saved yet", do_mg_l="16", water_temp_c="31", note="odd"
    ),
    "check": first("sheet", "/check$"),
    "visit form": at("stations/D5/visit"),
    "visit refused": sent("stations/D6/visit", "Save visit", "Nothing was saved", stage_m="low", wading_depth_m="1.3"),
    "visit": sent(
        "stations/D6/visit", "Save visit", "What was saved", stage_m="0.41", float_distance="10", float_times="21"
    ),
    "meters": at("meters"),
    "new meter": at("meters/add"),
    "meter check": at("meters/check"),
    "meter check refused": sent("meters/check", "Save check", "Nothing was saved", value="low"),
    "stored meter check": first("meters", r"/meters/checks?/[0-9a-f-]{36}$"),
    "bottle form": at("stations/D5/bottle"),
    "bottle refused": sent("stations/D5/bottle", "Save bottle", "Nothing was saved", code=""),
    "bottles": at("bottles"),
    "hand-over": at("bottles/hand-over"),
    "sag": at("sag"),
    "readings": at("readings"),
    "reading": first("readings", r"/readings/[0-9a-f-]{36}$"),
    "plan": at("plan"),
    "about": at("about"),
    "password": at("/password"),
    "not for crew": at("plan/reaches/new"),
    "not found": at("/surveys/nowhere/sheet"),
}
LEAD = {
    "plan": at("plan"),
    "old plan": at("plan/versions/1"),
    "reach": at("plan/reaches/1/edit"),
    "reach refused": sent("plan/reaches/1/edit", "Save as version", "Nothing was saved", depth_m="-1"),
    "water": at("plan/waters/1/edit"),
    "new weir": at("plan/weirs/new"),
    "station": at("plan/stations/3/edit"),
    "basis": at("plan/basis/0/edit"),
    "import": at("plan/access/import"),
    "import refused": sent("plan/weirs/import", "Check", "Nothing is imported", text=WEIRS.format(drop="high")),
    "import checked": sent("plan/weirs/import", "Check", "All of it", text=WEIRS.format(drop="0,9")),
    "proposal": at("plan/stations/proposal"),
    "day": at("plan/day"),
    "day refused": sent("plan/day", "Save as version", "Nothing was saved", river_flow_m3_s="a lot"),
    "field sheet": at("sheet"),
    "sag": at("sag"),
    "new survey": at("/surveys/new"),
    "new survey refused": sent("/surveys/new", "Make the survey", "Nothing was saved", name="Alder"),
    "about": at("about"),
    "correction": first("readings?station=D4", r"/readings/[0-9a-f-]{36}$"),
}
OFFICE = {
    "people": at("/people"),
    "person refused": sent("/people", "Make account", "Nothing was saved", name="Dana"),
    "readings": at("readings"),
    "readings of D2": at("readings?station=D2"),
    "reading to correct": at("correcting"),
    "readings import": at("readings/import"),
    "readings import refused": sent(
        "readings/import", "Check the table", "Nothing was imported", text=READINGS.format(oxygen="lots")
    ),
    "readings import checked": sent(
        "readings/import", "Check the table", "1 new reading", text=READINGS.format(oxygen="4,2")
    ),
    "dataset": at("dataset"),
    "dataset import": at("/datasets/import"),
    "review": at("review"),
    "drift": at("review/drift"),
    "evidence": first("review", r"/readings/[0-9a-f-]{36}"),
    "settings": at("settings"),
    "settings refused": sent("settings", "Save", "Nothing was saved", stable_mg_l="much"),
    "approval": at("approval"),
    "laboratory import": at("bottles/import"),
}
PAGES = [(role, name) for role, pages in (("crew", CREW), ("lead", LEAD), ("office", OFFICE)) for name in pages]


def open_page(page, role, name):
    """Open a page by its name here."""
    survey = survey_address(page)
    if name == "password":
        return page.goto(page.get_by_role("link", name="Change password", include_hidden=True).get_attribute("href"))
    if name == "reading to correct":
        first("readings?station=D4", r"/readings/[0-9a-f-]{36}$")(page, survey)
        return page.goto(page.get_by_role("link", name="Correct water temperature").get_attribute("href"))
    return {"crew": CREW, "lead": LEAD, "office": OFFICE}[role][name](page, survey)


def what_is_wrong(page):
    """Return everything that a page on a phone must not be."""
    look.unfold(page)
    wrong = look.wider_than(page, 360) + look.crowded(page) + look.too_small(page) + look.barriers(page)
    wrong += look.barriers_in_the_dark(page)
    return wrong + look.wider_than(page, 320) + look.wider_than(page, 360, text_percent=200)


@pytest.mark.parametrize(("role", "name"), PAGES, ids=lambda one: one.replace(" ", "-"))
def test_a_page_is_for_everybody_on_a_phone(page_as, role, name):
    page = page_as(role)
    open_page(page, role, name)
    assert what_is_wrong(page) == []
    expected = ("status of 404", "status of 403") if name.startswith("not ") else ()
    assert [line for line in page.console_errors if not any(one in line for one in expected)] == []


def test_the_sign_in_is_for_everybody_on_a_phone(browser, demo):
    context = browser.new_context(base_url=demo, **PHONE)
    page = watched(context.new_page())
    sent("/sign-in", "Sign in", "do not fit together", sign_in="nobody", password="nothing")(page, "")
    wrong = what_is_wrong(page) + page.console_errors
    context.close()
    assert wrong == []


def test_a_bad_page_is_found_out(page_as):
    page = page_as("crew")
    page.goto("/")
    page.evaluate("""() => {
      const [heading, button] = [document.querySelector("h1"), document.querySelector(".button")];
      heading.style.color = "#8a8a8a";
      button.style.cssText = "min-height: 0; height: 20px; min-width: 400px";
      button.insertAdjacentHTML("afterend", "<input>");
      document.querySelector("main input").style.fontSize = "12px";
    }""")
    wrong = "; ".join(what_is_wrong(page))
    page.evaluate("document.querySelector('h1').style.color = '#444444'")
    wrong += "; ".join(look.barriers_in_the_dark(page))
    for one in ("px wide", "px high", "written in", "label: ", "color-contrast-enhanced: <h1", "in the dark look, "):
        assert one in wrong
