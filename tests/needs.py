"""What some tests need from the machine: a browser, certutil, a PostgreSQL. Without it they skip, but not in CI."""

import os
import pwd
import shutil
import subprocess
import tempfile
from contextlib import contextmanager
from pathlib import Path

import pytest


def missing(what):
    """Skip the test, or fail it where BANKSIDE_NO_SKIP=1 says that nothing may be missing."""
    if os.environ.get("BANKSIDE_NO_SKIP") == "1":
        pytest.fail(f"{what} is missing, and nothing may be skipped here")
    pytest.skip(f"{what} is not installed on this machine")


def chromium_path():
    """Return the system's Chromium."""
    for name in ("chromium", "chromium-browser", "google-chrome"):
        if (path := shutil.which(name)) is not None:
            return path
    return missing("Chromium")


def certutil_path():
    """Return the program that puts an authority into the store of a Chromium on Linux."""
    return shutil.which("certutil") or missing("certutil (libnss3-tools)")


def _postgres_command(name):
    places = sorted(Path("/usr/lib/postgresql").glob("*/bin"), reverse=True)
    for place in places:
        if (place / name).exists():
            return str(place / name)
    return shutil.which(name) or missing("PostgreSQL")


@contextmanager
def postgres_server():
    """Run a PostgreSQL of our own, reached by a socket in a temporary folder only; give its database URL."""
    initdb, server = _postgres_command("initdb"), _postgres_command("postgres")
    person = _unprivileged()
    with tempfile.TemporaryDirectory(prefix="bankside-pg-") as folder:
        if person:
            os.chown(folder, person["user"], person["group"])
        run_as = {**person, "cwd": folder, "stdout": subprocess.DEVNULL, "stderr": subprocess.STDOUT}
        data = f"{folder}/data"
        make = [initdb, "-D", data, "-U", "app", "-A", "trust", "--no-sync", "-E", "UTF8"]
        subprocess.run(make, check=True, **run_as)
        process = subprocess.Popen(
            [server, "-D", data, "-k", folder, "-c", "listen_addresses=", "-c", "fsync=off"], **run_as
        )
        try:
            _wait_for(Path(folder) / ".s.PGSQL.5432", process)
            yield f"postgresql+psycopg://app@/postgres?host={folder}"
        finally:
            process.terminate()
            process.wait(20)


def _unprivileged():
    """Return how to run as somebody else where we are root, which PostgreSQL refuses to run as."""
    if os.geteuid() != 0:
        return {}
    for name in ("postgres", "nobody"):
        try:
            entry = pwd.getpwnam(name)
        except KeyError:
            continue
        return {"user": entry.pw_uid, "group": entry.pw_gid, "extra_groups": []}
    return missing("A user to run PostgreSQL as")


def _wait_for(socket_path, process, seconds=20):
    import time

    end = time.monotonic() + seconds
    while not socket_path.exists():
        if process.poll() is not None or time.monotonic() > end:
            raise RuntimeError("PostgreSQL did not start")
        time.sleep(0.05)
    time.sleep(0.3)  # the socket is there a moment before the server answers
