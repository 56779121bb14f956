import re
import uuid
from datetime import UTC, datetime, timedelta

import pytest

from tests.webapp.plans import put_plan
from webapp.display import Show
from webapp.models import History, SurveyMember
from webapp.visits import forms, queries
from webapp.visits.layers import final_visit
from webapp.visits.words import flow_text

FIRST = "0b8f6f2c-32cb-4a52-9a6f-0f5b0d3b1c11"
FORM = {"submission_id": FIRST, "arrived_at": "2026-08-12T10:14", "platform": "wade", "stage_m": "0,412",
        "width_m": "8.5", "weather": "dry", "crew": "Cleo Banks, Ben Hart"}  # fmt: skip


@pytest.fixture
def address(db, survey, people):
    """The address of the visit form at D3 of a ready plan."""
    put_plan(db, survey, people["lead"])
    return f"/surveys/{survey.id}/stations/D3/visit"


def visits(db, survey):
    db.rollback()
    db.expire_all()
    return queries.visits_of(db, survey.id)


def the_visit(db, survey):
    [visit] = visits(db, survey)
    return final_visit(visit)


def hidden(page, name):
    return re.search(rf'name="{name}" value="([^"]*)"', page).group(1).replace("&#34;", '"')


def form_of(browser, survey, visit_id, code="D3", **typed):
    """Return what a phone's form of a visit holds as the server shows it, with what is typed into it."""
    page = browser.get(f"/surveys/{survey.id}/stations/{code}/visit?visit={visit_id}").text
    fields = dict(re.findall(r'<input id="\w+" name="(\w+)"[^>]*? value="([^"]*)"', page))
    for name in ("submission_id", "visit_id", "seen", "units"):
        fields[name] = hidden(page, name)
    for name, options in re.findall(r'<select id="(\w+)".*?>(.*?)</select>', page, re.S):
        chosen = re.search(r'value="([^"]*)" selected', options)
        fields[name] = chosen.group(1) if chosen else ""
    return fields | {"note": re.search(r"<textarea.*?>(.*?)</textarea>", page, re.S).group(1)} | typed


def test_visit_is_stored_with_its_facts_in_si_and_what_was_typed(browser_as, db, survey, people, address):
    answer = browser_as("crew").post(address, FORM)
    assert (answer.status_code, answer.headers["X-Stored-Id"]) == (303, FIRST)
    visit = the_visit(db, survey)
    assert (visit.id, visit.station_code, visit.opened_by) == (FIRST, "D3", "Cleo Banks")
    assert visit.facts == {"arrived_at": datetime(2026, 8, 12, 8, 14, tzinfo=UTC), "platform": "wade",
                           "stage_m": 0.412, "width_m": 8.5, "weather": "dry",
                           "crew": "Cleo Banks, Ben Hart"}  # fmt: skip
    [entry] = visits(db, survey)[0].entries
    assert entry.entered["stage_m"] == {"text": "0,412", "unit": "m"}
    assert db.query(History).filter_by(what="visit begun").one().entity_id == FIRST


def test_htmx_save_shows_the_visit_and_names_its_id(browser_as, survey, address):
    answer = browser_as("crew").post(address, FORM, htmx=True)
    assert answer.headers["HX-Push-Url"] == f"/surveys/{survey.id}/visits/{FIRST}"
    assert answer.headers["X-Stored-Id"] == FIRST
    assert answer.text.lstrip().startswith('<section id="visit">') and "0.412 m" in answer.text


def test_visit_sent_five_times_is_one_and_the_same_id_with_other_numbers_is_refused(browser_as, db, survey, address):
    crew = browser_as("crew")
    assert {crew.post(address, FORM).headers["X-Stored-Id"] for _ in range(5)} == {FIRST}
    answer = crew.post(address, FORM | {"stage_m": "0.5"}, htmx=True)
    assert (answer.status_code, "X-Stored-Id" in answer.headers) == (409, False)
    assert "already, with other values" in answer.text and 'value="0.5"' in answer.text
    assert the_visit(db, survey).facts["stage_m"] == 0.412


@pytest.mark.parametrize(
    ("typed", "said"),
    [
        ({"arrived_at": ""}, "Enter the time of arrival"),
        ({"arrived_at": "noon"}, "as date and time"),
        ({"arrived_at": "2126-08-12T10:14"}, "still to come"),
        ({"left_at": "2026-08-12T09:00"}, "before the arrival"),
        ({"left_at": "2026-08-15T09:00"}, "more than two days"),
        ({"stage_m": "1,234"}, "two ways"),
        ({"wading_depth_m": "deep"}, "as a number"),
        ({"air_temp_c": "80"}, "between -50 and 55"),
        ({"cloud_oktas": "9"}, "between 0 and 8"),
        ({"platform": "raft"}, "from the list"),
        ({"status": "partial"}, "Say why the visit is partial"),
        ({"float_distance": "10"}, "or neither"),
        ({"float_times": "31"}, "or neither"),
        ({"float_distance": "10", "float_times": "31 fast"}, "Enter seconds"),
        ({"float_distance": "10", "float_times": "0.2"}, "1 second to 10 hours"),
        ({"flow_uncertainty_percent": "5"}, "Enter the flow"),
        ({"crew": "x" * 300}, "200 characters"),
        ({"submission_id": "1"}, "without its id"),
        ({"visit_id": "\x00;--"}, "without its id"),
    ],
)
def test_what_cannot_be_is_said_beside_its_field(typed, said):
    entry, errors = forms.parse_entry(FORM | typed, Show(time_zone="Europe/Vienna"), "D3", datetime.now(UTC))
    assert entry is None
    assert set(errors) <= {*typed, "partial_reason", "float_distance", "float_times", "flow_m3_s"}
    assert said in " ".join(errors.values())


def test_refused_form_stays_as_typed_and_nothing_is_stored(browser_as, db, survey, address):
    answer = browser_as("crew").post(address, FORM | {"stage_m": "low"}, htmx=True)
    assert (answer.status_code, "Enter the stage as a number" in answer.text) == (422, True)
    assert 'value="8.5"' in answer.text and 'value="low"' in answer.text
    assert visits(db, survey) == []


@pytest.mark.parametrize(
    ("flow_m3_s", "units", "said"),
    [
        (11.9, "si", "11.9 m³/s"),
        (0.4823, "si", "0.482 m³/s"),
        (1234.4, "si", "1234 m³/s"),
        (11.6666, "us", "412 ft³/s"),
    ],
)
def test_a_flow_is_told_to_three_figures(flow_m3_s, units, said):
    assert flow_text(Show(unit_system=units), flow_m3_s) == said


def test_float_runs_give_the_mean_velocity_with_the_factor_shown_in_words(browser_as, db, survey, address):
    runs = {"float_distance": "10", "float_times": "20 19,5; 20.5"}
    answer = browser_as("crew").post(address, FORM | runs, htmx=True)
    facts = the_visit(db, survey).facts
    assert (facts["float_distance_m"], facts["float_time_s"]) == (10, pytest.approx(20))
    assert (facts["surface_velocity_m_s"], facts["velocity_m_s"]) == (pytest.approx(0.5), pytest.approx(0.425))
    assert "0.50 m/s at the surface, 0.42 m/s on average (0.85 of it)" in answer.text


def test_going_on_with_a_visit_adds_an_entry_that_says_only_what_changed(browser_as, db, survey, address):
    crew = browser_as("crew")
    crew.post(address, FORM)
    page = crew.get(address + f"?visit={FIRST}&leaving=1").text
    assert "It began Wed 12 Aug 10:14" in page and hidden(page, "seen") == f'["{FIRST}"]'
    leaving = form_of(crew, survey, FIRST, left_at="2026-08-12T10:41", status="partial", partial_reason="thunder")
    assert crew.post(address, leaving).status_code == 303
    [visit] = visits(db, survey)
    assert [sorted(one.facts) for one in visit.entries][1] == ["left_at", "partial_reason", "status"]
    assert final_visit(visit).facts["partial_reason"] == "thunder"
    assert final_visit(visit).left_at == datetime(2026, 8, 12, 8, 41, tzinfo=UTC)


def test_a_field_that_was_emptied_is_said_to_be_empty(browser_as, db, survey, address):
    crew = browser_as("crew")
    crew.post(address, FORM)
    crew.post(address, form_of(crew, survey, FIRST, width_m=""))
    assert the_visit(db, survey).facts["width_m"] is None
    assert "Emptied: Width" in crew.get(f"/surveys/{survey.id}/visits/{FIRST}").text


@pytest.fixture
def two_phones(browser_as, survey, address):
    """A visit that two phones opened and changed, neither having seen the other's entry."""
    crew, lead = browser_as("crew"), browser_as("lead")
    crew.post(address, FORM)
    ones = form_of(crew, survey, FIRST, stage_m="0.43", note="by the crew")
    others = form_of(lead, survey, FIRST, stage_m="0.52", width_m="9.1")
    assert crew.post(address, ones).status_code == lead.post(address, others).status_code == 303
    return crew, lead


def test_two_phones_that_edit_one_visit_are_both_kept_and_both_shown(two_phones, db, survey):
    crew, _ = two_phones
    visit = the_visit(db, survey)
    assert [(entry.author.name, value) for entry, value in visit.disputes["stage_m"]] == [
        ("Cleo Banks", 0.43),
        ("Linus Ford", 0.52),
    ]
    assert list(visit.disputes) == ["stage_m"]
    assert (visit.facts["width_m"], visit.facts["note"]) == (9.1, "by the crew")
    page = crew.get(f"/surveys/{survey.id}/visits/{FIRST}").text
    assert "saved twice, without either seeing the other" in page
    assert re.search(r"Cleo Banks, [^<]*<strong>0\.430 m", page) and re.search(
        r"Linus Ford, [^<]*<strong>0\.520 m", page
    )
    assert "The lead or the office chooses" in page


def choice(lead, survey, **changed):
    page = lead.get(f"/surveys/{survey.id}/visits/{FIRST}").text
    entry = re.search(r'name="entry_id" value="([^"]*)"> 0\.430 m', page).group(1)
    form = {"submission_id": str(uuid.uuid4()), "name": "stage_m", "seen": hidden(page, "seen"), "entry_id": entry}
    return form | {"reason": "read twice on the staff"} | changed


def test_the_chief_chooses_with_a_reason_and_the_history_shows_both(two_phones, db, survey):
    _, lead = two_phones
    address = f"/surveys/{survey.id}/visits/{FIRST}/choice"
    assert lead.post(address, choice(lead, survey, reason="")).status_code == 422
    assert lead.post(address, form := choice(lead, survey)).status_code == 303
    assert lead.post(address, form).status_code == 303
    visit = the_visit(db, survey)
    assert (visit.facts["stage_m"], visit.disputes) == (0.43, {})
    page = lead.get(f"/surveys/{survey.id}/visits/{FIRST}").text
    assert all(text in page for text in ("Stage: 0.430 m", "Stage: 0.520 m", "Linus Ford", "read twice on the staff"))
    assert len(visits(db, survey)[0].entries) == 4
    told = db.query(History).filter_by(what="visit entries compared, one chosen").one()
    assert told.particulars == {"station": "D3", "says": ["stage_m"], "reason": "read twice on the staff"}


def test_what_came_after_the_chief_looked_stays_in_dispute(two_phones, db, survey, address):
    crew, lead = two_phones
    form = choice(lead, survey)
    page = crew.get(address + f"?visit={FIRST}").text
    late = {"submission_id": str(uuid.uuid4()), "visit_id": FIRST, "seen": f'["{FIRST}"]', "stage_m": "0.61"}
    assert hidden(page, "visit_id") == FIRST and crew.post(address, late).status_code == 303
    assert lead.post(f"/surveys/{survey.id}/visits/{FIRST}/choice", form).status_code == 303
    assert {value for _, value in the_visit(db, survey).disputes["stage_m"]} == {0.43, 0.61}


def test_a_dispute_is_not_settled_by_saving_over_it_without_a_reason(two_phones, db, survey, address):
    crew, _ = two_phones
    answer = crew.post(address, form_of(crew, survey, FIRST, stage_m="0.7"), htmx=True)
    assert (answer.status_code, "disagree about this visit" in answer.text) == (409, True)
    assert crew.post(address, form_of(crew, survey, FIRST, note="went on")).status_code == 303
    assert "stage_m" in the_visit(db, survey).disputes


def test_a_choice_of_what_is_not_disputed_or_by_the_crew_changes_nothing(two_phones, db, survey):
    crew, lead = two_phones
    address = f"/surveys/{survey.id}/visits/{FIRST}/choice"
    for changed, status in (
        ({"entry_id": "none"}, 404),
        ({"name": "width_m"}, 404),
        ({"name": "x"}, 404),
        ({"name": "platform", "entry_id": FIRST}, 409),
        ({"seen": "["}, 303),
    ):
        assert lead.post(address, choice(lead, survey, **changed)).status_code == status
        assert "stage_m" in the_visit(db, survey).disputes
    assert crew.post(address, choice(lead, survey)).status_code == 403  # the crew does not choose


def test_what_was_added_may_arrive_before_what_began_the_visit(browser_as, db, survey, people, address):
    later = {"submission_id": str(uuid.uuid4()), "visit_id": FIRST, "seen": f'["{FIRST}"]', "stage_m": "0.5"}
    assert browser_as("lead").post(address, later).status_code == 303
    assert browser_as("crew").post(address, FORM).status_code == 303
    visit = the_visit(db, survey)
    assert (visit.opened_by, visit.facts["stage_m"], visit.disputes) == ("Cleo Banks", 0.5, {})


def test_entry_for_a_visit_of_another_station_is_refused(browser_as, db, survey, address):
    crew = browser_as("crew")
    crew.post(address, FORM)
    other = FORM | {"submission_id": str(uuid.uuid4()), "visit_id": FIRST}
    assert crew.post(address.replace("D3", "D4"), other, htmx=True).status_code == 409
    assert len(visits(db, survey)) == 1


def test_visit_is_never_stored_under_another_name(browser_as, db, survey, people, address):
    answer = browser_as("lead").post(address, FORM | {"author_id": people["crew"].id}, htmx=True)
    assert (answer.status_code, answer.headers["X-Belongs-To"]) == (409, "another")
    assert visits(db, survey) == []


def test_visits_of_another_crews_survey_are_not_found(browser_as, db, survey, people, address):
    crew = browser_as("crew")
    crew.post(address, FORM)
    db.query(SurveyMember).filter_by(survey_id=survey.id, person_id=people["crew"].id).delete()
    db.commit()
    asked = (crew.get(address), crew.post(address, FORM), crew.get(f"/surveys/{survey.id}/visits/{FIRST}"))
    assert [one.status_code for one in asked] == [404] * 3
    assert browser_as("lead").get(f"/surveys/{survey.id}/visits/nowhere").status_code == 404


def test_form_of_a_station_nobody_knows_is_not_found(browser_as, survey, address):
    assert browser_as("crew").get(address.replace("D3", "D99")).status_code == 404


def test_own_visit_of_today_goes_on_unless_another_is_asked_for(browser_as, db, survey, address):
    crew = browser_as("crew")
    began = datetime.now(UTC) - timedelta(hours=1)
    crew.post(address, FORM | {"arrived_at": began.isoformat()})
    assert hidden(crew.get(address).text, "visit_id") == FIRST
    assert hidden(crew.get(address + "?another=1").text, "visit_id") == ""
    assert hidden(browser_as("lead").get(address).text, "visit_id") == ""
    assert 'value="Cleo Banks, Ben Hart"' in crew.get(address.replace("D3", "D4")).text


def test_visit_in_feet_is_stored_in_metres(browser_as, db, survey, address):
    browser_as("crew").post(address, FORM | {"units": "us", "width_m": "10", "wading_velocity_m_s": "2"})
    facts = the_visit(db, survey).facts
    assert (facts["width_m"], facts["wading_velocity_m_s"]) == (pytest.approx(3.048), pytest.approx(0.6096))


@pytest.mark.parametrize(
    ("depth", "velocity", "said"),
    [
        ("1,2", "0.9", "Do not wade."),
        ("1", "", "above the project"),
        ("0.5", "0.5", "no permission"),
        ("a", "\x00", ""),
    ],
)
def test_wading_is_judged_while_it_is_typed(browser_as, survey, depth, velocity, said):
    typed = {"wading_depth_m": depth, "wading_velocity_m_s": velocity}
    answer = browser_as("crew").post(f"/surveys/{survey.id}/wading", typed, htmx=True)
    assert (answer.status_code, said in answer.text) == (200, True)
    assert "safe" not in answer.text


def test_warning_about_wading_stands_before_everything_else_and_in_feet_where_the_survey_is(
    browser_as, survey, address
):
    crew = browser_as("crew")
    page = crew.post(address, FORM | {"wading_depth_m": "1.2", "wading_velocity_m_s": "0.9"}, htmx=True).text
    assert page.index("Do not wade.") < page.index("Saved on the server")
    us = {"units": "us", "wading_depth_m": "4", "wading_velocity_m_s": "3", "stage_m": "x", "submission_id": FIRST}
    form = crew.post(address, FORM | us, htmx=True).text
    assert form.index("Do not wade. Depth 4.0 ft times velocity") < form.index("is 12.0 ft²/s.") < form.index("<form")
