"""Saving a reading with its on-site check, twenty clients at once, against a bare Flask insert of the same durability.

Run with `python -m tests.bench.save`. Both run in a waitress of four threads on a fresh SQLite file in WAL mode with
synchronous FULL; both get the same load in turn. Server time is from the request's arrival in the application to its
answer, without the wait for a free thread. Prints milliseconds, and the ratios that the goals are about.
"""

import argparse
import http.client
import json
import re
import sqlite3
import statistics
import subprocess
import sys
import tempfile
import threading
import time
import uuid
from datetime import UTC, datetime, timedelta
from pathlib import Path
from urllib.parse import urlencode
from zoneinfo import ZoneInfo

CLIENTS = 20
DEMO_ZONE = ZoneInfo("Atlantic/Azores")
GOAL_P95_MS, GOAL_RATIO = 60.0, 3.0
FORM = {"Content-Type": "application/x-www-form-urlencoded"}


def timed(app):
    """Wrap a WSGI application so that each answer says how long it took."""

    def wrapped(environ, start_response):
        begun = time.perf_counter()

        def start(status, headers, exc_info=None):
            spent = f"{(time.perf_counter() - begun) * 1000:.3f}"
            return start_response(status, [*headers, ("X-Server-Ms", spent)], exc_info)

        return app(environ, start)

    return wrapped


def bare_app(folder):
    """Return the smallest Flask application that keeps a reading durably: one insert, one commit, one line back."""
    from flask import Flask, request

    app = Flask(__name__)
    local, lock, path = threading.local(), threading.Lock(), str(Path(folder) / "bare.sqlite3")

    def connection():
        if not hasattr(local, "connection"):
            local.connection = sqlite3.connect(path, isolation_level=None)
            for pragma in ("journal_mode=WAL", "synchronous=FULL"):
                local.connection.execute(f"PRAGMA {pragma}")
            local.connection.execute(
                "CREATE TABLE IF NOT EXISTS reading (id TEXT PRIMARY KEY, at TEXT, do REAL, t REAL)"
            )
        return local.connection

    @app.post("/reading")
    def save():
        row = (request.form["submission_id"], request.form["taken_at"], *_numbers(request.form))
        with lock:
            connection().execute("INSERT INTO reading VALUES (?, ?, ?, ?)", row)
        return "<p>saved</p>"

    return app


def _numbers(form):
    return float(form["do_mg_l"]), float(form["water_temp_c"])


def serve(which, port, folder):
    """Serve one of the two until killed; print what a client needs to know."""
    from waitress import serve as waitress_serve

    if which == "bare":
        app, facts = bare_app(folder), {"path": "/reading"}
    else:
        app, facts = _bankside(folder)
    print(json.dumps(facts), flush=True)
    waitress_serve(timed(app), host="127.0.0.1", port=port, threads=4, ident=None, _quiet=True)


def _bankside(folder):
    from sqlalchemy import select

    from webapp import cli, create_app, demo
    from webapp.config import read_config
    from webapp.models import Survey

    config = read_config({}, data_dir=folder)
    database = cli._open(config)
    with database.writing() as db:
        demo.load(db, datetime.now(UTC))
        survey_id = db.scalar(select(Survey.id).order_by(Survey.created_at.desc()))
    database.engine.dispose()
    app = create_app(config, RATELIMIT_ENABLED=False)
    return app, {"path": f"/surveys/{survey_id}/stations/D5/reading", "sign_in": demo.SIGN_INS[0][:2]}


class Client:
    """One phone: a kept connection, signed in where there is something to sign in to."""

    def __init__(self, port, facts):
        self.connection = http.client.HTTPConnection("127.0.0.1", port, timeout=60)
        self.path, self.headers, self.token = facts["path"], dict(FORM), ""
        if "sign_in" in facts:
            self._sign_in(*facts["sign_in"])

    def _sign_in(self, name, password):
        page = self._get("/sign-in")
        body = urlencode({"csrf_token": self._token(page), "sign_in": name, "password": password})
        self.connection.request("POST", "/sign-in", body, self.headers)
        self._keep_cookie(self.connection.getresponse())
        self.token = self._token(self._get(self.path))

    def _get(self, path):
        self.connection.request("GET", path, headers=self.headers)
        return self._keep_cookie(self.connection.getresponse())

    def _keep_cookie(self, answer):
        text = answer.read().decode()
        if (cookie := answer.headers.get("Set-Cookie")) is not None:
            self.headers["Cookie"] = cookie.split(";")[0]
        return text

    @staticmethod
    def _token(page):
        return re.search(r'name="csrf_token" value="([^"]+)"', page).group(1)

    def save(self, number):
        """Save one reading; return its server time in ms."""
        taken = datetime.now(DEMO_ZONE) - timedelta(minutes=number % 7)
        form = {
            "csrf_token": self.token,
            "submission_id": str(uuid.uuid4()),
            "taken_at": taken.strftime("%Y-%m-%dT%H:%M"),
            "do_mg_l": f"{4.0 + (number % 9) * 0.02:.2f}",
            "water_temp_c": "20.1",
            "depth_m": "0.7",
        }
        self.connection.request("POST", self.path, urlencode(form), {**self.headers, "HX-Request": "true"})
        answer = self.connection.getresponse()
        text = answer.read().decode()
        if answer.status != 200:
            raise RuntimeError(f"not saved: {answer.status} {text[:300]}")
        return float(answer.headers["X-Server-Ms"])


def raw_commits_per_second(commits=300):
    """Return how many one-row commits a second SQLite itself makes with the same durability, from one thread."""
    with tempfile.TemporaryDirectory() as folder:
        connection = sqlite3.connect(Path(folder) / "raw.sqlite3", isolation_level=None)
        for pragma in ("journal_mode=WAL", "synchronous=FULL"):
            connection.execute(f"PRAGMA {pragma}")
        connection.execute("CREATE TABLE reading (id TEXT PRIMARY KEY, at TEXT, o REAL, t REAL)")
        begun = time.perf_counter()
        for _ in range(commits):
            connection.execute("INSERT INTO reading VALUES (?, ?, ?, ?)", (str(uuid.uuid4()), "now", 4.05, 20.1))
        spent = time.perf_counter() - begun
        connection.close()
    return commits / spent


def measure(which, saves):
    """Return the server times in ms of CLIENTS clients that save at once, and the saves a second."""
    from tests.browser.conftest import free_port

    port = free_port()
    with tempfile.TemporaryDirectory() as folder:
        command = [sys.executable, "-m", "tests.bench.save", "--serve", which, "--port", str(port), "--data", folder]
        server = subprocess.Popen(command, stdout=subprocess.PIPE, text=True)
        try:
            facts = json.loads(server.stdout.readline())
            time.sleep(1.0)
            clients = [Client(port, facts) for _ in range(CLIENTS)]
            clients[0].save(0)  # the first one warms the prediction, as the field sheet would have
            return _all_at_once(clients, saves)
        finally:
            server.kill()
            server.wait()


def _all_at_once(clients, saves):
    times, barrier = [], threading.Barrier(len(clients) + 1)

    def work(client):
        barrier.wait()
        times.extend([client.save(number) for number in range(saves)])

    threads = [threading.Thread(target=work, args=(client,)) for client in clients]
    for thread in threads:
        thread.start()
    barrier.wait()
    begun = time.perf_counter()
    for thread in threads:
        thread.join()
    return times, len(times) / (time.perf_counter() - begun)


def p95(times):
    """Return the 95th percentile."""
    return statistics.quantiles(times, n=20)[-1]


def main():
    """Measure both, in turn, and print."""
    options = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    options.add_argument("--saves", type=int, default=15, help="readings each client saves")
    options.add_argument("--serve", choices=["bare", "bankside"], help=argparse.SUPPRESS)
    options.add_argument("--port", type=int, help=argparse.SUPPRESS)
    options.add_argument("--data", help=argparse.SUPPRESS)
    chosen = options.parse_args()
    if chosen.serve:
        serve(chosen.serve, chosen.port, chosen.data)
        return
    raw, results = raw_commits_per_second(), {}
    for which in ("bare", "bankside"):
        times, rate = results[which] = measure(which, chosen.saves)
        print(f"{which:9} median {statistics.median(times):6.1f} ms  p95 {p95(times):6.1f} ms  {rate:6.1f} saves/s")
    print(
        f"raw SQLite commits: {raw:.0f}/s; durable saves with their check: {results['bankside'][1] / raw:.3f} of that"
    )
    ours, bare = p95(results["bankside"][0]), p95(results["bare"][0])
    print(f"p95 of a save with its on-site check: {ours:.1f} ms (goal {GOAL_P95_MS:.0f})")
    print(f"ratio to the bare insert: {ours / bare:.2f} (goal {GOAL_RATIO:.0f})")


if __name__ == "__main__":
    main()
