"""What waits on a phone, against a server that is killed, hangs, or loses its answers."""

import sqlite3

import pytest
from playwright.sync_api import expect

from tests.browser.conftest import PHONE, sign_in, survey_address, watched
from tests.browser.server import Server

LINE = "[data-waiting-line]"


@pytest.fixture(scope="module")
def server(tmp_path_factory):
    """A server of this module's own, that its tests kill."""
    server = Server(tmp_path_factory.mktemp("waiting"))
    server.start()
    yield server
    server.kill()


@pytest.fixture(scope="module")
def states(browser, server):
    """The cookies of crew and lead."""
    kept = {}
    for role in ("crew", "lead"):
        context = browser.new_context()
        sign_in(context.new_page(), server.address, role)
        kept[role] = context.storage_state()
        context.close()
    return kept


@pytest.fixture
def phone(browser, server, states):
    """A page on a phone of its own with the crew signed in; the server runs."""
    if server.process.poll() is not None:
        server.start()
    context = browser.new_context(base_url=server.address, storage_state=states["crew"], **PHONE)
    page = watched(context.new_page())
    page.survey = survey_address(page)
    yield page
    context.close()


@pytest.fixture
def stored(server):
    """A function to the stored readings whose note begins with these words: (id, oxygen, author's sign-in)."""

    def rows(note):
        query = (
            "select reading.id, do_mg_l, sign_in from reading join person on person.id = author_id "
            "where note like ? order by do_mg_l"
        )
        with sqlite3.connect(f"file:{server.data_dir}/bankside.sqlite3?mode=ro", uri=True) as db:
            return db.execute(query, (note + "%",)).fetchall()

    return rows


def fill(page, oxygen, note, code="D8"):
    """Type a reading into the form of a station, and leave it there."""
    page.goto(f"{page.survey}/stations/{code}/reading")
    page.get_by_label("Oxygen").fill(oxygen)
    page.get_by_label("Water temperature").fill("19.9")
    page.get_by_text("More about this reading").tap()
    page.get_by_label("Note").fill(note)


def save(page):
    page.get_by_role("button", name="Save reading").tap()


def kept(page):
    """Return what the phone keeps, as (state, oxygen as typed)."""
    return page.evaluate("""async () => {
      const { records } = await import(document.querySelector('script[src*="waiting_line"]').src
        .replace("waiting_line", "waiting_store"));
      return (await records()).map((one) => [one.state, one.fields.do_mg_l]);
    }""")


def test_saved_while_the_server_is_dead_waits_and_arrives_once(phone, server, stored):
    fill(phone, "7,1", "dead")
    server.kill()
    save(phone)
    expect(phone.locator("main")).to_contain_text("Saved on this phone, not on the server yet")
    expect(phone.locator(LINE)).to_contain_text("1 reading waits on this phone, since")
    phone.get_by_role("button", name="Another reading here").tap()
    phone.get_by_label("Oxygen").fill("7,2")
    phone.get_by_label("Water temperature").fill("19,8")
    phone.get_by_text("More about this reading").tap()
    phone.get_by_label("Note").fill("dead too")
    save(phone)
    expect(phone.locator(LINE)).to_contain_text("2 readings wait on this phone")
    server.start()
    expect(phone.locator("main")).to_contain_text("Saved on the server", timeout=30000)
    expect(phone.locator(LINE)).to_contain_text("Nothing waits on this phone")
    assert kept(phone) == [["sent", "7,1"], ["sent", "7,2"]]
    assert [(oxygen, author) for _, oxygen, author in stored("dead")] == [(7.1, "crew"), (7.2, "crew")]


def test_reply_lost_after_the_commit_gives_one_reading(phone, stored):
    fill(phone, "7.3", "lost reply")

    def lose(route):
        route.fetch()
        route.abort()

    phone.route("**/stations/D8/reading", lose, times=1)
    save(phone)
    expect(phone.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=20000)
    expect(phone.locator("main")).to_contain_text("Saved on the server")
    assert len(stored("lost reply")) == 1
    assert kept(phone) == [["sent", "7.3"]]


def test_server_that_hangs_and_goes_on_stores_once(phone, server, stored):
    fill(phone, "7.4", "hangs")
    server.hang()
    save(phone)
    expect(phone.locator("main")).to_contain_text("Saved on this phone", timeout=12000)
    server.go_on()
    expect(phone.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=40000)
    assert len(stored("hangs")) == 1


def test_what_is_half_typed_is_there_again_after_the_tab_went_away(phone):
    fill(phone, "6,", "half typed")
    context = phone.context
    phone.wait_for_timeout(150)
    phone.close(run_before_unload=False)
    page = context.new_page()
    page.goto(f"{phone.survey}/stations/D8/reading")
    expect(page.get_by_text("What you typed at")).to_be_visible()
    assert page.get_by_label("Oxygen").input_value() == "6,"
    assert page.get_by_label("Note").input_value() == "half typed"
    page.get_by_role("button", name="Begin afresh").tap()
    expect(page.get_by_label("Oxygen")).to_have_value("")


def test_sign_in_expired_keeps_the_list_and_goes_on_after_signing_in_over_the_page(phone, stored):
    fill(phone, "7.5", "expired")
    cookies = phone.context.cookies()
    phone.context.clear_cookies()
    save(phone)
    expect(phone.get_by_text("You are signed out.")).to_be_visible()
    expect(phone.locator(LINE)).to_contain_text("1 reading waits on this phone")
    assert cookies and stored("expired") == []
    phone.get_by_label("Sign-in name").fill("crew")
    phone.get_by_label("Password").fill("wrong")
    phone.get_by_role("button", name="Sign in here").tap()
    expect(phone.get_by_text("do not fit together")).to_be_visible()
    phone.get_by_label("Password").fill("river-crew-demo")
    phone.get_by_role("button", name="Sign in here").tap()
    expect(phone.locator("main")).to_contain_text("Saved on the server", timeout=20000)
    assert [author for *_, author in stored("expired")] == ["crew"]


def test_reading_of_the_first_person_waits_while_the_second_is_signed_in(phone, server, states, stored):
    fill(phone, "7.6", "first person")
    server.kill()
    save(phone)
    expect(phone.locator("main")).to_contain_text("Saved on this phone")
    server.start()
    phone.context.clear_cookies()
    phone.context.add_cookies(states["lead"]["cookies"])
    phone.goto(phone.survey + "/sheet")
    expect(phone.locator(LINE)).to_contain_text("1 reading by Cleo Banks waits until they sign in.")
    phone.goto("/phone")
    phone.get_by_role("button", name="Send now").tap()
    expect(phone.locator("[data-unsent]")).to_contain_text("Waits until Cleo Banks signs in")
    phone.wait_for_timeout(1000)
    assert stored("first person") == []
    phone.context.clear_cookies()
    phone.context.add_cookies(states["crew"]["cookies"])
    phone.goto("/phone")
    expect(phone.locator("[data-sent]")).to_contain_text("7.6 mg/L", timeout=20000)
    assert [author for *_, author in stored("first person")] == ["crew"]


def test_refused_reading_stays_until_it_is_corrected(phone, server, stored):
    fill(phone, "16", "refused", code="D9")
    phone.get_by_label("Water temperature").fill("31")
    server.kill()
    save(phone)
    expect(phone.locator("main")).to_contain_text("Saved on this phone")
    phone.goto("about:blank")
    server.start()
    phone.goto(phone.survey + "/sheet")
    expect(phone.locator(LINE)).to_contain_text("1 reading needs another look", timeout=20000)
    phone.locator(LINE).get_by_role("link").tap()
    phone.get_by_role("link", name="Correct and save again").tap()
    expect(phone.get_by_label("Oxygen")).to_have_value("16")
    phone.get_by_label("Oxygen").fill("7,6")
    phone.get_by_label("Water temperature").fill("20")
    save(phone)
    expect(phone.locator("main")).to_contain_text("Saved on the server")
    expect(phone.locator(LINE)).to_contain_text("Nothing waits on this phone")
    assert [oxygen for _, oxygen, _ in stored("refused")] == [7.6]
