"""The reading form under a thumb: how many taps a station takes, and a timed reading."""

import uuid
from datetime import UTC, datetime, timedelta

import pytest
from playwright.sync_api import expect

from calc.settings import Settings
from tests.browser.conftest import survey_address
from webapp.display import Show
from webapp.readings import meaning
from webapp.readings.forms import parse_reading
from webapp.readings.settling import settle

MOST_TAPS = 12
COUNT = """document.addEventListener("touchstart", () => {
  sessionStorage.taps = Number(sessionStorage.taps ?? 0) + 1;
}, { capture: true, passive: true });"""


@pytest.fixture
def thumb(page_as):
    """A crew's phone with the field sheet open, which from there on counts every touch of the page."""
    page = page_as("crew")
    page.add_init_script(COUNT)
    page.goto(survey_address(page) + "/sheet")
    page.evaluate("sessionStorage.taps = 0")
    page.taps = lambda: int(page.evaluate("sessionStorage.taps"))
    return page


def type_into(page, label, text):
    """Tap a box and type on the phone's keyboard, which is no touch of the page."""
    page.get_by_label(label, exact=True).tap()
    page.keyboard.type(text)


def goes_on(page, code):
    """Save, see the check, and tap on to the next station's form."""
    page.get_by_role("button", name="Save reading").tap()
    expect(page.locator("#reading")).to_contain_text("Saved on the server")
    expect(page.locator("#reading h1")).to_contain_text(f"{code},")
    page.get_by_role("link", name="Next: ").tap()
    page.get_by_role("heading", name="Reading at ").wait_for()


def test_a_station_takes_at_most_twelve_taps_from_the_sheet_to_the_next_form(thumb):
    thumb.locator("#read-D8").tap()
    type_into(thumb, "Oxygen", "5,9")
    type_into(thumb, "Water temperature", "20,1")
    goes_on(thumb, "D8")
    assert thumb.taps() <= MOST_TAPS
    assert thumb.taps() == 5
    assert thumb.console_errors == []


def test_a_timed_reading_of_five_values_takes_at_most_twelve_taps(thumb):
    began = datetime.now(UTC)
    thumb.locator("#read-D8").tap()
    thumb.get_by_text("Timed reading").tap()
    thumb.clock.set_fixed_time(began)
    thumb.get_by_role("button", name="Start").tap()
    for seconds, value in ((65, "6,1"), (100, "6,3"), (135, "6,2"), (170, "6,2"), (205, "6,2")):
        thumb.clock.set_fixed_time(began + timedelta(seconds=seconds))
        thumb.keyboard.type(value)
        thumb.get_by_role("button", name="Take value").tap()
    assert thumb.get_by_label("Values, one after the other").input_value().split() == [
        "6,1@65", "6,3@100", "6,2@135", "6,2@170", "6,2@205"
    ]  # fmt: skip
    type_into(thumb, "Water temperature", "20,1")
    thumb.get_by_role("button", name="Save reading").tap()
    expect(thumb.locator("#reading")).to_contain_text("Median of 5 values, 6.10 to 6.30 mg/L at the end: stable.")
    assert thumb.locator(".oxygen-now").inner_text().startswith("6.20")
    thumb.get_by_role("link", name="Next: ").tap()
    thumb.get_by_role("heading", name="Reading at ").wait_for()
    assert thumb.taps() <= MOST_TAPS


def test_enter_takes_a_value_while_the_clock_runs_and_says_what_is_missing(thumb):
    thumb.locator("#read-D9").tap()
    thumb.get_by_text("Timed reading").tap()
    thumb.get_by_role("button", name="Take value").tap()
    expect(thumb.get_by_text("Enter the oxygen that the meter shows")).to_be_visible()
    thumb.get_by_label("Water temperature").fill("20,3")
    thumb.get_by_role("button", name="Start").tap()
    thumb.keyboard.type("5,1")
    thumb.keyboard.press("Enter")
    expect(thumb.get_by_text("1 value: 5,1")).to_be_visible()
    assert thumb.get_by_label("Values, one after the other").input_value().startswith("5,1@")
    assert thumb.get_by_label("Values, one after the other").input_value().endswith("/20,3")
    assert thumb.get_by_label("Oxygen", exact=True).input_value() == ""
    thumb.reload()
    expect(thumb.get_by_label("Values, one after the other")).to_have_value("5,1@0/20,3")
    expect(thumb.get_by_text("s since the probe went in")).to_be_visible()
    thumb.get_by_role("button", name="Begin afresh").tap()


VALUES = [
    ("", "6.1 6.3 6.2 6.2 6.2", 6.2),
    ("", "9,9@10 6,1@65/20 6,3@100 6,2@135 6,2@170 6,1@205", 6.2),
    ("6.4", "6.1 6.2", 6.2),
    ("6.2", "6.1; 6.2", 6.15),
    ("6.4", "", 6.4),
]


def test_phone_takes_the_median_that_the_server_takes(page_as):
    page = page_as("crew")
    survey = survey_address(page)
    page.goto(f"{survey}/stations/D8/reading")
    found = page.evaluate(
        """async ([address, rows]) => {
          const pack = await (await fetch(address)).json();
          const script = [...document.scripts].find((one) => one.src.includes("/kept.js")).src;
          const { checkOnPhone } = await import(script.replace("kept.js", "check.js"));
          return rows.map(([do_mg_l, values]) => checkOnPhone(pack, {
            code: "D8", fields: { units: "si", do_mg_l, values, water_temp_c: "20", taken_at: "2026-08-12T10:00" },
          }).oxygen);
        }""",
        [f"{survey}/fieldpack", VALUES],
    )
    assert found == pytest.approx([oxygen for _, _, oxygen in VALUES])
    now = datetime.now(UTC)
    forms = [{"submission_id": str(uuid.uuid4()), "do_mg_l": box, "values": text, "water_temp_c": "20",
              "taken_at": "2026-08-12T10:00"} for box, text, _ in VALUES]  # fmt: skip
    news = [settle(parse_reading(form, Show(), "D8", now)[0], Settings()) for form in forms]
    assert [one.do_mg_l for one in news] == pytest.approx(found)


@pytest.mark.parametrize(
    ("oxygen", "low", "high"), [(5.1, 4.6, 5.8), (5.5, 5.1, 5.3), (4.3, 1.9, 7.0), (6.4, 4.6, 5.8)]
)
def test_phone_calls_a_reading_as_predicted_where_the_server_does(page_as, oxygen, low, high):
    page = page_as("crew")
    page.goto(f"{survey_address(page)}/stations/D8/reading")
    says = page.evaluate(
        """async (check) => {
          const script = [...document.scripts].find((one) => one.src.includes("/kept.js")).src;
          return (await import(script.replace("kept.js", "check_words.js"))).sentence(check);
        }""",
        {"oxygen": oxygen, "predicted": 5.2, "low": low, "high": high},
    )
    facts = meaning.Facts("D8", oxygen, predicted_mg_l=5.2, low_mg_l=low, high_mg_l=high, limb=meaning.LOWEST)
    assert says.split(":")[0].split(". ")[0] == meaning.sentence(facts).split(":")[0]
