"""How fast a phone is without a server, and what it carries. Run: python -m tests.bench.phone"""

import gzip
import statistics
import tempfile
import time
from pathlib import Path

from playwright.sync_api import sync_playwright

from tests.browser.conftest import PHONE, sign_in, survey_address
from tests.browser.server import Server
from tests.needs import chromium_path

RUNS = 9
RULES = "MAP * ~NOTFOUND, EXCLUDE 127.0.0.1, EXCLUDE localhost"
WATCH = """() => {
  window.written = undefined;
  document.querySelector("button.save").addEventListener("click", () => { window.tapped = performance.now(); }, true);
  document.addEventListener("bankside:waiting", () => { window.written ??= performance.now() - window.tapped; });
}"""


def main():
    """Print the medians."""
    with tempfile.TemporaryDirectory() as folder, sync_playwright() as playwright:
        server = Server(Path(folder) / "data")
        server.start()
        browser = playwright.chromium.launch(executable_path=chromium_path(), args=[f"--host-resolver-rules={RULES}"])
        context = browser.new_context(base_url=server.address, **PHONE)
        try:
            _measure(server, context)
        finally:
            browser.close()
            server.kill()


def _measure(server, context):
    page = context.new_page()
    sign_in(page, server.address, "crew")
    survey = survey_address(page)
    page.goto(survey + "/sheet")
    page.get_by_role("button", name="Make ready for the river").tap()
    page.get_by_text("Ready for the river: plan version 1").wait_for(timeout=60000)
    pack = page.request.get(f"{survey}/fieldpack").body()
    page.close()
    server.kill()
    print(f"field pack of the demo, compressed: {len(gzip.compress(pack, 5)) / 1000:.1f} kB")
    print(f"field sheet without a server, from a cold tab: {statistics.median(_starts(context, survey)):.0f} ms")
    print(f"from the tap on save to written on the phone: {statistics.median(_saves(context, survey)):.0f} ms")


def _starts(context, survey):
    for _ in range(RUNS):
        page = context.new_page()
        start = time.monotonic()
        page.goto(survey + "/sheet", wait_until="commit")
        page.get_by_role("heading", name="Stations in order").wait_for()
        yield 1000 * (time.monotonic() - start)
        page.close()


def _saves(context, survey):
    page = context.new_page()
    for _ in range(RUNS):
        page.goto(f"{survey}/stations/D8/reading")
        page.get_by_label("Oxygen").fill("7.1")
        page.get_by_label("Water temperature").fill("19.9")
        page.evaluate(WATCH)
        page.get_by_role("button", name="Save reading").tap()
        page.get_by_text("Saved on this phone").wait_for()
        yield page.evaluate("window.written")


if __name__ == "__main__":
    main()
