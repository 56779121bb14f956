"""HTTPS on a name that is not localhost, in a Chromium that trusts only the authority the server made."""

import hashlib
import os
import subprocess
import sys
import time
import urllib.request
from contextlib import contextmanager
from types import SimpleNamespace

import pytest
from playwright.sync_api import Error, expect

from tests.browser.conftest import PHONE, free_port, sign_in, watched
from tests.browser.test_pages import what_is_wrong
from tests.needs import certutil_path, chromium_path
from webapp import authority as authorities
from webapp.reach import host_name

NAME = f"{host_name()}.local"
SECONDS_TO_START = 40  # on a machine that is busy with other tests


@contextmanager
def serving_https(data_dir):
    """Run `bankside demo --https`; give its ports, both addresses under NAME, and its authority."""
    port, plain_port = free_port(), free_port()
    environ = {name: value for name, value in os.environ.items() if not name.startswith("BANKSIDE_")}
    arguments = ["demo", "--https", "--data", str(data_dir), "--host", "127.0.0.1"]
    arguments += ["--port", str(port), "--http-port", str(plain_port)]
    program = [sys.executable, "-c", "from webapp.cli import main; main()", *arguments]
    process = subprocess.Popen(program, env=environ, stdout=subprocess.PIPE, text=True)
    try:
        _wait_for(f"http://127.0.0.1:{plain_port}/trust", process)
        authority = authorities.read_or_make(data_dir)
        yield SimpleNamespace(
            secure=f"https://{NAME}:{port}", plain=f"http://{NAME}:{plain_port}", authority=authority, process=process
        )
    finally:
        process.terminate()
        process.communicate(timeout=10)


def _wait_for(address, process):
    end = time.monotonic() + SECONDS_TO_START
    while time.monotonic() < end:
        if process.poll() is not None:
            raise RuntimeError("the server stopped before it served")
        try:
            urllib.request.urlopen(address, timeout=2)
            return
        except OSError:
            time.sleep(0.1)
    raise RuntimeError("the server did not answer in time")


@pytest.fixture(scope="module")
def served(tmp_path_factory):
    """A demo by HTTPS."""
    with serving_https(tmp_path_factory.mktemp("https")) as served:
        yield served


def browser_of(playwright, home):
    """Return a Chromium whose home, and so whose store of authorities, is a folder of its own."""
    rules = f"MAP {NAME} 127.0.0.1, MAP * ~NOTFOUND, EXCLUDE 127.0.0.1, EXCLUDE localhost"
    arguments = [f"--host-resolver-rules={rules}"]
    environ = {**os.environ, "HOME": str(home)}
    return playwright.chromium.launch(executable_path=chromium_path(), args=arguments, env=environ)


@pytest.fixture(scope="module")
def trusting(playwright, served, tmp_path_factory):
    """A Chromium that was told to trust the authority, as the trust page's steps do on a phone."""
    home = tmp_path_factory.mktemp("home")
    store = home / ".pki" / "nssdb"
    store.mkdir(parents=True)
    certificate = home / "bankside.crt"
    certificate.write_bytes(served.authority.der)
    certutil = certutil_path()
    subprocess.run([certutil, "-d", f"sql:{store}", "-N", "--empty-password"], check=True)
    subprocess.run(
        [certutil, "-d", f"sql:{store}", "-A", "-t", "C,,", "-n", "bankside", "-i", str(certificate)], check=True
    )
    browser = browser_of(playwright, home)
    yield browser
    browser.close()


@pytest.fixture
def phone(trusting):
    """A page on a phone that trusts the authority."""
    context = trusting.new_context(**PHONE)
    yield watched(context.new_page())
    context.close()


def open_invitations(page):
    """Go from the list of surveys to the page that invites phones."""
    survey = page.get_by_role("link", name="Sallow Water, August low flow").get_attribute("href")
    page.goto(f"{page.url.rstrip('/')}{survey.removesuffix('/sheet')}/about")
    page.get_by_role("link", name="Invite a phone").click()
    page.wait_for_url("**/invitations")


def test_a_browser_that_was_not_told_to_trust_the_authority_refuses(playwright, served, tmp_path):
    browser = browser_of(playwright, tmp_path)
    with pytest.raises(Error, match="ERR_CERT_AUTHORITY_INVALID"):
        browser.new_page().goto(f"{served.secure}/sign-in")
    browser.close()


def test_a_phone_that_trusts_the_authority_can_do_everything(phone, served):
    phone.context.grant_permissions(["geolocation"], origin=served.secure)
    phone.context.set_geolocation({"latitude": 47.5, "longitude": 15.5})
    sign_in(phone, served.secure, "crew")
    assert phone.evaluate("isSecureContext && 'serviceWorker' in navigator && 'randomUUID' in crypto")
    position = "new Promise((yes, no) => navigator.geolocation.getCurrentPosition((at) => yes(at.coords.latitude), no))"
    assert phone.evaluate(position) == 47.5
    worker = "navigator.serviceWorker.register('/worker.js').then(() => navigator.serviceWorker.ready)"
    assert phone.evaluate(f"{worker}.then((ready) => ready.active !== null)")
    assert phone.context.cookies()[0]["secure"]
    phone.goto(f"{served.secure}/trust")
    expect(phone.locator("main")).to_contain_text("This connection can do everything")
    assert phone.console_errors == []


def test_the_plain_port_leads_a_phone_to_the_steps_the_certificate_and_on(phone, served):
    phone.goto(f"{served.plain}/surveys/x/sheet")
    assert phone.url == f"{served.plain}/trust"
    expect(phone.locator("main")).to_contain_text("This connection is plain HTTP")
    assert phone.evaluate("isSecureContext") is False
    with phone.expect_download() as waiting:
        phone.get_by_role("link", name="Download the certificate").tap()
    with open(waiting.value.path(), "rb") as file:
        given = hashlib.sha256(file.read()).digest().hex(" ")
    assert given.upper() == phone.locator(".fingerprint").inner_text().strip()
    phone.get_by_role("link", name="Open it by HTTPS").tap()
    expect(phone.get_by_role("heading", name="Sign in")).to_be_visible()
    assert phone.url.startswith(served.secure)


def test_an_invitation_signs_a_phone_in_over_https(phone, trusting, served):
    desk = trusting.new_context().new_page()
    sign_in(desk, served.secure, "lead")
    open_invitations(desk)
    desk.get_by_label("Whose phone").select_option(label="Cleo Banks, crew")
    desk.get_by_role("button", name="Make the code").click()
    link = desk.locator(".fingerprint a").get_attribute("href")
    assert desk.locator("img.qr").evaluate("(one) => one.naturalWidth") > 100
    phone.goto(link)
    phone.get_by_role("button", name="Sign in as Cleo Banks").tap()
    expect(phone.get_by_text("Cleo Banks").first).to_be_visible()
    assert "/sheet" in phone.url
    desk.goto(desk.url)
    desk.get_by_role("button", name="Sign this phone out").first.click()
    phone.goto(f"{served.secure}/")
    expect(phone.get_by_role("heading", name="Sign in")).to_be_visible()
    desk.context.close()


def test_the_pages_are_for_everybody_on_a_phone(phone, served):
    phone.goto(f"{served.plain}/trust")
    assert what_is_wrong(phone) == []
    ignored = "Cross-Origin-Opener-Policy header has been ignored"  # as a browser says of every plain page
    assert [line for line in phone.console_errors if ignored not in line] == []
    phone.console_errors.clear()
    sign_in(phone, served.secure, "lead")
    open_invitations(phone)
    phone.get_by_role("button", name="Make the code").tap()
    link = phone.locator(".fingerprint a").get_attribute("href")
    assert what_is_wrong(phone) == []
    phone.goto(link)
    assert what_is_wrong(phone) == []
    assert phone.console_errors == []
