"""A real server process with the demo survey, and a real Chromium at phone size."""

import os
import shutil
import socket
import subprocess
import sys
import time
import urllib.request
from contextlib import contextmanager
from datetime import UTC, datetime

import pytest
from werkzeug.security import generate_password_hash

from tests.needs import chromium_path
from webapp import cli
from webapp.config import read_config
from webapp.demo import SIGN_INS
from webapp.demo import load as load_demo
from webapp.people.queries import find_by_sign_in

PHONE = {"viewport": {"width": 360, "height": 740}, "device_scale_factor": 2, "is_mobile": True, "has_touch": True}
DESK = {"viewport": {"width": 1280, "height": 900}}
PASSWORDS = {role: (sign_in, password) for sign_in, password, role in SIGN_INS}


@pytest.fixture(scope="session")
def browser_type_launch_args():
    """Use the system's Chromium, and let it reach nothing but this machine."""
    rules = "MAP * ~NOTFOUND, EXCLUDE 127.0.0.1, EXCLUDE localhost"
    return {"executable_path": chromium_path(), "args": [f"--host-resolver-rules={rules}"]}


def free_port():
    """Return a port nobody listens on."""
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return probe.getsockname()[1]


@contextmanager
def serving(data_dir, command="demo"):
    """Run a Bankside server process on the data folder; give its address."""
    port = free_port()
    environ = {name: value for name, value in os.environ.items() if not name.startswith("BANKSIDE_")}
    arguments = [command, "--data", str(data_dir), "--host", "127.0.0.1", "--port", str(port)]
    process = subprocess.Popen(
        [sys.executable, "-c", "from webapp.cli import main; main()", *arguments],
        env=environ,
        stdout=subprocess.DEVNULL,
    )
    address = f"http://127.0.0.1:{port}"
    try:
        _wait_for(address, process)
        yield address
    finally:
        process.terminate()
        process.wait(10)


def _wait_for(address, process, seconds=40):
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        if process.poll() is not None:
            raise RuntimeError("the server stopped before it served")
        try:
            urllib.request.urlopen(f"{address}/sign-in", timeout=2)
            return
        except OSError:
            time.sleep(0.1)
    raise RuntimeError("the server did not answer in time")


@pytest.fixture(scope="session")
def demo(tmp_path_factory, demo_data):
    """The address of a server with the demo survey, shared by the tests that change little."""
    data_dir = tmp_path_factory.mktemp("demo") / "data"
    shutil.copytree(demo_data, data_dir)
    with serving(data_dir) as address:
        yield address


def sign_in(page, address, role):
    """Sign in as one of the demo's people."""
    name, password = PASSWORDS[role]
    page.goto(f"{address}/sign-in")
    page.get_by_label("Sign-in name").fill(name)
    page.get_by_label("Password").fill(password)
    page.get_by_role("button", name="Sign in").click()
    page.get_by_role("heading", name="Surveys").wait_for()


@pytest.fixture(scope="session")
def signed_in_states(browser, demo):
    """The cookies of each role, signed in once: guesses are slowed, and so would the tests be."""
    states = {}
    for role in PASSWORDS:
        context = browser.new_context()
        sign_in(context.new_page(), demo, role)
        states[role] = context.storage_state()
        context.close()
    return states


def watched(page):
    """Return the page, which from now on collects in console_errors what its console calls an error.

    A refused form is answered 422, which Chromium reports as a failed load; every other line is a fault of ours, and
    one that the content-security policy writes is among them.
    """
    page.console_errors = []

    def heard(line):
        if line.type == "error" and "status of 422" not in line.text:
            page.console_errors.append(line.text)

    page.on("console", heard)
    page.on("pageerror", lambda error: page.console_errors.append(str(error)))
    return page


@pytest.fixture
def page_as(browser, demo, signed_in_states):
    """A function from a role to a page signed in as that role, on a phone unless told otherwise."""
    contexts = []

    def opened(role, device=PHONE, **more):
        context = browser.new_context(base_url=demo, storage_state=signed_in_states[role], **device, **more)
        contexts.append(context)
        return watched(context.new_page())

    yield opened
    for context in contexts:
        context.close()


def survey_address(page, name="Sallow Water, August low flow"):
    """Open the surveys and return the path of one of the demo's, of the one that is going on unless told otherwise."""
    page.goto("/")
    link = page.get_by_role("link", name=name)
    return link.get_attribute("href").removesuffix("/sheet")


@pytest.fixture(scope="session")
def demo_data(tmp_path_factory):
    """A data folder with the demo in it, to be copied: loading it takes longer than most tests."""
    config = read_config({}, data_dir=tmp_path_factory.mktemp("demo-data"))
    database = cli._open(config)
    with database.writing() as db:
        load_demo(db, datetime.now(UTC))
    with database.writing() as db:
        for name, password in PASSWORDS.values():
            # Checking a real hash takes a tenth of a second.
            find_by_sign_in(db, name).password_hash = generate_password_hash(password, method="pbkdf2:sha256:1")
        db.commit()
    database.engine.dispose()
    return config.data_dir


@pytest.fixture
def own_demo(tmp_path, demo_data):
    """A server of this test's own, whose day nobody else walks."""
    shutil.copytree(demo_data, tmp_path / "data")
    with serving(tmp_path / "data") as address:
        yield address


@pytest.fixture
def phone_of(browser, own_demo):
    """A function from a role to a page on that person's phone, signed in by hand."""
    contexts, pages = [], []

    def signed_in(role):
        context = browser.new_context(base_url=own_demo, accept_downloads=True, **PHONE)
        contexts.append(context)
        page = watched(context.new_page())
        pages.append(page)
        name, password = PASSWORDS[role]
        page.goto("/")
        page.get_by_label("Sign-in name").fill(name)
        page.get_by_label("Password").fill(password)
        page.get_by_role("button", name="Sign in").tap()
        page.get_by_role("heading", name="Surveys").wait_for()
        return page

    yield signed_in
    for context in contexts:
        context.close()
    assert [line for page in pages for line in page.console_errors] == []
