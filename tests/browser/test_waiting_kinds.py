"""Visits and meter checks without signal: kept, told by their names, sent as what they are and by whom."""

import sqlite3

import pytest
from playwright.sync_api import expect

from tests.browser.conftest import PHONE, survey_address, watched
from tests.browser.test_waiting import LINE, phone, server, states  # noqa: F401

READY = "Ready for the river: plan version 1"


@pytest.fixture(scope="module")
def ready(browser, server, states):  # noqa: F811
    """A crew's phone that was made ready for the river."""
    context = browser.new_context(base_url=server.address, storage_state=states["crew"], **PHONE)
    page = watched(context.new_page())
    page.survey = survey_address(page)
    page.goto(page.survey + "/sheet")
    page.get_by_role("button", name="Make ready for the river").tap()
    expect(page.get_by_text(READY)).to_be_visible(timeout=60000)
    yield page
    context.close()


def faults(page):
    """Return what the page's console calls an error, other than that nobody answered."""
    return [line for line in page.console_errors if "ERR_" not in line and not line.startswith("htmx:")]


@pytest.fixture
def rows(server):  # noqa: F811
    """A function to the rows that a query finds in the server's database."""

    def found(query, *values):
        with sqlite3.connect(f"file:{server.data_dir}/bankside.sqlite3?mode=ro", uri=True) as db:
            return db.execute(query, values).fetchall()

    return found


ENTRIES = (
    "select code, count(distinct visit.id), count(*), max(sign_in) from visit_entry join visit on visit.id = visit_id "
    "join station on station.id = station_id join person on person.id = author_id "
    "where visit_id in (select visit_id from visit_entry where facts like ?) group by code"
)

CHECKS = (
    "select meter.name, value, expected, sign_in from meter_check join meter on meter.id = meter_id "
    "join person on person.id = author_id where meter_check.note = ?"
)


def test_check_and_visit_without_signal_are_judged_on_the_phone_and_arrive_as_what_they_are(ready, server, rows):  # noqa: F811
    server.kill()
    said = checked_without_signal(ready)
    ready.goto(ready.survey + "/stations/D6/visit")
    ready.get_by_label("Depth there").fill("1,2")
    ready.get_by_label("Velocity there").fill("0,9")
    expect(ready.locator("#wading")).to_contain_text("Do not wade. Depth times velocity is 1.08 m²/s (11.6 ft²/s).")
    ready.get_by_label("How do you get to the water?").select_option("bridge")
    ready.get_by_label("Stage").fill("0,41")
    ready.get_by_text("Crew and note").tap()
    ready.get_by_label("Note").fill("at dusk, no signal")
    ready.get_by_role("button", name="Save visit").tap()
    kept = ready.locator("#visit")
    expect(kept).to_contain_text("Saved on this phone, not on the server yet")
    expect(kept).to_contain_text("Do not wade.")
    expect(ready.locator(LINE)).to_contain_text("1 visit entry and 1 meter check wait on this phone")
    expect(ready.get_by_role("link", name="Read at D6")).to_be_visible()
    ready.goto(ready.survey + "/stations/D6/visit")
    expect(ready.get_by_text("what you add belongs to it.")).to_be_visible()
    assert ready.get_by_label("Stage").input_value() == "0,41"
    expect(ready.locator("#wading")).to_contain_text("Do not wade.")
    ready.get_by_text("Leaving", exact=True).tap()
    ready.get_by_role("button", name="We leave now").tap()
    ready.get_by_label("The visit is").select_option("complete")
    ready.get_by_role("button", name="Save visit").tap()
    expect(ready.locator(LINE)).to_contain_text("2 visit entries and 1 meter check wait on this phone")
    ready.goto(ready.survey + "/sheet")
    expect(ready.locator("#station-D6")).to_contain_text("2 visit entries on this phone, not sent yet")
    ready.goto(ready.survey + "/stations/D6/visit")
    expect(ready.get_by_role("heading", name="Arrive at D6")).to_be_visible()
    assert ready.get_by_label("Stage").input_value() == ""
    server.start()
    expect(ready.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    [(name, value, expected, who)] = rows(CHECKS, "no signal here")
    assert (name, value, who) == ("Meter B", 8.61, "crew")
    assert f"{expected:.2f} mg/L" in said
    assert rows(ENTRIES, "%at dusk, no signal%") == [("D6", 1, 2, "crew")]
    ready.goto("/phone")
    expect(ready.locator("[data-sent]")).to_contain_text("Visit at D6, ")
    ready.get_by_role("link", name="See it").first.tap()
    expect(ready.get_by_role("heading", name="Visit at D6")).to_be_visible()
    expect(ready.locator("#visit")).to_contain_text("0.410 m")
    expect(ready.locator("#visit")).to_contain_text("complete")
    assert ready.get_by_text("saved twice").count() == 0
    assert faults(ready) == []


def checked_without_signal(ready):
    """Save a meter check and return the numbers that the phone then shows."""
    ready.goto(ready.survey + "/sheet")
    ready.get_by_role("link", name="Meters", exact=True).tap()
    expect(ready.get_by_role("heading", name="Meter check: oxygen")).to_be_visible()
    ready.get_by_label("Meter", exact=True).select_option("Meter B")
    ready.get_by_label("Which check").select_option("as_found")
    ready.get_by_label("Against").select_option("air_saturated_water")
    ready.get_by_label("Temperature there").fill("19,4")
    ready.get_by_label("Air pressure as shown").fill("731")
    ready.get_by_label("Where it comes from").select_option("barometer")
    ready.get_by_label("What the meter shows").fill("8,61")
    ready.get_by_text("More about this check").tap()
    ready.get_by_label("Note").fill("no signal here")
    ready.get_by_role("button", name="Save check").tap()
    kept = ready.locator("#check")
    expect(kept).to_contain_text("Saved on this phone, not on the server yet")
    expect(kept.locator("h1")).to_contain_text("Meter check, Meter B, ")
    expect(ready.locator(LINE)).to_contain_text("1 meter check waits on this phone")
    expect(kept).to_contain_text("mg/L from what it should show.")
    return kept.locator("dl").inner_text()


# As the scripts keep them: readings, visits and meter checks of one afternoon, forty in all.
FORTY = """async ([survey, meter]) => {
  const at = (name) => document.querySelector('script[src*="waiting_line"]').src.replace("waiting_line", name);
  const { keepRecord } = await import(at("waiting_store"));
  const { newId, nowIn, person, phone } = await import(at("phone"));
  const now = nowIn("Etc/GMT+4"), station = `${survey}/stations/D7`;
  const kinds = [
    { url: `${station}/reading`, fields: { taken_at: now, do_mg_l: "6.5", water_temp_c: "19.5" } },
    { kind: "visit", url: `${station}/visit`, what: "Visit at D7", fields: { arrived_at: now, crew: "Cleo" } },
    { kind: "check", url: `${survey}/meters/check`, what: "Meter check, Meter A", fields: { taken_at: now, meter,
      kind: "field", parameter: "do", standard: "air_saturated_water", value: "8.9", water_temp_c: "19" } },
  ];
  for (let number = 0; number < 40; number += 1) {
    const id = newId(), { fields, ...of } = kinds[number % 3];
    const all = { ...fields, submission_id: id, author_id: person, units: "si", note: "forty of a kind",
      saved_at: new Date(Date.now() - 3600000).toISOString() };
    await keepRecord({ v: 1, id, code: "D7", survey: survey.split("/")[2], surveyName: "Sallow Water", ...of,
      fields: all, author: person, authorName: phone.dataset.name, keptAt: Date.now() + number, state: "waiting",
      reason: "", tries: 0, nextAt: Date.now() + 600000 }, "");
  }
}"""
STORED = (
    "select sign_in, count(*) from (select author_id from reading where note = ?1 union all "
    "select author_id from meter_check where note = ?1 union all "
    "select author_id from visit_entry where facts like '%' || ?1 || '%') "
    "join person on person.id = author_id group by sign_in"
)


def test_forty_unsent_with_an_expired_session_and_another_user_signing_in_lose_none_and_none_goes_under_a_wrong_name(
    phone, rows  # noqa: F811
):  # fmt: skip
    [(meter,)] = rows(
        "select meter.id from meter where name = 'Meter A' and survey_id = ?", phone.survey.rsplit("/", 1)[1]
    )
    phone.goto("/phone")
    phone.evaluate(FORTY, [phone.survey, meter])
    waits = "14 readings, 13 visit entries and 13 meter checks"
    expect(phone.locator(LINE)).to_contain_text(f"{waits} wait on this phone")
    phone.context.clear_cookies()
    phone.get_by_role("button", name="Send now").tap()
    expect(phone.get_by_text("You are signed out.")).to_be_visible()
    sign_in_over_the_page(phone, "lead", "river-lead-demo")
    expect(phone.locator(LINE)).to_contain_text(f"{waits} by Cleo Banks wait until they sign in.")
    phone.get_by_role("button", name="Send now").tap()
    phone.goto(phone.survey + "/sheet")
    expect(phone.locator(LINE)).to_contain_text(f"{waits} by Cleo Banks wait until they sign in.")
    assert rows(STORED, "forty of a kind") == []
    phone.context.clear_cookies()
    phone.goto("/phone")
    phone.get_by_label("Sign-in name").fill("crew")
    phone.get_by_label("Password").fill("river-crew-demo")
    phone.get_by_role("button", name="Sign in").tap()
    expect(phone.get_by_role("heading", name="What waits on this phone")).to_be_visible()
    phone.evaluate("document.querySelector('[data-send-now]').click()")
    expect(phone.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    assert rows(STORED, "forty of a kind") == [("crew", 40)]


def sign_in_over_the_page(page, name, password):
    page.get_by_label("Sign-in name").fill(name)
    page.get_by_label("Password").fill(password)
    page.get_by_role("button", name="Sign in here").tap()
    page.get_by_text("You are signed out.").wait_for(state="hidden")


ROUND = """async (records) => {
  const at = (name) => document.querySelector('script[src*="waiting_line"]').src.replace("waiting_line", name);
  const { asFile, asLetters, fromFile, fromLetters } = await import(at("copies"));
  return records.map((one) => [fromLetters(asLetters(one)), fromFile(asFile([one]))]);
}"""


@pytest.mark.parametrize(
    ("kind", "url"),
    [
        (None, "/surveys/s/stations/D%207/reading"),
        ("reading", "/surveys/s/stations/D%207/reading"),
        ("visit", "/surveys/s/stations/D%207/visit"),
        ("bottle", "/surveys/s/stations/D%207/bottle"),
        ("check", "/surveys/s/meters/check"),
    ],
)
def test_code_and_file_carry_every_kind_to_its_own_address_and_to_no_other(phone, kind, url):  # noqa: F811
    phone.goto("/phone")
    record = {"v": 1, "id": "a", "survey": "s", "surveyName": "S", "code": "D 7", "author": "c", "authorName": "Cleo",
              "state": "waiting", "keptAt": 1}  # fmt: skip
    record["fields"] = {"submission_id": "a", "taken_at": "2026-08-12T09:00"}
    record |= {"kind": kind, "what": "one"} if kind else {}
    elsewhere = [record | {"url": one} for one in ("/sign-out", "/surveys/s/plan", "//far.test/surveys/s/meters/check")]
    [(code, file), *others] = phone.evaluate(ROUND, [record | {"url": url}, *elsewhere])
    assert code == record | {"url": url, "tries": 0}
    assert file == [record | {"url": url}]
    assert others == [[None, None]] * 3
