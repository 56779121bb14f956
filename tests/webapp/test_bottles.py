"""Bottles: filled at a station, handed over, and what the laboratory found; each recorded once and never changed."""

import io
import json
import uuid
from datetime import UTC, datetime, timedelta

import pytest

from calc.settings import Settings
from tests.webapp.plans import put_plan
from tests.webapp.sheets import put_readings
from webapp.bottles import asking, forms, importing, queries, service
from webapp.bottles.columns import read_result
from webapp.bottles.new import NewBottle, NewHandOver, NewResult
from webapp.display import Show
from webapp.errors import Conflict
from webapp.forms import NotANumber
from webapp.models import Bottle, History, SurveyEvent
from webapp.readings.queries import readings_of

FILLED = datetime(2026, 8, 12, 4, 10, tzinfo=UTC)
NOW = datetime(2026, 8, 20, tzinfo=UTC)
SHOW = Show(time_zone="Europe/Vienna")
HOUR = timedelta(hours=1)


@pytest.fixture
def planned(db, survey, people):
    """The survey with a plan, in the db's session."""
    put_plan(db, survey, people["lead"])
    return survey


def typed(code="B1", **more):
    return {
        "submission_id": str(uuid.uuid4()),
        "code": code,
        "analysis": "bod5",
        "collected_at": "2026-08-12T06:10",
        **more,
    }


def filled(code="B1", **more):
    return NewBottle(str(uuid.uuid4()), **{"station_code": "D3", "code": code, "analysis": "bod5"} | more,
                     **{} if "collected_at" in more else {"collected_at": FILLED})  # fmt: skip


def put(db, survey, people, new):
    return service.add_bottle(db, survey, new, people["crew"].id, new.collected_at)


def found(bottle, result_id=None, **more):
    return NewResult(result_id or str(uuid.uuid4()), bottle.id, **more)


def test_a_bottle_is_stored_with_what_was_typed(db, planned, people, browser_as):
    form = typed(
        analysis="nh3_n", kind="replicate", replicate_of="A7", sample_depth_m="0,3", position="left", volume_ml="500",
        preservative="H2SO4", full="no", filtered="yes", on_ice_at="2026-08-12T06:20", note="foam",
        saved_at="2026-08-12T04:11:00Z", author_id=people["crew"].id,
    )  # fmt: skip
    answer = browser_as("crew").post(f"/surveys/{planned.id}/stations/D3/bottle", form)
    assert answer.status_code == 303
    assert answer.headers["X-Stored-Id"] == form["submission_id"]
    (bottle,) = queries.bottles_of(db, planned.id)
    assert (bottle.id, bottle.station.code, bottle.author_id) == (form["submission_id"], "D3", people["crew"].id)
    assert (bottle.collected_at, bottle.on_ice_at) == (FILLED, FILLED + timedelta(minutes=10))
    assert (bottle.analysis, bottle.kind, bottle.replicate_of) == ("nh3_n", "replicate", "A7")
    assert (bottle.sample_depth_m, bottle.position, bottle.volume_ml) == (0.3, "left", 500)
    assert (bottle.full, bottle.filtered, bottle.preservative, bottle.note) == (False, True, "H2SO4", "foam")
    assert bottle.entered["sample_depth_m"] == {"text": "0,3", "unit": "m"}


def test_a_bottle_sent_five_times_is_one(db, planned, people):
    new = filled()
    assert {put(db, planned, people, new).id for _ in range(5)} == {new.id}
    assert db.query(Bottle).count() == 1
    assert db.query(History).filter_by(what="bottle filled").count() == 1
    with pytest.raises(Conflict, match="stored already, with other values"):
        put(db, planned, people, filled(code="B2").__class__(new.id, "D3", "B2", "bod5", FILLED))
    with pytest.raises(Conflict, match="at another station"):
        put(db, planned, people, NewBottle(new.id, "D4", "B1", "bod5", FILLED))


def test_a_code_used_before_is_refused_beside_the_field(db, planned, people, browser_as):
    put(db, planned, people, filled("b1"))
    answer = browser_as("crew").post(
        f"/surveys/{planned.id}/stations/D4/bottle", typed("B1", note="second", saved_at="2026-08-12T04:11:00Z")
    )
    assert answer.status_code == 422
    assert "X-Stored-Id" not in answer.headers
    assert 'id="code-error">Bottle b1 is here already, filled at D3' in answer.text
    assert ">second</textarea>" in answer.text
    db.rollback()
    assert db.query(Bottle).count() == 1


def test_a_bottle_that_went_on_ice_at_once_needs_no_second_time():
    assert forms.parse_bottle(typed(ice_at_once="yes"), SHOW, "D3", NOW)[0].on_ice_at == FILLED
    later = typed(ice_at_once="yes", on_ice_at="2026-08-12T06:20")
    assert forms.parse_bottle(later, SHOW, "D3", NOW)[0].on_ice_at == FILLED + timedelta(minutes=10)
    assert forms.parse_bottle(typed(), SHOW, "D3", NOW)[0].on_ice_at is None


@pytest.mark.parametrize(
    ("field", "text", "says"),
    [
        ("code", "", "Enter the code on its label."),
        ("code", "x" * 41, "Shorten the code"),
        ("analysis", "gold", "Choose the analysis from the list."),
        ("collected_at", "noon", "as date and time"),
        ("collected_at", "2026-09-12T06:10", "still to come"),
        ("on_ice_at", "2026-08-12T05:00", "before the bottle was filled"),
        ("sample_depth_m", "1,234", "Say which you mean"),
        ("volume_ml", "0", "must lie between 1 and 20000"),
        ("kind", "jar", "Choose the kind"),
        ("replicate_of", "b1", "can't repeat itself"),
        ("position", "middle", "Choose the position"),
        ("submission_id", "7", "without its id"),
    ],
)
def test_a_field_that_cannot_be_is_told(field, text, says):
    new, errors = forms.parse_bottle(typed(**{field: text}), SHOW, "D3", NOW)
    assert new is None
    assert says in errors[field]
    assert len(errors) == 1


def test_another_persons_bottle_waits_for_them_and_another_surveys_is_not_found(planned, people, browser_as):
    crew, form = browser_as("crew"), typed(author_id=people["lead"].id)
    answer = crew.post(f"/surveys/{planned.id}/stations/D3/bottle", form, htmx=True)
    assert (answer.status_code, answer.headers["X-Belongs-To"]) == (409, "another")
    assert "X-Stored-Id" not in answer.headers
    for where in ("bottles", "bottles/x", "stations/D3/bottle", "bottles/hand-over"):
        assert crew.get(f"/surveys/nowhere/{where}").status_code == 404
    for where in ("bottles/x", "stations/X9/bottle"):
        assert crew.get(f"/surveys/{planned.id}/{where}").status_code == 404


def test_what_is_odd_is_asked_about_once_and_kept(db, survey, people, browser_as):
    put_readings(db, survey, people)
    crew, address = browser_as("crew"), f"/surveys/{survey.id}/stations/D2/bottle"
    form = typed(on_ice_at="2026-08-12T06:40")
    asked = crew.post(address, form, htmx=True)
    assert asked.status_code == 422
    assert "30 minutes until it was on ice; 15 are allowed" in asked.text
    assert "No oxygen was read at this point of D2 yet" in asked.text
    keep = asked.text.split('name="keep" value="')[1].split('"')[0].replace("&#34;", '"')
    stored = crew.post(address, form | {"keep": keep}, htmx=True)
    assert stored.headers["X-Stored-Id"] == form["submission_id"]
    assert "No oxygen was read at this point of D2 yet" in stored.text  # as asked, and kept


def test_a_reading_at_the_point_within_ten_minutes_asks_nothing(db, survey, people):
    put_readings(db, survey, people)
    readings = readings_of(db, survey.id)

    def asks(minutes, **more):
        near = next(one for one in readings if one.station.code == "D3").taken_at + timedelta(minutes=minutes)
        new = filled(collected_at=near, on_ice_at=near, **more)
        return [one.name for one in asking.asks(Settings(), new, readings, [], near)]

    assert asks(10) == []
    assert asks(-10, position="left") == []  # where the reading was taken is not told
    assert asks(11) == ["bottle_without_reading"]
    assert asks(11, kind="blank") == []
    assert asks(0, replicate_of="B9") == ["replicate_unknown"]


def test_what_waited_on_a_phone_is_not_asked_about():
    new = filled(on_ice_at=FILLED + HOUR)
    assert asking.asks(Settings(), new, [], [], NOW, saved_at=FILLED) == []


def test_a_bottle_out_of_a_phones_file_is_stored_once(db, planned, people, browser_as):
    form = typed(author_id=people["crew"].id, saved_at="2026-08-12T04:11:00Z")
    record = {"id": form["submission_id"], "kind": "bottle", "survey": planned.id, "code": "D3"}
    record |= {"author": people["crew"].id, "what": "Bottle at D3", "state": "waiting", "fields": form}
    data = json.dumps({"bankside": "waiting readings", "v": 2, "records": [record]}).encode()
    for says in ("1 stored</strong>", "1 there already"):
        file = {"file": (io.BytesIO(data), "copy.json")}
        assert says in browser_as("crew").post("/phone/copy", file, content_type="multipart/form-data").text
    assert [one.code for one in queries.bottles_of(db, planned.id)] == ["B1"]


def test_a_hand_over_moves_the_bottles_to_who_took_them(db, planned, people, browser_as):
    bottle = put(db, planned, people, filled())
    crew, address = browser_as("crew"), f"/surveys/{planned.id}/bottles/hand-over"
    form = {"submission_id": str(uuid.uuid4()), "bottles": bottle.id, "gave": "Cleo", "took": "Rill courier 77",
            "at": "2026-08-12T12:00", "place": "ford", "temperature_c": "3,5", "seal": "12, whole"}  # fmt: skip
    assert [crew.post(address, form).status_code for _ in range(2)] == [303, 303]
    (told,) = queries.hand_overs_of(db, planned.id)
    assert (told.bottles, told.took, told.temperature_c, told.seal) == (
        [bottle.id],
        "Rill courier 77",
        3.5,
        "12, whole",
    )
    page = crew.get(f"/surveys/{planned.id}/bottles").text
    assert "now with Rill courier 77" in page
    assert "1 bottle. Wed 12 Aug 12:00: Cleo gave to Rill courier 77, ford, 3.5 °C in the cooler" in page
    early = crew.post(address, form | {"submission_id": str(uuid.uuid4()), "at": "2026-08-12T05:00", "took": ""})
    assert early.status_code == 422
    assert "That is before B1 was filled" in early.text
    assert "Enter the name of who took them." in early.text
    assert f'value="{bottle.id}" checked' in early.text
    assert "Tick the bottles" in crew.post(address, form | {"bottles": "nothing"}).text


@pytest.mark.parametrize(
    ("text", "result"),
    [
        ("4.1", ("none", 4.1, None)),
        ("4,1", ("none", 4.1, None)),
        (" <2 ", ("less_than", None, 2.0)),
        ("< 0,2", ("less_than", None, 0.2)),
        (">300", ("greater_than", None, 300.0)),
        ("", ("none", None, None)),
    ],
)
def test_a_result_is_read_as_the_laboratory_writes_it(text, result):
    assert read_result(text) == result


@pytest.mark.parametrize("text", ["<", "ND", "-1", "<-2", "2<", "nan", "1,234", "1e5", "<<2", "٣"])
def test_a_result_that_is_none_is_refused(text):
    with pytest.raises(NotANumber, match=r"."):
        read_result(text)


def test_a_newer_result_holds_and_the_earlier_one_stays(db, planned, people, browser_as):
    bottle = put(db, planned, people, filled())
    lead, address = browser_as("lead"), f"/surveys/{planned.id}/bottles/{bottle.id}/result"
    form = {"submission_id": str(uuid.uuid4()), "result": "<2", "laboratory": "Weir Lab", "arrival_temp_c": "7.5",
            "started_at": "2026-08-14T07:00", "finished_at": "2026-08-19T07:00", "blank_mg_l": "0.1"}  # fmt: skip
    assert [lead.post(address, form).status_code for _ in range(2)] == [303, 303]
    assert lead.post(address, form | {"result": "3"}).status_code == 409
    page = lead.get(address).text
    assert 'value="Weir Lab"' in page
    assert 'value="2026-08-14T07:00"' in page
    assert lead.post(address, form | {"submission_id": str(uuid.uuid4()), "result": "2.4"}).status_code == 303
    first, second = queries.results_of(db, planned.id)
    assert (first.censor, first.value, first.limit_value, first.quality) == (
        "less_than",
        None,
        2.0,
        {"blank_mg_l": 0.1},
    )
    assert (second.censor, second.value) == ("none", 2.4)
    page = lead.get(f"/surveys/{planned.id}/bottles/{bottle.id}").text
    assert "Past its hold time: 48.8 h of 48 h" in page
    assert "7.5 °C on receipt: warmer than 6 °C" in page
    assert "an earlier one; a newer one holds" in page
    assert "2.4 mg/L" in page
    assert "&lt;2 mg/L" in page
    assert browser_as("crew").post(address, form).status_code == 403


def test_a_result_form_says_what_cannot_be(db, planned, people):
    bottle = put(db, planned, people, filled())
    form = {"submission_id": str(uuid.uuid4()), "result": "some", "started_at": "2026-08-12T05:00",
            "finished_at": "2026-08-11T05:00", "arrival_temp_c": "99", "limit_value": "-1"}  # fmt: skip
    new, errors = forms.parse_result(form, SHOW, bottle, NOW)
    assert new is None
    assert set(errors) == {"result", "started_at", "finished_at", "arrival_temp_c", "limit_value"}
    _, errors = forms.parse_result({"submission_id": str(uuid.uuid4()), "laboratory": "x"}, SHOW, bottle, NOW)
    assert "Enter the result, or when the bottle arrived" in errors["result"]


TABLE = """Bottle;Result;Set up;Read;Temperature on arrival (F);Lab;Reporting limit;blank_mg_l
B1;<2;14.8.2026 07:00;19.8.2026 07:00;41;Weir Lab;;0,15
B2;4,1;13.8.2026 07:00;18.8.2026 07:00;41;Weir Lab;2;
"""


def test_a_laboratorys_table_is_imported_once(db, planned, people, browser_as):
    for code in ("B1", "B2"):
        put(db, planned, people, filled(code))
    lead, address = browser_as("lead"), f"/surveys/{planned.id}/bottles/import"
    preview = lead.post(f"{address}/preview", {"text": TABLE}).text
    assert "2 new results." in preview
    assert queries.results_of(db, planned.id) == []
    for added in (2, 0):
        assert lead.post(address, {"text": TABLE}).location.endswith(f"added={added}")
    db.rollback()
    first, second = sorted(queries.results_of(db, planned.id), key=lambda one: one.censor)
    assert (first.censor, first.value, first.limit_value) == ("less_than", None, 2.0)
    assert (second.censor, second.value, second.limit_value) == ("none", 4.1, 2.0)
    assert first.arrival_temp_c == pytest.approx(5.0)
    assert first.started_at == datetime(2026, 8, 14, 5, tzinfo=UTC)
    assert (first.quality, first.entered["result"]["text"]) == ({"blank_mg_l": 0.15}, "<2")
    assert "&lt;2" in lead.get(f"/surveys/{planned.id}/bottles").text


def test_a_bad_cell_of_a_laboratorys_table_is_named_and_nothing_stored(db, planned, people):
    put(db, planned, people, filled())
    text = "Bottle,Result,Started,Finished\nB1,lots,2026-08-12 05:00,\nB9,3,,\nB1,,,\nB1,3,2030-01-01 05:00,\n"
    seen = importing.preview(db, planned, text, NOW)
    assert [(cell.row, cell.column_label) for cell in seen.errors] == [
        (2, "Started"), (2, "Result"), (3, "Bottle"), (4, "Result"), (5, "Started"),
    ]  # fmt: skip
    assert not seen.good
    bottles = [*queries.bottles_of(db, planned.id), put(db, planned, people, filled("=B2"))]
    seen = importing.preview(db, planned, importing.empty_sheet(Show.of(planned), bottles), NOW)
    assert [row["code"] for row in seen.file.rows] == ["B1", "=B2"]  # the table to fill in reads back


def test_an_approved_survey_takes_no_bottle_hand_over_or_result(db, planned, people, browser_as):
    bottle = put(db, planned, people, filled())
    db.add(SurveyEvent(survey_id=planned.id, kind="approved", version="1-a", made_by_id=people["office"].id))
    db.commit()
    handed = NewHandOver(str(uuid.uuid4()), (bottle.id,), "a", "b", FILLED)
    for write in (
        lambda: put(db, planned, people, filled("B2")),
        lambda: service.add_hand_over(db, planned, handed, people["crew"].id),
        lambda: service.add_result(db, planned, found(bottle, value=3.0), people["lead"].id),
    ):
        with pytest.raises(Conflict, match="This survey is approved"):
            write()
        db.rollback()
    answer = browser_as("crew").post(
        f"/surveys/{planned.id}/stations/D3/bottle", typed("B2", saved_at="2026-08-12T04:11:00Z"), htmx=True
    )
    assert answer.status_code == 409
    assert "This survey is approved" in answer.text
    assert "X-Stored-Id" not in answer.headers
