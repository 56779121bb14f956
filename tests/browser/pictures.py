"""Makes the README's pictures: `python -m tests.browser.pictures` takes them from a demo of its own."""

import tempfile
from pathlib import Path

from playwright.sync_api import sync_playwright

from tests.browser.conftest import PASSWORDS, PHONE, serving, survey_address
from tests.needs import chromium_path

FOLDER = Path(__file__).resolve().parent.parent.parent / "demo_survey" / "pictures"
SCREEN = PHONE | {"device_scale_factor": 1.5}
LARGEST = 120_000


def main():
    """Take every picture and say how large it became."""
    FOLDER.mkdir(exist_ok=True)
    with tempfile.TemporaryDirectory() as data, serving(data) as address, sync_playwright() as play:
        browser = play.chromium.launch(executable_path=chromium_path())
        crew, lead, office = (_signed_in(browser, address, role) for role in ("crew", "lead", "office"))
        _the_plan(office)
        _the_meters(crew)
        _the_field_sheet(crew)
        _a_reading_and_its_check(crew)
        _the_sag(lead)
        _the_readings(office)
        _the_review_and_the_drift(lead)
        browser.close()


def _signed_in(browser, address, role):
    page = browser.new_context(base_url=address, **SCREEN).new_page()
    name, password = PASSWORDS[role]
    page.goto("/sign-in")
    page.get_by_label("Sign-in name").fill(name)
    page.get_by_label("Password").fill(password)
    page.get_by_role("button", name="Sign in").tap()
    page.get_by_role("heading", name="Surveys").wait_for()
    return page


def _take(page, name, first):
    """Save what the screen shows, with an element at its top."""
    page.locator(first).first.evaluate("one => window.scrollTo(0, one.getBoundingClientRect().top + scrollY - 8)")
    path = FOLDER / f"{name}.png"
    page.screenshot(path=path)
    if path.stat().st_size > LARGEST:
        raise SystemExit(f"{path.name} has {path.stat().st_size} bytes, more than {LARGEST}")
    print(f"{path.name}: {path.stat().st_size // 1000} kB")


def _the_plan(page):
    page.goto(f"{survey_address(page)}/plan")
    _take(page, "plan", ".top")


def _the_meters(page):
    page.goto(f"{survey_address(page)}/meters")
    _take(page, "meters", "h1")


def _the_field_sheet(page):
    page.goto(f"{survey_address(page)}/sheet")
    _take(page, "fieldsheet", ".next-stop")


def _a_reading_and_its_check(page):
    page.get_by_role("link", name="Read at D5").tap()
    page.get_by_label("Oxygen").fill("4,05")
    page.get_by_label("Water temperature").fill("20,1")
    page.get_by_label("Depth of the water here").fill("0,8")
    page.evaluate("document.activeElement.blur()")
    _take(page, "reading", ".top")
    page.get_by_role("button", name="Save reading").tap()
    page.get_by_text("Saved on the server").wait_for()
    _take(page, "check", "#reading")


def _the_sag(page):
    page.goto(f"{survey_address(page)}/sag")
    _take(page, "sag", "h1")


def _the_readings(page):
    page.goto(f"{survey_address(page)}/readings")
    _take(page, "readings", ".top")


def _the_review_and_the_drift(page):
    survey = survey_address(page, "Sallow Water, July low flow")
    page.goto(f"{survey}/review")
    _take(page, "review", "h1")
    page.goto(f"{survey}/review/drift")
    _take(page, "drift", "main section.card")


if __name__ == "__main__":
    main()
