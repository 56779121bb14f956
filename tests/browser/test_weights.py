"""How many bytes a phone at the edge of its signal fetches, as they are served: compressed."""

import pytest

from tests.browser.conftest import survey_address
from tests.browser.test_pages import CREW, LEAD, OFFICE, open_page

FIRST_VISIT_LIMIT = 60 * 1024
PAGE_LIMIT = 14 * 1024


@pytest.fixture
def weighed(page_as):
    """A function from a role to a page, and to the list of (kind, file name, bytes of the body) that it fetches."""

    def opened(role):
        page, fetched = page_as(role), []
        page.on("requestfinished", lambda request: fetched.append((request.resource_type, _name(request), request)))
        return page, fetched

    return opened


def _name(request):
    return request.url.split("?")[0].rsplit("/", 1)[-1]


def _bytes(request):
    return request.sizes()["responseBodySize"]


def test_the_first_visit_of_the_reading_form_is_light(page_as, weighed):
    address = f"{survey_address(page_as('crew'))}/stations/D5/reading"
    page, fetched = weighed("crew")
    page.goto(address, wait_until="networkidle")
    weights = {name: _bytes(request) for _, name, request in fetched}
    assert {"reading", "app.css", "htmx.js", "page.js", "reading.js", "bankside.svg"} <= set(weights)
    assert min(weights.values()) > 0
    assert sum(weights.values()) <= FIRST_VISIT_LIMIT, weights


@pytest.mark.parametrize(("role", "names"), [("crew", CREW), ("lead", LEAD), ("office", OFFICE)])
def test_no_page_of_a_phone_is_heavy(weighed, role, names):
    page, fetched = weighed(role)
    for name in names:
        open_page(page, role, name)
    pages = {request.url: _bytes(request) for kind, _, request in fetched if kind in ("document", "xhr")}
    assert len(pages) >= len(names) - 3  # what is refused and what is kept share an address with the form
    assert {address: weight for address, weight in pages.items() if weight > PAGE_LIMIT} == {}


def test_files_are_fetched_once(page_as):
    page = page_as("crew")
    address = f"{survey_address(page)}/stations/D5/reading"
    for code in ("D5", "D6"):
        page.goto(address.replace("D5", code), wait_until="networkidle")
    sent = page.evaluate("performance.getEntriesByType('resource').map((one) => [one.name, one.transferSize])")
    assert len(sent) >= 4
    # The browser asks after the icon again whenever it likes.
    assert [name for name, transferred in sent if transferred and "/icons/" not in name] == []
