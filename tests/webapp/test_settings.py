"""The settings page: every threshold with its default and source, changed in versions, restored, and by two at once."""

import re

import pytest

from calc.settings import SETTINGS, Settings
from tests.webapp.sheets import put_readings
from webapp.models import SettingsVersion
from webapp.readings.judging import judgement_of
from webapp.settings.forms import parse_change
from webapp.settings.topics import TOPICS, limits_of
from webapp.surveys.queries import current_settings, history_of
from webapp.surveys.service import remove_member

FIRST = SettingsVersion(number=1, thresholds=Settings().as_dict())


@pytest.fixture
def address(survey):
    return f"/surveys/{survey.id}/settings"


@pytest.fixture
def stored(app, survey):
    """A function to every version of the survey's settings, oldest first."""

    def versions():
        with app.extensions["bankside_database"].reading() as db:
            query = db.query(SettingsVersion).filter_by(survey_id=survey.id)
            return query.order_by(SettingsVersion.number).all()

    return versions


def test_every_setting_stands_in_one_topic():
    keys = [one.key for topic in TOPICS for one in topic.settings]
    assert sorted(keys) == sorted(one.key for one in SETTINGS)


def test_every_default_may_be_typed():
    assert [one.key for one in SETTINGS if not limits_of(one)[0] <= one.default <= limits_of(one)[1]] == []


def test_the_page_shows_every_threshold_with_unit_default_and_source(browser_as, address):
    page = browser_as("lead").get(address).text
    for one in SETTINGS:
        field = page[page.index(f'id="{one.key}"') :][:700]
        assert one.unit in field
        assert one.source.split(",")[0] in field


def test_a_change_is_a_new_version_and_the_old_one_stays(browser_as, address, stored, app, survey, people):
    lead = browser_as("lead")
    answer = lead.post(
        address, {"based_on": "1", "replicate_mg_l": "0,25", "zero_mg_l": "0.1", "reason": "as the permit says"}
    )
    assert answer.status_code == 303
    first, second = stored()
    assert first.thresholds == Settings().as_dict()
    assert second.thresholds == Settings(replicate_mg_l=0.25, zero_mg_l=0.1).as_dict()
    assert (second.number, second.reason, second.made_by_id) == (2, "as the permit says", people["lead"].id)
    with app.extensions["bankside_database"].reading() as db:
        line = history_of(db, survey.id)[-1]
    assert (line.what, line.entity_id) == ("settings changed", second.id)
    assert line.particulars["changed"] == {"replicate_mg_l": [0.2, 0.25], "zero_mg_l": [0.2, 0.1]}
    page = lead.get(address).text  # who, when, why and what
    assert "Version 2</strong>, in use" in page
    assert "by Linus Ford" in page
    assert "Why: as the permit says" in page
    assert "Replicate: oxygen agrees within: from 0.2 to 0.25 mg/L" in page


@pytest.mark.parametrize(
    ("key", "typed", "says"),
    [
        ("replicate_mg_l", "lots", "Enter a number, for example 0.2."),
        ("replicate_mg_l", "", "Enter a number; the trade's default is 0.2."),
        ("replicate_mg_l", "nan", "Enter a number, for example 0.2."),
        ("replicate_mg_l", "-0.1", "This must lie between 0 and 1000000 mg/L; check it."),
        ("sea_level_low_mmhg", "1,234", "Say which you mean"),
        ("upper_depth_percent", "120", "This must lie between 0 and 100 %; check it."),
        ("stable_values", "0", "This must lie between 1 and 1000 values; check it."),
        ("inhg_low", "31", "This must be below “Pressure that looks like inHg: to”, which is 31."),
        ("grade_good_mg_l", "0.3", "This must be above “Grade: oxygen, excellent up to”, which is 0.3."),
    ],
)
def test_a_bad_value_is_told_and_nothing_comes_of_the_form(key, typed, says):
    change, errors = parse_change({"based_on": "1", key: typed, "snapshot_h": "4", "reason": "dry"}, FIRST)
    assert change is None
    assert says in errors.pop(key)
    assert errors == {}


def test_a_bad_value_is_told_beside_its_field_and_all_that_was_typed_stays(browser_as, address, stored):
    form = {"based_on": "1", "inhg_low": "31", "zero_mg_l": "much", "snapshot_h": "4", "reason": "dry"}
    answer = browser_as("office").post(address, form)
    assert answer.status_code == 422
    assert "must be below “Pressure" in re.search(r'id="inhg_low-error">([^<]*)', answer.text).group(1)
    assert 'id="zero_mg_l" name="zero_mg_l" value="much"' in answer.text
    assert 'id="snapshot_h" name="snapshot_h" value="4"' in answer.text
    assert ">dry</textarea>" in answer.text
    assert len(stored()) == 1


def test_without_reason_or_change_there_is_no_version():
    _, errors = parse_change({"snapshot_h": "4"}, FIRST)
    assert set(errors) == {"reason"}
    _, errors = parse_change({"snapshot_h": "3.0", "reason": "none"}, FIRST)
    assert errors == {"nothing": "Every value is as it was. Change one, then save."}


def test_the_same_change_sent_twice_is_one_version(browser_as, address, stored):
    lead, form = browser_as("lead"), {"based_on": "1", "snapshot_h": "4", "reason": "a long day"}
    assert [lead.post(address, form).status_code for _ in range(2)] == [303, 303]
    assert len(stored()) == 2


def test_two_people_at_once_see_what_the_other_changed(browser_as, address, stored):
    browser_as("office").post(address, {"based_on": "1", "snapshot_h": "4", "zero_mg_l": "0.1", "reason": "first"})
    lead, form = browser_as("lead"), {"based_on": "1", "snapshot_h": "5", "zero_mg_l": "0.2", "reason": "second"}
    answer = lead.post(address, form)
    assert answer.status_code == 409
    assert "Somebody changed the settings since you opened them" in answer.text
    assert "Set to 4 h meanwhile" in answer.text
    assert 'name="snapshot_h" value="5"' in answer.text  # what was typed stays
    assert 'name="zero_mg_l" value="0.1"' in answer.text  # what was not touched is as it is now
    assert 'name="based_on" value="2"' in answer.text
    assert len(stored()) == 2
    assert lead.post(address, {"based_on": "2", "snapshot_h": "5", "reason": "second"}).status_code == 303
    assert stored()[-1].thresholds == Settings(snapshot_h=5.0, zero_mg_l=0.1).as_dict()


def test_defaults_and_earlier_versions_are_filled_in_and_saved_like_any_change(browser_as, address, stored):
    lead = browser_as("lead")
    lead.post(address, {"based_on": "1", "snapshot_h": "4", "reason": "a long day"})
    assert "just these values already" in lead.get(f"{address}?fill=2").text
    filled = lead.get(f"{address}?fill=defaults").text
    assert "The trade&#39;s defaults are filled in below" in filled
    assert 'name="snapshot_h" value="3"' in filled
    assert 'name="snapshot_h" value="3"' in lead.get(f"{address}?fill=1").text
    assert len(stored()) == 2
    assert lead.post(address, {"based_on": "2", "snapshot_h": "3", "reason": "as the trade"}).status_code == 303
    assert stored()[-1].thresholds == Settings().as_dict()


def test_the_crew_looks_and_does_not_change(browser_as, address, stored):
    crew = browser_as("crew")
    page = crew.get(address).text
    assert "Replicate: oxygen agrees within" in page
    assert 'name="replicate_mg_l"' not in page
    assert crew.post(address, {"based_on": "1", "snapshot_h": "4", "reason": "x"}).status_code == 403
    assert len(stored()) == 1


def test_neither_a_version_nor_a_survey_of_others_is_found(app, browser_as, survey, people):
    lead = browser_as("lead")
    for number in ("", "0", "7", "-1", "9" * 30, "two"):  # a strange version number breaks nothing
        form = {"based_on": number, "snapshot_h": "x", "reason": "x"}
        assert lead.post(f"/surveys/{survey.id}/settings", form).status_code in (404, 422)
    assert lead.get(f"/surveys/{survey.id}/settings?fill=7").status_code == 404
    with app.extensions["bankside_database"].writing() as db:
        remove_member(db, survey.id, people["lead"].id, people["office"].id)
    assert lead.get(f"/surveys/{survey.id}/settings").status_code == 404
    assert lead.post(f"/surveys/{survey.id}/settings", {"reason": "x"}).status_code == 404
    assert lead.get("/surveys/nowhere/settings").status_code == 404


def test_a_version_that_lacks_a_newer_setting_has_its_default(app, browser_as, address, survey, stored):
    with app.extensions["bankside_database"].writing() as db:
        version = current_settings(db, survey.id)
        version.thresholds = {"snapshot_h": 4.0}
        db.commit()
    assert browser_as("lead").post(address, {"based_on": "1", "zero_mg_l": "0.1", "reason": "x"}).status_code == 303
    assert stored()[-1].thresholds == Settings(snapshot_h=4.0, zero_mg_l=0.1).as_dict()


def test_a_change_says_how_many_readings_are_judged_otherwise(db, browser_as, address, survey, people):
    ids = put_readings(db, survey, people)
    lead, before = browser_as("lead"), said_of_all(db, survey)
    form = {"based_on": "1", "oxygen_low_mg_l": "4.5", "reason": "the sensor's own limit"}
    page = lead.get(lead.post(address, form).location).text
    after = said_of_all(db, survey)
    moved = {one for one in before if after[one] != before[one]}
    assert ids["D3"] in moved  # it reads 4.25
    assert ids["U1"] not in moved  # it reads 8.1
    assert f"{len(moved)} of 4 readings are judged otherwise than before" in page
    assert history_of(db, survey.id)[-1].particulars["otherwise"] == len(moved)


def said_of_all(db, survey):
    db.rollback()
    return {one: (judged.quality, judged.reasons) for one, judged in judgement_of(db, survey).by_id.items()}
