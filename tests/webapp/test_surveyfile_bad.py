"""Survey files that must not be taken: each gets a clear message, none adds anything."""

import io
import json
import warnings
import zipfile

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.webapp import servers
from tests.webapp.sheets import correct, put_readings
from webapp.dataset.package import checksums, zipped
from webapp.models import Survey
from webapp.people.queries import find_by_sign_in
from webapp.surveyfile import archive, service
from webapp.surveyfile.archive import BadSurveyFile


@pytest.fixture(scope="module")
def content(database_with_people, tmp_path_factory):
    """A good survey file, made once: nobody changes bytes."""
    place = servers.server_with_survey(database_with_people, tmp_path_factory.mktemp("source"))
    with place as (database, survey, people):
        with database.writing() as db:
            ids = put_readings(db, survey, people)
        with database.writing() as db:
            correct(db, survey, people, ids["D3"], 4.52)
        with database.writing() as db:
            servers.add_settings_and_decision(db, survey, people["office"])
        yield servers.exported(database, survey)


def unzipped(content):
    with zipfile.ZipFile(io.BytesIO(content)) as opened:
        return {name: opened.read(name) for name in opened.namelist()}


def resealed(content, change):
    """Return the file after change(files), with checksums that fit: nobody's slip, but somebody's intent."""
    files = unzipped(content)
    del files["checksums.txt"]
    change(files)
    return zipped({**files, "checksums.txt": checksums(files)})


def with_rows(content, name, change):
    """Return the file after change(rows) of one table."""

    def rewrite(files):
        rows = [json.loads(line) for line in files[f"{name}.jsonl"].split(b"\n")[:-1]]
        change(rows)
        files[f"{name}.jsonl"] = b"".join(json.dumps(row).encode() + b"\n" for row in rows)

    return resealed(content, rewrite)


def refused(content, match):
    with pytest.raises(BadSurveyFile, match=match):
        service.read(content)


def test_a_good_file_resealed_is_still_good(content):
    assert service.read(resealed(content, lambda files: None)) == service.read(content)


@pytest.mark.parametrize("share", [0.02, 0.5, 0.9, 0.99])
def test_a_file_cut_short_is_refused(content, share):
    refused(content[: int(len(content) * share)], "damaged or cut short")


@pytest.mark.parametrize("junk", [b"", b"PK", b"PK\x03\x04", b"hello", b"\x00" * 100, "ä".encode() * 50])
def test_what_is_no_zip_is_refused(junk):
    refused(junk, "no survey file|damaged")


@given(place=st.integers(0, 10**9), bit=st.integers(0, 7))
def test_a_file_with_one_bit_turned_is_refused_or_the_same(place, bit):
    files = {f"{name}.jsonl": b"" for name in archive.CARRIED}
    good = archive.pack({}, {name.removesuffix(".jsonl"): b'{"a":1}\n' for name in files})
    turned = bytearray(good)
    turned[place % len(good)] ^= 1 << bit
    try:
        _, tables = archive.unpack(bytes(turned))
    except BadSurveyFile:
        return
    assert tables == archive.unpack(good)[1]


def test_a_changed_row_does_not_fit_its_checksum(content):
    files = unzipped(content)
    files["reading.jsonl"] = files["reading.jsonl"].replace(b"4.25", b"6.25")
    refused(zipped(files), "reading.jsonl in the file was changed or damaged")


@pytest.mark.parametrize("name", ["reading.jsonl", "survey-file.json", "checksums.txt"])
def test_a_part_that_is_missing_is_named(content, name):
    files = unzipped(content)
    del files[name]
    refused(zipped(files), "missing|does not say|checksum")


@pytest.mark.parametrize("name", ["../../etc/passwd", "/tmp/x", "..\\x", "seen.jsonl", "reading.jsonl/../x", "a\tb"])
def test_names_that_belong_nowhere_are_refused_and_written_nowhere(content, name):
    refused(resealed(content, lambda files: files.update({name: b"x"})), "does not know")


def test_two_parts_of_one_name_are_refused(content):
    out = io.BytesIO(content)
    with warnings.catch_warnings(), zipfile.ZipFile(out, "a") as opened:
        warnings.simplefilter("ignore")
        opened.writestr("reading.jsonl", b"")
    refused(out.getvalue(), "holds what no survey file holds")


def test_a_zip_bomb_is_not_unpacked(content):
    bomb = resealed(content, lambda files: files.update({"history.jsonl": b" " * (archive.LARGEST_UNPACKED + 1)}))
    assert len(bomb) < archive.LARGEST
    refused(bomb, "Unpacked")


def test_a_bomb_of_rows_is_not_read(content):
    refused(resealed(content, lambda files: files.update({"history.jsonl": b"{}\n" * 200_001})), "more than 200000")


def test_too_large_a_file_is_told_its_size():
    refused(b"PK" + b"\x00" * archive.LARGEST, r"3\.5 MB")


def test_a_file_of_a_newer_bankside_says_to_update(content):
    newer = resealed(content, lambda files: files.update({"survey-file.json": files["survey-file.json"].replace(
        b'"version": 1', b'"version": 2')}))  # fmt: skip
    refused(newer, "newer Bankside made this file .format 2; this one reads 1.. Update")
    refused(with_rows(content, "reading", lambda rows: rows[0].update(turbidity_ntu=3.0)), "turbidity_ntu.*Update")


@pytest.mark.parametrize(
    "manifest", [b"[]", b"{}", b"nonsense", b"\xff", b'{"format":"Bankside survey file","version":true}', b"[" * 9999]
)
def test_a_manifest_that_says_nothing_is_refused(content, manifest):
    refused(resealed(content, lambda files: files.update({"survey-file.json": manifest})), "no survey file")


def test_a_file_of_an_older_bankside_without_a_column_is_taken(content):
    older = with_rows(content, "reading", lambda rows: [row.pop("position_radius_m") for row in rows])
    older = with_rows(older, "reading", lambda rows: [row.pop("note") for row in rows])
    assert len(service.read(older)["reading"]) == 4
    refused(with_rows(content, "reading", lambda rows: rows[0].pop("taken_at")), "lacks taken_at")


WRONG = [
    ("reading", "do_mg_l", "5.0"),
    ("reading", "do_mg_l", True),
    ("reading", "do_mg_l", 1e300),
    ("reading", "water_temp_c", 10**400),
    ("reading", "taken_at", "2026-08-12T06:00:00"),
    ("reading", "taken_at", "0001-01-01T00:00:00+23:59"),
    ("reading", "taken_at", 5),
    ("reading", "id", "../x"),
    ("reading", "id", None),
    ("reading", "station_id", "nowhere"),
    ("reading", "author_id", "nobody"),
    ("reading", "survey_id", "another"),
    ("reading", "replicate", 1),
    ("reading", "position", "top"),
    ("reading", "note", "a\x00b"),
    ("reading", "note", "\ud800"),
    ("reading", "note", ["x"]),
    ("reading", "meter", "m" * 61),
    ("reading", "entered", []),
    ("reading", "entered", {"do_mg_l": "5"}),
    ("reading", "entered", {"do_mg_l": {"text": "5", "unit": "furlong"}}),
    ("reading", "entered", {"do_mg_l": {"text": "5", "unit": ["m"]}}),
    ("reading", "entered", {"do_mg_l": {"text": "\ud800", "unit": "m"}}),
    ("reading", "kept_findings", [{"says": 5}]),
    ("reading", "kept_findings", "text"),
    ("reading_event", "kind", "deleted"),
    ("reading_event", "field", "author_id"),
    ("reading_event", "new_value", 1e9),
    ("person", "role", "root"),
    ("person", "name", None),
    ("survey", "time_zone", "Nowhere/Town"),
    ("survey", "unit_system", "cgs"),
    ("survey", "distance_rule", "river_km"),
    ("survey", "elevation_m", 1e6),
    ("survey", "created_by_id", "nobody"),
    ("settings_version", "thresholds", {"no_such_setting": 1.0}),
    ("settings_version", "thresholds", {"oxygen_step_mg_l": "much"}),
    ("settings_version", "thresholds", [["x"]]),
    ("settings_version", "number", 0),
    ("settings_version", "number", 2.5),
    ("plan_version", "number", 2**40),
    ("plan_version", "tables", []),
    ("plan_version", "tables", {"moons": []}),
    ("plan_version", "tables", {"stations": {}}),
    ("plan_version", "tables", {"stations": ["D3"]}),
    ("plan_version", "tables", {"stations": [{"code": "D3"}]}),
    ("plan_version", "tables", {"stations": [{"code": "Z9", "distance_km": 1.0}]}),
    ("plan_version", "tables", {"stations": [{"code": ["D3"], "distance_km": 1.0}]}),
    ("plan_version", "tables", {"waters": [{"kind": "lake", "name": "x", "flow_m3_s": 1.0}]}),
    ("plan_version", "tables", {"reaches": [{"from_km": "0", "to_km": 1.0, "depth_m": 1.0}]}),
    ("plan_version", "tables", {"day": [{"crew_until": "noon"}]}),
    ("decision", "screen", []),
    ("decision", "screen", {"ticked": 5}),
    ("decision", "screen", {"place": ["x"]}),
    ("decision", "screen", {"answer": "held"}),
    ("history", "particulars", [1]),
    ("history", "what", "survey file imported"),
    ("survey_member", "person_id", "nobody"),
]  # fmt: skip


@pytest.mark.parametrize(("name", "column", "value"), WRONG)
def test_what_no_form_would_have_stored_is_refused_by_name(content, name, column, value):
    bad = with_rows(content, name, lambda rows: rows[-1].update({column: value}))
    with pytest.raises(BadSurveyFile) as refusal:
        service.read(bad)
    assert len(str(refusal.value)) < 400


@pytest.mark.parametrize(
    "line", [b"[]", b"5", b"{", b"\xff", b'{"id":NaN}', b"[" * 5000, b'{"id": ' + b"9" * 5000 + b"}", b""]
)
def test_lines_that_are_no_rows_are_refused(content, line):
    refused(resealed(content, lambda files: files.update({"station.jsonl": line + b"\n"})), "station.jsonl, row 1")


def test_rows_and_codes_that_stand_twice_are_refused(content):
    refused(with_rows(content, "reading", lambda rows: rows.append(rows[0])), "holds a row twice")
    refused(with_rows(content, "station", lambda rows: rows[0].update(code=rows[1]["code"].lower())), "same code")
    twice = with_rows(content, "settings_version", lambda rows: rows[0].update(number=rows[1]["number"]))
    refused(twice, "not numbered one by one")


@pytest.mark.parametrize("number", [0, 2])
def test_a_file_holds_one_survey(content, number):
    refused(with_rows(content, "survey", lambda rows: rows.__setitem__(slice(None), rows * number)), "one survey|twice")


def test_rows_that_are_another_surveys_here_are_refused(content, database_with_people, tmp_path):
    def elsewhere(text):
        return text.replace(survey_id, b"6f6e6520-6d6f-7265-2073-757276657921")

    survey_id = json.loads(unzipped(content)["survey.jsonl"])["id"].encode()
    copied = resealed(content, lambda files: files.update({name: elsewhere(text) for name, text in files.items()}))
    with servers.server_with(database_with_people, tmp_path) as here:
        with here.reading() as db:
            office = find_by_sign_in(db, "office.test").id
        servers.imported(here, content, office)
        with pytest.raises(BadSurveyFile, match="belong to another survey here"):
            servers.imported(here, copied, office)
        with here.reading() as db:
            assert db.query(Survey).count() == 1
