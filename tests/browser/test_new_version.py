"""A new version of the program meets phones that carry the one before."""

import shutil

import pytest
from playwright.sync_api import expect

from tests.browser.conftest import PHONE, sign_in, survey_address, watched
from tests.browser.server import ROOT, Server
from tests.browser.test_waiting import LINE, fill, save, stored  # noqa: F401


@pytest.fixture(scope="module")
def server(tmp_path_factory):
    """A server of this module's own."""
    server = Server(tmp_path_factory.mktemp("versions"))
    server.start()
    yield server
    server.kill()


@pytest.fixture
def newer(tmp_path):
    """The folder of a program whose scripts are of another version."""
    for name in ("calc", "webapp", "templates", "static", "demo_survey"):
        shutil.copytree(ROOT / name, tmp_path / "newer" / name, ignore=shutil.ignore_patterns("__pycache__"))
    with (tmp_path / "newer" / "static" / "check.js").open("a") as script:
        script.write("// of the newer version\n")
    return tmp_path / "newer"


def scripts_of(page):
    """Return the mark of the scripts that the page runs."""
    return page.locator('script[src*="waiting_line"]').get_attribute("src").split("/")[2]


def test_new_version_takes_what_the_old_one_kept_and_touches_no_page_in_use(browser, server, newer, stored):  # noqa: F811
    context = browser.new_context(base_url=server.address, **PHONE)
    page = watched(context.new_page())
    sign_in(page, server.address, "crew")
    page.survey = survey_address(page)
    page.goto(page.survey + "/sheet")
    page.get_by_role("button", name="Make ready for the river").tap()
    expect(page.get_by_text("Ready for the river: plan version 1")).to_be_visible(timeout=60000)
    old = scripts_of(page)
    fill(page, "7,1", "old version 1", code="D7")
    server.kill()
    save(page)
    expect(page.locator("main")).to_contain_text("Saved on this phone")
    fill(page, "7,2", "old version 2", code="D8")
    server.code = newer
    server.start()
    expect(page.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    assert page.get_by_label("Oxygen").input_value() == "7,2"
    assert scripts_of(page) == old
    save(page)
    expect(page.locator("main")).to_contain_text("Saved on the server", timeout=20000)
    assert [oxygen for _, oxygen, _ in stored("old version")] == [7.1, 7.2]
    page.goto(page.survey + "/sheet")
    assert scripts_of(page) != old
    expect(page.get_by_text("Ready for the river: plan version 1")).to_be_visible()
    server.kill()
    fill(page, "7,3", "after the new version", code="D9")
    expect(page.get_by_text("No answer from the server")).to_be_visible()
    save(page)
    expect(page.locator("#reading")).to_contain_text("Worked out on this phone from the field pack")
    expect(page.locator(LINE)).to_contain_text("1 reading waits on this phone")
    context.close()
