import gzip
import hashlib
from importlib.resources import files

import pytest

OFFICIAL_HTMX_2_0_3 = "491955cd1810747d7d7b9ccb936400afb760e06d25d53e4572b64b6563b2784e"


def test_htmx_is_the_official_release(app):
    served = app.test_client().get("/htmx.js").data
    assert hashlib.sha256(served).hexdigest() == OFFICIAL_HTMX_2_0_3
    assert served == (files("js_lib_htmx") / "static/htmx/htmx.min.js").read_bytes()


def test_no_page_allows_inline_script_or_style(app):
    answer = app.test_client().get("/sign-in")
    policy = answer.headers["Content-Security-Policy"]
    assert "unsafe" not in policy
    assert "default-src 'none'" in policy
    assert "style=" not in answer.text
    assert "<style" not in answer.text


@pytest.mark.parametrize(
    "path", ["/nothing", "/surveys/%00/about", "/surveys/x/about?a=%00", "/people/../../etc/passwd", "/static/no"]
)
def test_addresses_that_lead_nowhere_say_so_kindly(browser_as, path):
    answer = browser_as("crew").get(path)
    assert answer.status_code == 404
    assert "Go to your surveys" in answer.text


def test_pages_are_never_kept_by_a_cache_between_people(browser_as):
    assert browser_as("crew").get("/").headers["Cache-Control"] == "no-store"


def test_dark_look_is_remembered_and_only_leads_back_here(browser_as):
    browser = browser_as("crew")
    answer = browser.post("/look", {"back": "//elsewhere.example/x"})
    assert answer.headers["Location"] in ("/", "/x")
    assert 'data-look="dark"' in browser.get("/").text
    browser.post("/look", {"back": "/"})
    assert 'data-look="light"' in browser.get("/").text


def test_look_is_switched_also_where_the_way_back_is_no_address(browser_as):
    assert browser_as("crew").post("/look", {"back": "//["}).headers["Location"] == "/"


def test_an_upload_that_is_too_large_is_told_so(browser_as):
    answer = browser_as("office").post("/surveys/new", {"name": "x" * (6 * 1024 * 1024)})
    assert answer.status_code == 413
    assert "at most 5 MB" in answer.text


def test_a_phone_that_takes_gzip_gets_pages_and_files_compressed(app):
    client = app.test_client()
    for path in ("/sign-in", "/htmx.js", "/static/app.css"):
        plain, packed = client.get(path), client.get(path, headers={"Accept-Encoding": "gzip"})
        assert packed.headers["Content-Encoding"] == "gzip"
        assert len(packed.data) < len(plain.data) / 2
        assert int(packed.headers["Content-Length"]) == len(packed.data)
    assert gzip.decompress(packed.data) == plain.data


def test_a_browser_without_gzip_gets_them_plain(app):
    answer = app.test_client().get("/static/app.css")
    assert "Content-Encoding" not in answer.headers
    assert "Accept-Encoding" in answer.headers["Vary"]
