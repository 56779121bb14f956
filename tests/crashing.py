"""A server that is killed at random while phones post to it; every acknowledged reading must be there, once."""

import random
import re
import sqlite3
import threading
import time
import urllib.error
import urllib.parse
import urllib.request
import uuid
from http.client import HTTPException
from http.cookiejar import CookieJar

from webapp.demo import SIGN_INS


class Phone:
    """A client that signs in and posts readings, each again with the same id until it is acknowledged."""

    def __init__(self, address):
        self.address = address
        self.opener = urllib.request.build_opener(urllib.request.HTTPCookieProcessor(CookieJar()))
        self.acknowledged = {}
        self.lost_answers = 0
        self.refused = []

    def ask(self, path, form=None):
        """Return (headers, text) of the answer; raises OSError without one."""
        data = urllib.parse.urlencode(form).encode() if form is not None else None
        request = urllib.request.Request(self.address + path, data, {"HX-Request": "true"} if form else {})
        with self.opener.open(request, timeout=5) as answer:
            return answer.headers, answer.read().decode()

    def sign_in(self):
        """Sign in as the demo's crew; return the path of its survey."""
        name, password, _ = SIGN_INS[0]
        token = re.search(r'name="csrf_token" value="([^"]+)"', self.ask("/sign-in")[1]).group(1)
        _, page = self.ask("/sign-in", {"csrf_token": token, "sign_in": name, "password": password})
        self.token = re.search(r'name="csrf_token" value="([^"]+)"', page).group(1)
        return re.search(r'"(/surveys/[0-9a-f-]{36})/sheet"', page).group(1)

    def post_until(self, stop, survey, taken_at):
        """Post one reading after the other until told to stop."""
        while not stop.is_set():
            reading, oxygen = str(uuid.uuid4()), round(random.uniform(6.5, 7.5), 2)
            form = {
                "csrf_token": self.token,
                "submission_id": reading,
                "taken_at": taken_at,
                "do_mg_l": str(oxygen),
                "water_temp_c": "19.5",
                "note": "crash loop",
                "saved_at": "2026-01-01T00:00:00+00:00",
            }
            while not stop.is_set() and not self._posted(f"{survey}/stations/D8/reading", form):
                time.sleep(0.05)

    def _posted(self, path, form):
        try:
            headers, _ = self.ask(path, form)
        except urllib.error.HTTPError as answer:
            self.refused.append(answer.code)
            return answer.code < 500
        except (OSError, HTTPException):
            self.lost_answers += 1
            return False
        if headers["X-Stored-Id"] == form["submission_id"]:
            self.acknowledged[form["submission_id"]] = float(form["do_mg_l"])
        return True


def crash_loop(server, kills, phones=3, seed=7):
    """Kill the server so many times while phones post; return what happened, counted, with what was lost or doubled."""
    numbers = random.Random(seed)
    clients = [Phone(server.address) for _ in range(phones)]
    surveys = [client.sign_in() for client in clients]
    taken_at = time.strftime("%Y-%m-%dT%H:%M", time.gmtime(time.time() - 6 * 3600))
    stop = threading.Event()
    threads = [
        threading.Thread(target=client.post_until, args=(stop, survey, taken_at))
        for client, survey in zip(clients, surveys, strict=True)
    ]
    for thread in threads:
        thread.start()
    for _ in range(kills):
        time.sleep(numbers.uniform(0.3, 1.2))
        server.kill()
        server.start("serve")
    time.sleep(0.5)
    stop.set()
    for thread in threads:
        thread.join(20)
    return _found(server, clients)


def _found(server, clients):
    acknowledged = {key: value for client in clients for key, value in client.acknowledged.items()}
    with sqlite3.connect(f"file:{server.data_dir}/bankside.sqlite3?mode=ro", uri=True) as db:
        rows = db.execute("select id, do_mg_l from reading where note = 'crash loop'").fetchall()
        whole = db.execute("pragma integrity_check").fetchone()[0]
    stored = dict(rows)
    return {
        "acknowledged": len(acknowledged),
        "lost": [key for key, value in acknowledged.items() if stored.get(key) != value],
        "doubled": len(rows) - len(stored),
        "stored without an answer": len(set(stored) - set(acknowledged)),
        "answers lost": sum(client.lost_answers for client in clients),
        "refused": [code for client in clients for code in client.refused],
        "database": whole,
    }
