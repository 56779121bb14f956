"""Many waiting readings: taken to another phone as a file, sent from two tabs, kept through a lost browser."""

import pytest
from playwright.sync_api import expect

from tests.browser.conftest import PHONE, watched
from tests.browser.test_waiting import LINE, fill, kept, phone, save, server, states, stored  # noqa: F401

# As the version before wrote them: forty readings of one afternoon.
MANY = """async ([survey, note]) => {
  const at = (name) => document.querySelector('script[src*="waiting_line"]').src.replace("waiting_line", name);
  const { keepRecord } = await import(at("waiting_store"));
  const { newId, nowIn, person, phone } = await import(at("phone"));
  for (let number = 0; number < 40; number += 1) {
    const id = newId();
    const fields = { submission_id: id, author_id: person, units: "si", taken_at: nowIn("Etc/GMT+4"), note,
      do_mg_l: String(6 + number / 40), water_temp_c: "19.5", saved_at: new Date(Date.now() - 3600000).toISOString() };
    await keepRecord({ v: 1, id, url: `${survey}/stations/D7/reading`, survey: survey.split("/")[2],
      surveyName: "Sallow Water", code: "D7", fields, author: person,
      authorName: phone.dataset.name, keptAt: Date.now(), state: "waiting",
      reason: "", tries: 0, nextAt: Date.now() + 600000 }, "");
  }
}"""


@pytest.fixture
def loaded(phone):  # noqa: F811
    """A function that puts forty waiting readings with a note on the phone, and leaves it at the page about it."""

    def load(note):
        phone.goto("/phone")
        phone.evaluate(MANY, [phone.survey, note])
        expect(phone.locator(LINE)).to_contain_text("40 readings wait on this phone")

    return load


def test_forty_waiting_survive_a_lost_page_and_an_ended_session_and_go_out_from_two_tabs_once(phone, loaded, stored):  # noqa: F811
    loaded("forty")
    phone.context.clear_cookies()
    phone.get_by_role("button", name="Send now").tap()
    expect(phone.get_by_text("You are signed out.")).to_be_visible()
    expect(phone.locator(LINE)).to_contain_text("40 readings wait on this phone")
    phone.get_by_label("Sign-in name").fill("crew")
    phone.get_by_label("Password").fill("river-crew-demo")
    phone.get_by_role("button", name="Sign in here").tap()
    expect(phone.get_by_text("You are signed out.")).to_be_hidden()
    assert stored("forty") == []
    context = phone.context
    phone.close()
    one, other = context.new_page(), context.new_page()
    for page in (one, other):
        page.goto("/phone")
    for page in (one, other):
        page.evaluate("document.querySelector('[data-send-now]').click()")
    expect(one.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    expect(other.locator(LINE)).to_contain_text("Nothing waits on this phone")
    assert {state for state, _ in kept(one)} == {"sent"}
    assert len(stored("forty")) == len({oxygen for _, oxygen, _ in stored("forty")}) == 40


def test_file_takes_what_waits_to_another_phone_and_to_the_server_and_nothing_doubles(
    browser, phone, loaded, server, states, stored, tmp_path  # noqa: F811
):  # fmt: skip
    loaded("by file")
    with phone.expect_download() as download:
        phone.get_by_role("button", name="Save what waits as a file").tap()
    assert download.value.suggested_filename.startswith("bankside-waiting-")
    download.value.save_as(tmp_path / "copy.json")
    context = browser.new_context(base_url=server.address, storage_state=states["crew"], **PHONE)
    second = watched(context.new_page())
    second.goto("/phone")
    second.get_by_label("A file that another phone saved").set_input_files(tmp_path / "copy.json")
    second.get_by_role("button", name="Take it over on this phone").tap()
    expect(second.get_by_text("40 readings taken over, 0 here already.")).to_be_visible()
    expect(second.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    phone.get_by_label("A file that another phone saved").set_input_files(tmp_path / "copy.json")
    phone.get_by_role("button", name="Store it on the server").tap()
    expect(phone.locator("main")).to_contain_text("0 stored, 40 there already, 0 not stored.")
    phone.goto("/phone")
    phone.get_by_role("button", name="Send now").tap()
    expect(phone.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    assert len(stored("by file")) == 40
    assert second.console_errors == []
    context.close()


def test_page_about_the_phone_tests_its_storage_and_says_what_the_phone_promises(phone):  # noqa: F811
    phone.goto("/phone")
    expect(phone.get_by_text("Writing and reading back works.")).to_be_visible()
    expect(phone.get_by_text("MB of room left")).to_be_visible()
    phone.get_by_role("button", name="Ask this phone to keep it").tap()
    expect(phone.locator("[data-storage-kept]")).to_contain_text("This phone")
    phone.get_by_text("When phones throw things away").tap()
    expect(phone.get_by_text("deleted after seven days without a visit")).to_be_visible()


def test_more_than_a_day_of_waiting_is_warned_about(phone):  # noqa: F811
    phone.goto("/phone")
    phone.evaluate("""async () => {
      const { put, changed } = await import(document.querySelector('script[src*="waiting_line"]').src
        .replace("waiting_line", "waiting_store"));
      const keptAt = Date.now() - 25 * 3600000;
      const author = document.querySelector("#phone").dataset.person;
      await put("waiting", { id: "old", keptAt, state: "waiting", author, authorName: "Cleo Banks", code: "D7",
        fields: { taken_at: "2026-08-12T09:00" }, survey: "x", surveyName: "x", url: "/x", nextAt: keptAt * 2 });
      changed();
    }""")
    expect(phone.locator(LINE)).to_contain_text("That is more than a day: find signal, or save them as a file.")


def test_a_reading_is_on_the_phone_while_nothing_has_been_answered(phone):  # noqa: F811
    unanswered = []
    fill(phone, "7.7", "quick")
    phone.route("**/stations/*/reading", lambda route: unanswered.append(route))
    save(phone)
    expect(phone.locator(LINE)).to_contain_text("1 reading waits on this phone")
    assert [oxygen for _, oxygen in kept(phone)] == ["7.7"]
    for route in unanswered:
        route.continue_()
    expect(phone.locator(LINE)).to_contain_text("Nothing waits on this phone")


def test_five_taps_on_save_at_two_seconds_of_latency_are_one_reading(phone, stored):  # noqa: F811
    fill(phone, "7.8", "five taps")
    button = phone.locator("button.save")
    button.scroll_into_view_if_needed()
    place = button.bounding_box()
    network = {"offline": False, "latency": 2000, "downloadThroughput": -1, "uploadThroughput": -1}
    phone.context.new_cdp_session(phone).send("Network.emulateNetworkConditions", network)
    for _ in range(5):
        phone.touchscreen.tap(place["x"] + place["width"] / 2, place["y"] + place["height"] / 2)
    expect(phone.locator("main")).to_contain_text("Saved on the server", timeout=20000)
    assert len(stored("five taps")) == 1
    assert [state for state, _ in kept(phone)] == ["sent"]


def test_nothing_can_be_typed_that_the_answer_would_take_away_again(phone):  # noqa: F811
    fill(phone, "six", "slow")
    network = {"offline": False, "latency": 1500, "downloadThroughput": -1, "uploadThroughput": -1}
    phone.context.new_cdp_session(phone).send("Network.emulateNetworkConditions", network)
    form = phone.locator("form[data-waiting]")
    phone.locator("button.save").tap()
    expect(form).to_have_attribute("inert", "")
    phone.keyboard.type("7")
    expect(phone.locator("main")).to_contain_text("Nothing was saved", timeout=20000)
    expect(form).not_to_have_attribute("inert", "")
    assert phone.locator("[name=do_mg_l]").input_value() == "six"
    phone.locator("[name=do_mg_l]").fill("7.1")
