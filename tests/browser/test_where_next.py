"""The lead's page and a crew's phone on the demo day: where next, followed twice, turns open into held."""

import re
from datetime import UTC, datetime

from playwright.sync_api import expect

from calc.critical import critical_point
from calc.sag import predict
from demo_survey import make
from tests.browser.conftest import survey_address

TRUE_RIVER = make.true_river()
ERRORS_MG_L = (0.05, -0.04)


def test_following_where_next_twice_turns_open_into_held(phone_of):
    lead, crew = phone_of("lead"), phone_of("crew")
    survey = survey_address(lead)
    _is_where_the_sun_stays_up(lead, survey)
    lead.goto(f"{survey}/sag")
    answer = lead.locator(".answer")
    for error in ERRORS_MG_L:
        expect(answer).to_contain_text(re.compile(r"^Open below: the lowest reading, .* is your last station"))
        _reads(crew, survey, *_adds_the_first_place(lead), error)
        lead.goto(f"{survey}/sag")
    truth = critical_point(TRUE_RIVER)
    expect(answer).to_contain_text("Held: the low point")
    place = lead.locator("dt", has_text="Its place").locator("+ dd").inner_text()
    low_km, high_km = map(float, re.search(r"\(([\d.]+) to ([\d.]+)\)", place).groups())
    assert low_km < truth.distance_km < high_km
    lowest = lead.locator("dt", has_text="Lowest oxygen").locator("+ dd").inner_text()
    low, high = map(float, re.search(r"\(([\d.]+) to ([\d.]+)\)", lowest).groups())
    assert low < truth.do_mg_l < high
    _leaves(lead)


def _is_where_the_sun_stays_up(lead, survey):
    """Type a position without night: daylight limits the day, and this test runs at any hour of any season."""
    north = 80 <= datetime.now(UTC).timetuple().tm_yday < 265
    lead.goto(f"{survey}/plan/day")
    lead.get_by_text("the place for the sunset").tap()
    lead.get_by_label("Latitude").fill("89" if north else "-89")
    lead.get_by_label("Longitude").fill("0")
    lead.get_by_label("Why the plan changes").fill("Where we are")
    lead.get_by_role("button", name="Save as version 2").tap()
    lead.wait_for_url(f"**{survey}/sheet*")


def _adds_the_first_place(lead):
    """Take the first place offered, send the crew there, and return code, distance and whether it is new."""
    offer = lead.locator(".offer").first
    distance_km = float(re.search(r"([\d.]+) km below the outfall", offer.inner_text())[1])
    button = offer.get_by_role("button").first
    code = re.search(r"(?:as|to) (\w+)", button.get_attribute("aria-label"))[1]
    added = button.get_attribute("aria-label").startswith("Add")
    button.tap()
    if added:
        lead.get_by_text(f"{code} is added").wait_for()
        lead.get_by_role("button", name=f"Cleo Banks reads {code}").tap()
        expect(lead.get_by_text("Who reads it?")).to_have_count(0)
    return code, distance_km, added


def _reads(crew, survey, code, distance_km, added, error_mg_l):
    """Read the true river at a station, from the field sheet."""
    state = predict(TRUE_RIVER, distance_km)
    crew.goto(f"{survey}/sheet")
    card = crew.locator(f"#station-{code}")
    if added:  # a station that was planned is everybody's
        expect(card).to_contain_text("For you")
    card.get_by_role("link", name=f"Read here, {code}").tap()
    crew.get_by_label("Oxygen").fill(f"{float(state.do_mg_l) + error_mg_l:.2f}")
    crew.get_by_label("Water temperature").fill(f"{float(state.water_temp_c):.1f}")
    crew.get_by_role("button", name="Save reading").tap()
    crew.get_by_text("Saved on the server").wait_for()
    crew.get_by_text("from today's sag").wait_for()
    shown = crew.inner_text("#reading")
    assert "from the plan" in shown and "the low point" in shown
    expect(crew.locator("svg.sag .line-today").first).to_be_attached()


def _leaves(lead):
    lead.get_by_label("Everybody is off the water").check()
    lead.get_by_role("button", name="We leave").tap()
    lead.get_by_role("heading", name="Decisions").wait_for()
    latest = lead.locator("section[aria-labelledby=decisions] li").first
    expect(latest).to_contain_text("We leave")
    expect(latest).to_contain_text("On the screen: Held:")
    expect(latest).to_contain_text("1 of 5 checked by hand.")
