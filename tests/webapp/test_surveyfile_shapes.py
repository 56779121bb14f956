"""What meters, visits, bottles and reviews of a survey file may hold: nothing that would break a page later."""

import json

import pytest

from tests.webapp import servers
from tests.webapp.everything import put_everything
from tests.webapp.test_surveyfile_bad import with_rows
from webapp.surveyfile import checks, service
from webapp.surveyfile.archive import BadSurveyFile
from webapp.surveyfile.tables import carried


@pytest.fixture(scope="module")
def content(database_with_people, tmp_path_factory):
    """A good survey file with one of everything, made once: nobody changes bytes."""
    place = servers.server_with_survey(database_with_people, tmp_path_factory.mktemp("source"))
    with place as (database, survey, people):
        with database.writing() as db:
            put_everything(db, survey, people)
        yield servers.exported(database, survey)


DRIFT = {"scale": 1.02, "shift": 0.0}
WRONG = [
    ("reading", {"series": [{"do_mg_l": "6.1"}]}),
    ("reading", {"series": [{"do_mg_l": 1e9}]}),
    ("reading", {"series": [{"after": 5.0}]}),
    ("reading", {"series": [6.1]}),
    ("reading", {"series": {"do_mg_l": 6.1}}),
    ("reading", {"series": [{"after_s": True}]}),
    ("reading", {"soak_s": -5.0}),
    ("reading", {"ph": 15.0}),
    ("reading", {"stable": "yes"}),
    ("reading_event", {"kind": "drift", "particulars": {}}),
    ("reading_event", {"kind": "drift", "particulars": {"scale": "1", "shift": 0.0}}),
    ("reading_event", {"kind": "drift", "particulars": {"scale": 1.0, "shift": None}}),
    ("reading_event", {"kind": "drift", "particulars": {"scale": 0.0, "shift": 0.0}}),
    ("reading_event", {"kind": "drift", "particulars": {"scale": 1e300, "shift": 0.0}}),
    ("reading_event", {"kind": "drift", "particulars": {**DRIFT, "start_check": ["x"]}}),
    ("reading_event", {"kind": "drift", "particulars": {**DRIFT, "read": "much"}}),
    ("reading_event", {"kind": "kept", "particulars": []}),
    ("meter", {"name": " "}),
    ("meter", {"method": "guess"}),
    ("meter", {"percent_basis": "here"}),
    ("meter", {"cap_changed_on": "last week"}),
    ("meter", {"resolution_mg_l": -1.0}),
    ("meter_check", {"kind": "look"}),
    ("meter_check", {"parameter": "turbidity"}),
    ("meter_check", {"standard": "gin"}),
    ("meter_check", {"standard": "ph_buffer"}),
    ("meter_check", {"value": 900.0}),
    ("meter_check", {"pressure_mmhg": -1.0}),
    ("meter_check", {"pressure_source": "guess"}),
    ("meter_check", {"water_temp_c": 1e9}),
    ("meter_check", {"action": "thrown away"}),
    ("meter_check", {"expires_on": "2026-13"}),
    ("meter_check", {"entered": {"value": "7.8"}}),
    ("meter_check", {"judged": []}),
    ("meter_check", {"judged": {"says": 5}}),
    ("meter_check", {"judged": {"kept": [{"name": "x"}]}}),
    ("meter_check", {"judged": {"error": "large"}}),
    ("meter_check", {"meter_id": "nowhere"}),
    ("meter_check_event", {"kind": "deleted"}),
    ("meter_check_event", {"check_id": "nowhere"}),
    ("visit", {"station_id": "nowhere"}),
    ("visit_entry", {"facts": []}),
    ("visit_entry", {"facts": {"stage_m": "high"}}),
    ("visit_entry", {"facts": {"stage_m": 1e9}}),
    ("visit_entry", {"facts": {"arrived_at": "noon"}}),
    ("visit_entry", {"facts": {"arrived_at": "2026-08-12T06:00:00"}}),
    ("visit_entry", {"facts": {"platform": "raft"}}),
    ("visit_entry", {"facts": {"platform": ["wade"]}}),
    ("visit_entry", {"facts": {"note": 5}}),
    ("visit_entry", {"facts": {"float_time_s": "x"}}),
    ("visit_entry", {"facts": {"new": {"deep": 1}}}),
    ("visit_entry", {"seen": [5]}),
    ("visit_entry", {"seen": {}}),
    ("visit_entry", {"entered": {"stage_m": {"text": 5, "unit": "m"}}}),
    ("bottle", {"analysis": "taste"}),
    ("bottle", {"kind": "spare"}),
    ("bottle", {"code": ""}),
    ("bottle", {"position": "top"}),
    ("bottle", {"volume_ml": -5.0}),
    ("bottle", {"full": "yes"}),
    ("hand_over", {"bottles": [5]}),
    ("hand_over", {"bottles": {}}),
    ("hand_over", {"temperature_c": 1e6}),
    ("lab_result", {"censor": "about"}),
    ("lab_result", {"censor": "less_than", "value": 2.0, "limit_value": 2.0}),
    ("lab_result", {"censor": "greater_than", "value": None, "limit_value": None}),
    ("lab_result", {"quality": {"blank_mg_l": "low"}}),
    ("lab_result", {"quality": {"colour": 5.0}}),
    ("lab_result", {"quality": []}),
    ("lab_result", {"bottle_id": "nowhere"}),
    ("survey_event", {"kind": "praised"}),
    ("station", {"code": "a/b"}),
    ("station", {"code": ".."}),
    ("history", {"what": "dataset imported"}),
]  # fmt: skip


def test_a_file_with_one_of_everything_is_good(content):
    tables = service.read(content)
    assert [name for name, rows in tables.items() if not rows] == []


@pytest.mark.parametrize(("name", "values"), WRONG, ids=[f"{name}-{json.dumps(told)[:50]}" for name, told in WRONG])
def test_what_no_form_would_have_stored_is_refused_by_name(content, name, values):
    with pytest.raises(BadSurveyFile) as refusal:
        service.read(with_rows(content, name, lambda rows: rows[-1].update(values)))
    assert len(str(refusal.value)) < 400


def test_a_station_that_no_plan_ever_had_is_refused(content):
    def more(rows):
        rows.append({**rows[0], "id": "6f6e6520-6d6f-7265-2073-746174696f6e", "code": "Z9"})

    with pytest.raises(BadSurveyFile, match="Station .* has a “code”"):
        service.read(with_rows(content, "station", more))


def test_what_a_newer_bankside_tells_of_a_visit_is_kept(content):
    newer = with_rows(content, "visit_entry", lambda rows: rows[-1].update(facts={"turbidity_ntu": 3.5, "clear": True}))
    assert service.read(newer)["visit_entry"][-1]["facts"] == {"turbidity_ntu": 3.5, "clear": True}


def test_every_choice_fits_into_its_column():
    too_long = [
        (name, column, key)
        for name, choices in checks._CHOICES.items()
        for column, allowed in choices.items()
        for key in allowed
        if len(key) > (carried()[name].columns[column].type.length or 100)
    ]
    assert too_long == []
