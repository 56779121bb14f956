"""Every form there is, sent with whatever can be typed: nothing breaks, and what was refused stays to be corrected."""

import html
import io
import re
from html.parser import HTMLParser

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from werkzeug.exceptions import HTTPException

from tests.conftest import PASSWORD, ROLES
from tests.webapp.day_rest import put_rest
from tests.webapp.metered import put_drift
from tests.webapp.sheets import put_readings
from webapp.people import service as people_service
from webapp.people.access import SignedIn
from webapp.people.forms import NewPerson
from webapp.review import service as review_service
from webapp.surveys import service as survey_service

WHY = {"reason": "the probe hung in the air", "version_reason": "seen on site"}
TYPED = {"text", "datetime-local", "textarea"}
NUMBERS = ["", " ", "0", "-1", "4,05", "1_000", "1,234", "nan", "inf", "-inf", "1e999", "9" * 400, "٣٫٥", "１２", "−3"]
TIMES = ["2026-08-12T05:40", "0001-01-01T00:00", "2026-03-29T02:30", "9999-12-31T23:59+23:59", "2026-08-12T05:40+99:99"]
WORDS = ["si", "us", "river_km", "Europe/Vienna", "Etc", "yes", "D2", "d2", "=1+1", "../../x", "x" * 20000, "[" * 3000]
SIGNS = [
    "\x00",
    "a\x00b",
    "\u202e12",
    "\ufeff7",
    "a\r\nX: y",
    "<b>&amp;</b>",
    "'\"`",
    "{{ 7 * 7 }}",
    "%s%n",
    '{"a": 1}',
]
FILES = ["Name;Where (km)\na;1", "Station;Time;Oxygen (mg/L)\nD2;12.8.2026 05:40;6,1", "a;b\n" * 300]
NASTY = NUMBERS + TIMES + WORDS + SIGNS + FILES
UNICODE = st.text(st.characters(exclude_categories=["Cs"]), max_size=40)
TEXTS = st.one_of(st.sampled_from(NASTY), st.floats().map(repr), st.integers().map(str), UNICODE)
JUNK = st.sampled_from(["nowhere", "a%00b", "..%2f..", "0", "99999999999999999999", "%F0%9F%8C%8A", "x" * 300])


class Forms(HTMLParser):
    """The forms of a page that are posted, by address: each field's kind and text; and where the page links to."""

    def __init__(self, page):
        super().__init__()
        self.forms, self.links, self._fields, self._filling = {}, [], None, None
        self.feed(page)

    def handle_starttag(self, tag, attributes):
        given = dict(attributes)
        if tag == "a" and given.get("href"):
            self.links.append(given["href"].split("#")[0])
        elif tag == "form":
            self._fields = {}
            if given.get("method") == "post":
                self.forms[given["action"]] = self._fields
        elif self._fields is not None:
            self._take(tag, given)

    def _take(self, tag, given):
        name, kind = given.get("name"), given.get("type") or "text"
        if tag == "button" and given.get("formaction"):
            self.forms[given["formaction"]] = self._fields
        if tag == "option" and self._filling and ("selected" in given or not self._fields[self._filling][1]):
            self._fields[self._filling] = ("select", given.get("value") or "")
        if not name:
            return
        self._filling = name
        if tag in ("textarea", "select"):
            self._fields[name] = (tag, "")
        elif tag == "button":
            self._fields.setdefault(name, ("button", given.get("value") or ""))
        elif tag == "input" and (kind not in ("checkbox", "radio") or "checked" in given):
            self._fields[name] = (kind, given.get("value") or "")

    def handle_data(self, data):
        if self._fields and self._filling and self._fields.get(self._filling, ("",))[0] == "textarea":
            kind, text = self._fields[self._filling]
            self._fields[self._filling] = (kind, text + data.removeprefix("\n") if not text else text + data)

    def handle_endtag(self, tag):
        if tag in ("textarea", "select"):
            self._filling = None
        elif tag == "form":
            self._fields = None


@pytest.fixture
def fuzzed(app, db, survey, people, browser_as):
    """A survey with a plan and readings, its people's browsers, and somebody on it whom the forms may turn out."""
    ids = put_readings(db, survey, people)
    put_drift(db, survey, people)
    review_service.ask(db, survey.id, ids["D5"], "Was it in the current?", 0, SignedIn(people["lead"]))
    rest = put_rest(db, survey, people)
    guest = people_service.add_person(db, NewPerson("Gwen Shore", "guest.test", "crew", PASSWORD))
    survey_service.add_member(db, survey.id, guest.id, people["office"].id)
    people_service.add_person(db, NewPerson("Otto Weir", "outside.test", "crew", PASSWORD))
    browsers = {role: browser_as(role) for role in ROLES}
    pages = ["/sign-in", f"/people/{guest.id}/password", *rest]
    return Fuzzed(app, browsers, {people[role].id for role in ROLES}, pages)


class Fuzzed:
    """Finds every form that the office meets, and sends them."""

    def __init__(self, app, browsers, spared, pages):
        self.app, self.browsers = app, browsers
        self.spared = spared  # whose account or membership must outlive the test
        self.cookies = {role: one.client.get_cookie("session").value for role, one in browsers.items()}
        self.urls = app.url_map.bind("localhost")
        self.where = {}  # endpoint and table -> address of the form, the page that it is on, its fields there
        self._find_all([*pages, "/"])
        self._check("plan.import_check", "Name;Where (km)\nBelow the mill;4,5", "access")
        self._check("review.import_preview", "Station;Time;Oxygen (mg/L)\nD2;12.8.2026 05:40;6,1")
        self._check("bottles.import_preview", "Bottle;Result\nB1;4,1")

    def endpoint(self, address, method):
        try:
            endpoint, values = self.urls.match(address.split("?")[0], method)
        except HTTPException:
            return None
        return endpoint, values.get("key", "")

    def _find_all(self, pages):
        """Find the forms of every page, also of those that only exist once another form was sent as it stands."""
        sent = {None, ("people.sign_out", "")}
        for _ in range(3):
            self._crawl(pages)
            new = [key for key in self.where if key not in sent]
            for key in sorted(new, key=lambda key: bool(re.search("remove|aside|active|withdraw", key[0]))):
                pages = [*pages, *self._send_as_it_stands(*self.where[key])]
            sent |= set(new)

    def _send_as_it_stands(self, address, page, fields):
        """Take up the forms of the answer; return the addresses of its links for other phones."""
        form = {name: text or WHY.get(name, "") for name, (_, text) in fields.items()}
        answer = self.send("office", address, form, htmx=False)
        if answer.status_code == 303:
            page, answer = answer.location, self.browsers["office"].get(answer.location)
        shown = Forms(answer.text)
        self._learn(shown, page)
        return [f"/join/{link.split('/join/')[1]}" for link in shown.links if "/join/" in link]

    def _crawl(self, pages):
        seen, waiting = set(), list(pages)
        while waiting:
            page = waiting.pop(0)
            key = self.endpoint(page, "GET"), "correct=" in page, page in pages
            if key[0] is None or key in seen:
                continue
            seen.add(key)
            self.browsers["office"].client.set_cookie("session", self.cookies["office"])
            answer = self.browsers["office"].get(page)
            if answer.mimetype != "text/html":
                continue
            found = Forms(answer.text)
            waiting += [link for link in found.links if link.startswith("/")]
            self._learn(found, page)

    def _learn(self, found, page):
        for address, fields in found.forms.items():
            if not any(person in address for person in self.spared):
                self.where.setdefault(self.endpoint(address, "POST"), (address, page, fields))

    def _check(self, endpoint, text, table=""):
        """Take up the form that only a table shows that was checked and is right."""
        address, page, _ = next(found for key, found in self.where.items() if key[0] == endpoint)
        if table:
            address = "/".join([*address.split("/")[:-2], table, "import"])
        self._learn(Forms(self.browsers["office"].post(address, {"text": text}).text), page)

    def fields(self, where):
        """Return the fields of a form as its page has them now, or had when it was found."""
        address, page, fields = where
        return Forms(self.browsers["office"].get(page).text).forms.get(address, fields)

    def send(self, role, address, form, htmx):
        """Send a form as somebody, whatever the form before did to their session."""
        browser = self.browsers[role]
        browser.client.set_cookie("session", self.cookies[role])
        return browser.post(address, form, htmx=htmx, content_type="multipart/form-data")


def test_every_form_is_found(app, fuzzed):
    by_file_only = {"surveyfile.import_file", "dataset.import_dataset"}
    of_no_form = {"visits.wading"}  # a fieldset asks for it while one types: test_visit_day sends it anything
    posts = {rule.endpoint for rule in app.url_map.iter_rules() if "POST" in rule.methods}
    assert posts - {endpoint for endpoint, _ in filter(None, fuzzed.where)} == by_file_only | of_no_form


@settings(
    max_examples=200, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture], derandomize=True
)
@given(
    place=st.integers(0, 999),
    role=st.sampled_from([*ROLES, "office", "office"]),
    htmx=st.booleans(),
    texts=st.lists(st.tuples(st.integers(0, 99), TEXTS), max_size=6),
    file=st.tuples(st.binary(max_size=60), st.sampled_from(["", "a.csv"])),
    junk=st.none() | st.tuples(st.integers(1, 9), JUNK),
)
def test_no_form_breaks_or_loses_what_was_typed(fuzzed, place, role, htmx, texts, file, junk):
    forms = sorted(filter(None, fuzzed.where))
    where = fuzzed.where[forms[place % len(forms)]]
    address, fields = where[0], fuzzed.fields(where)
    names = sorted(set(fields) - {"csrf_token"}) * 3 + ["use", "keep", "kept", "reason"]
    typed = {names[number % len(names)]: text for number, text in texts}
    form = {name: text for name, (_, text) in fields.items() if name != "csrf_token"} | typed
    form |= {name: (io.BytesIO(file[0]), file[1]) for name, (kind, _) in fields.items() if kind == "file"}
    if junk is not None:
        parts = address.split("/")
        parts[junk[0] % (len(parts) - 1) + 1] = junk[1]
        address = "/".join(parts)
    answer = fuzzed.send(role, address, form, htmx)
    assert answer.status_code < 500
    if answer.status_code == 422:
        replaced = {"text"} if file[1] and "file" in fields else set()
        _stays(answer.text, fields, {name: text for name, text in typed.items() if name not in replaced})


def _stays(page, fields, typed):
    """Assert that every text that was typed is in the field that the page has for it."""
    shown = Forms(page).forms
    fields_shown = {name for form in shown.values() for name in form}
    text = html.unescape(page).replace("\r\n", "\n")
    for name in set(typed) & fields_shown:
        if fields.get(name, ("",))[0] in TYPED:
            assert typed[name].replace("\r\n", "\n") in text, name
