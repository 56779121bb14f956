"""Waiting readings where browsers give less, plain HTTP on a hotspot's name, and after the whole browser was lost."""

import os
import signal
from pathlib import Path

import pytest
from playwright.sync_api import expect

from tests.browser.conftest import PHONE, sign_in, survey_address, watched
from tests.browser.server import Server
from tests.browser.test_waiting import LINE, fill, kept, save, stored  # noqa: F401
from tests.needs import chromium_path

RULES = "MAP field.test 127.0.0.1, MAP * ~NOTFOUND, EXCLUDE 127.0.0.1, EXCLUDE localhost"
# What a phone hears when it has signal again: it need not sit out the pause between tries.
SIGNAL = "dispatchEvent(new Event('online'))"


@pytest.fixture(scope="module")
def server(tmp_path_factory):
    """A server of this module's own, that its tests kill."""
    server = Server(tmp_path_factory.mktemp("elsewhere"))
    server.start()
    yield server
    server.kill()


@pytest.fixture
def opened(playwright, tmp_path):
    """A function that opens a browser whose storage stays when it is closed, and returns (context, page)."""
    contexts = []

    def launch(address):
        context = playwright.chromium.launch_persistent_context(
            tmp_path / "profile",
            executable_path=chromium_path(),
            args=[f"--host-resolver-rules={RULES}"],
            base_url=address,
            **PHONE,
        )
        contexts.append(context)
        return context, watched(context.new_page())

    yield launch
    for context in contexts:
        context.close()


def test_plain_http_on_a_hotspots_name_keeps_queues_and_sends(opened, server, stored):  # noqa: F811
    address = server.address.replace("127.0.0.1", "field.test")
    _, page = opened(address)
    sign_in(page, address, "crew")
    page.survey = survey_address(page)
    assert page.evaluate("[isSecureContext, 'serviceWorker' in navigator, Boolean(crypto.randomUUID)]") == [False] * 3
    page.goto(page.survey + "/sheet")
    expect(page.get_by_text("This address has no HTTPS, so no page opens here without signal")).to_be_visible()
    page.get_by_role("button", name="Make ready for the river").tap()
    expect(page.get_by_text("The on-site check is on this phone: plan version 1")).to_be_visible(timeout=30000)
    fill(page, "7,1", "hotspot 1")
    server.kill()
    save(page)
    expect(page.get_by_text("Keep this page open")).to_be_visible()
    expect(page.locator("#reading")).to_contain_text("Worked out on this phone from the field pack")
    page.get_by_role("button", name="Another reading here").tap()
    page.get_by_label("Oxygen").fill("7,2")
    page.get_by_label("Water temperature").fill("19")
    page.get_by_text("More about this reading").tap()
    page.get_by_label("Note").fill("hotspot 2")
    save(page)
    expect(page.locator(LINE)).to_contain_text("2 readings wait on this phone")
    server.start()
    # Without signal the pauses between tries grow to a minute.
    expect(page.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=120000)
    assert [one[1:] for one in stored("hotspot")] == [(7.1, "crew"), (7.2, "crew")]


def kill_browser(profile):
    """Kill the browser of a profile at once, as a phone that runs out of battery does; it is a process of this test."""
    for process in Path("/proc").glob("[0-9]*"):
        try:
            command = (process / "cmdline").read_bytes().decode(errors="replace")
        except OSError:  # it ended meanwhile
            continue
        if f"--user-data-dir={profile}" in command and "--type=" not in command:
            os.kill(int(process.name), signal.SIGKILL)


def test_browser_killed_during_entry_and_opened_again_offline_lost_nothing_that_was_typed(
    opened, server, stored, tmp_path  # noqa: F811
):  # fmt: skip
    context, page = opened(server.address)
    sign_in(page, server.address, "crew")
    survey = page.survey = survey_address(page)
    page.goto(survey + "/sheet")
    page.get_by_role("button", name="Make ready for the river").tap()
    expect(page.get_by_text("Ready for the river: plan version 1")).to_be_visible(timeout=60000)
    fill(page, "7,3", "lost browser")
    server.kill()
    save(page)
    expect(page.locator(LINE)).to_contain_text("1 reading waits on this phone")
    page.get_by_role("button", name="Another reading here").tap()
    page.get_by_label("Oxygen").fill("6,9")
    page.wait_for_timeout(150)
    with context.expect_event("close"):
        kill_browser(tmp_path / "profile")
    _, page = opened(server.address)
    page.goto(f"{survey}/stations/D8/reading")
    expect(page.get_by_text("No answer from the server")).to_be_visible()
    expect(page.get_by_text("What you typed at")).to_be_visible()
    assert page.get_by_label("Oxygen").input_value() == "6,9"
    expect(page.locator(LINE)).to_contain_text("1 reading waits on this phone")
    server.start()
    page.evaluate(SIGNAL)
    # A browser writes its cookies to the disk now and then: a killed one may have lost the newest.
    signed_out = page.get_by_text("You are signed out.")
    expect(signed_out.or_(page.locator(LINE, has_text="Nothing waits on this phone"))).to_be_visible(timeout=60000)
    if signed_out.is_visible():
        page.get_by_label("Sign-in name").fill("crew")
        page.get_by_label("Password").fill("river-crew-demo")
        page.get_by_role("button", name="Sign in here").tap()
    expect(page.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    assert kept(page) == [["sent", "7,3"]]
    assert [one[1:] for one in stored("lost browser")] == [(7.3, "crew")]


def test_browser_that_refuses_to_keep_anything_says_so_and_still_sends(opened, server, stored):  # noqa: F811
    context, page = opened(server.address)
    context.add_init_script("Object.defineProperty(window, 'indexedDB', { value: undefined })")
    sign_in(page, server.address, "crew")
    page.survey = survey_address(page)
    fill(page, "7,4", "nothing kept")
    expect(page.get_by_text("This phone keeps nothing for this page.")).to_be_visible()
    expect(page.locator(LINE)).to_contain_text("This phone keeps nothing: save only with signal")
    save(page)
    expect(page.locator("main")).to_contain_text("Saved on the server", timeout=20000)
    assert [one[1:] for one in stored("nothing kept")] == [(7.4, "crew")]
    page.goto("/phone")
    expect(page.get_by_text("Do not record on it.")).to_be_visible()
