import io
import json
import uuid

import pytest

from tests.webapp.plans import put_plan
from webapp.meters import service as meters
from webapp.meters.new import NewMeter
from webapp.meters.queries import checks_of
from webapp.models import History, SurveyEvent, SurveyMember
from webapp.readings import queries
from webapp.visits.queries import visits_of

IDS = ["0b8f6f2c-32cb-4a52-9a6f-0f5b0d3b1c11", "0b8f6f2c-32cb-4a52-9a6f-0f5b0d3b1c12"]


@pytest.fixture
def copy_of(db, survey, people):
    """A function to the file of a phone on which two readings of the crew wait."""
    put_plan(db, survey, people["lead"])

    def written(**changed):
        records = [
            {"id": one, "survey": survey.id, "code": "D3", "author": people["crew"].id, "state": "waiting"}
            | {"fields": {"submission_id": one, "taken_at": "2026-08-12T13:20", "do_mg_l": "6.4", "water_temp_c": "19"}}
            | changed
            for one in IDS
        ]
        return json.dumps({"bankside": "waiting readings", "v": 1, "records": records}).encode()

    return written


def send(browser, data):
    return browser.post("/phone/copy", {"file": (io.BytesIO(data), "copy.json")}, content_type="multipart/form-data")


def authors(db, survey):
    return {one.id: one.author_id for one in queries.readings_of(db, survey.id)}


@pytest.mark.parametrize("role", ["crew", "lead", "office"])
def test_copy_is_stored_under_the_name_of_who_took_the_readings(browser_as, db, survey, people, copy_of, role):
    answer = send(browser_as(role), copy_of())
    assert "2 stored" in answer.text
    assert authors(db, survey) == dict.fromkeys(IDS, people["crew"].id)
    assert db.query(History).filter_by(what="records taken from a phone's file").one().particulars == {"reading": 2}


def test_copy_taken_twice_doubles_nothing(browser_as, db, survey, copy_of):
    crew = browser_as("crew")
    send(crew, copy_of())
    assert "0 stored</strong>, 2 there already, 0 not stored" in send(crew, copy_of()).text
    assert len(authors(db, survey)) == 2


def test_reading_that_the_phone_sent_before_is_there_already(browser_as, db, survey, people, copy_of):
    crew = browser_as("crew")
    fields = json.loads(copy_of())["records"][0]["fields"]
    crew.post(f"/surveys/{survey.id}/stations/D3/reading", fields | {"author_id": people["crew"].id})
    assert "1 stored</strong>, 1 there already" in send(crew, copy_of()).text


def test_crew_stores_nothing_under_anothers_name(browser_as, db, survey, people, copy_of):
    answer = send(browser_as("crew"), copy_of(author=people["lead"].id))
    assert "0 stored</strong>, 0 there already, 2 not stored" in answer.text
    assert authors(db, survey) == {}


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({"survey": "nowhere"}, "no such survey"),
        ({"code": "D99"}, "no such station"),
        ({"author": "nobody"}, "no such survey"),
        ({"fields": {"submission_id": IDS[0], "do_mg_l": "six"}}, "as a number"),
        ({"fields": {}}, "without its id"),
    ],
)
def test_what_cannot_be_stored_is_listed_with_why(browser_as, db, survey, copy_of, changed, said):
    answer = send(browser_as("lead"), copy_of(**changed))
    assert (answer.status_code, said in answer.text) == (200, True)
    assert authors(db, survey) == {}


VISIT = {"submission_id": IDS[1], "arrived_at": "2026-08-12T13:05", "stage_m": "0.41"}


def test_each_kind_is_stored_through_its_own_service_and_one_without_a_kind_is_a_reading(
    browser_as, db, survey, people, copy_of
):
    meter = meters.add_meter(db, survey, NewMeter(str(uuid.uuid4()), "Meter A"), people["lead"].id)
    check = {"submission_id": str(uuid.uuid4()), "taken_at": "2026-08-12T06:05", "meter": meter.id, "kind": "as_found",
             "parameter": "do", "standard": "air_saturated_water", "value": "8.9", "water_temp_c": "19"}  # fmt: skip
    copy = json.loads(copy_of())
    one, other = copy["records"]
    other |= {"kind": "visit", "what": "Visit at D3", "fields": VISIT}
    third = one | {"kind": "check", "code": "", "what": "Meter check, Meter A", "fields": check}
    copy["records"].append(third)
    page = send(browser_as("crew"), json.dumps(copy).encode()).text
    assert "3 stored" in page and "Visit at D3, 2026-08-12 13:05" in page
    db.rollback()
    assert list(authors(db, survey)) == [IDS[0]]
    [visit] = visits_of(db, survey.id)
    assert (visit.station.code, visit.opened_by_id, visit.entries[0].facts["stage_m"]) == (
        "D3",
        people["crew"].id,
        0.41,
    )
    [stored] = checks_of(db, survey.id)
    assert (stored.meter.name, stored.author_id) == ("Meter A", people["crew"].id)
    page = send(browser_as("crew"), json.dumps(copy).encode()).text
    assert "0 stored</strong>, 3 there already, 0 not stored" in page


def test_kind_that_nobody_knows_is_not_stored_and_the_rest_is(browser_as, db, survey, copy_of):
    copy = json.loads(copy_of())
    copy["records"][1]["kind"] = "constructor"
    assert (
        "1 stored</strong>, 0 there already, 1 not stored" in send(browser_as("crew"), json.dumps(copy).encode()).text
    )
    assert list(authors(db, survey)) == [IDS[0]]


def test_record_that_is_refused_half_way_leaves_nothing_behind(browser_as, db, survey, people, copy_of):
    db.add(SurveyEvent(survey_id=survey.id, kind="approved", version="", made_by_id=people["office"].id))
    db.commit()
    assert "2 not stored" in send(browser_as("crew"), copy_of()).text
    assert authors(db, survey) == {}


@pytest.mark.parametrize("note", ["\ud800", "a\x00b"])
def test_text_that_no_database_holds_is_refused(browser_as, db, survey, copy_of, note):
    answer = send(browser_as("lead"), copy_of(fields={"submission_id": IDS[0], "note": note}))
    assert answer.status_code == 422
    assert authors(db, survey) == {}


def test_copy_of_another_crews_survey_is_refused(browser_as, db, survey, people, copy_of):
    db.query(SurveyMember).filter_by(survey_id=survey.id, person_id=people["lead"].id).delete()
    db.commit()
    assert "2 not stored" in send(browser_as("lead"), copy_of()).text
    assert authors(db, survey) == {}


@pytest.mark.parametrize(
    "data",
    [b"", b"\x00\xff", b"[]", b"{}", b"[" * 3000, b'{"bankside": "waiting readings", "records": [{"fields": 1}]}',
     b'{"bankside": "waiting readings", "records": [{"survey": "\\u0000", "code": "", "author": "", "fields": {}}]}'],
)  # fmt: skip
def test_file_that_is_no_copy_is_refused_in_words(browser_as, data):
    answer = send(browser_as("crew"), data)
    assert answer.status_code == 422
    assert "Nothing was stored." in answer.text
