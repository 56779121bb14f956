"""What the tables of a dataset tell beside the readings, and that pandas and R open it by the lines it shows."""

import csv
import math
import shutil
import subprocess

import pandas
import pytest

from tests.needs import missing
from tests.webapp.everything import unpacked
from webapp.dataset.fields import as_written
from webapp.dataset.line import may_be_off_mg_l
from webapp.dataset.recipes import PANDAS, R


@pytest.fixture(scope="module")
def folder(database_with_people, tmp_path_factory):
    """The zip of a survey with one of everything, unpacked. Made once: nobody changes it."""
    return unpacked(database_with_people, tmp_path_factory)


def rows_in(folder, name):
    with (folder / f"{name}.csv").open(encoding="utf-8", newline="") as opened:
        return list(csv.DictReader(opened))


def at(folder, code, name="readings"):
    return [row for row in rows_in(folder, name) if row["station_code"] == code]


def test_a_drifted_reading_is_traced_from_what_to_use_back_to_what_was_typed(folder):
    row = at(folder, "D2")[0]
    assert float(row["do_mg_l_raw"]) == 6.2 and row["do_mg_l_corrected"] == ""
    assert float(row["do_mg_l_drift_corrected"]) == pytest.approx(1.0294 * 6.2 + 0.1, abs=5e-5)
    assert row["do_mg_l_final"] == row["do_mg_l_drift_corrected"]
    (event,) = [one for one in rows_in(folder, "corrections") if one["event_id"] == row["drift_event_id"]]
    assert (event["kind"], event["reading_id"], event["made_by"]) == ("drift", row["reading_id"], "Olive Reed")
    assert '"scale": 1.0294' in event["particulars"]
    (check,) = [one for one in rows_in(folder, "meter_checks") if one["check_id"] == row["check_after"]]
    assert (check["kind"], check["shown"], check["grade"]) == ("end_of_day", "7.8", "good")
    assert float(check["error"]) == pytest.approx(-0.46, abs=0.005)
    assert check["check_id"] in event["particulars"]
    assert "drift_corrected" in row["reasons"].split(";")


def test_drift_table_grades_each_pair_of_checks(folder):
    (row,) = rows_in(folder, "drift")
    assert (row["meter"], row["method"], row["grade"]) == ("Meter A", "ratio", "good")
    assert (row["readings"], row["corrected"]) == ("6", "1")  # U1, four at D2, D3
    assert float(row["error_percent"]) == pytest.approx(-5.6, abs=0.05)


def test_a_check_is_told_as_judged_then_and_as_judged_today(folder):
    check = next(row for row in rows_in(folder, "meter_checks") if row["kind"] == "end_of_day")
    assert check["judged_then"] == '{"says": "off", "settings": 1}'
    assert (check["passes"], check["correctable"], check["reportable"], check["unit"]) == (
        "false",
        "true",
        "true",
        "mg/L",
    )
    assert (check["says_then"], check["grade_then"], check["passes_then"]) == ("off", "", "")
    decisions = rows_in(folder, "meter_check_decisions")
    assert [row["kind"] for row in decisions] == ["set_aside", "restored"]


def test_raw_values_spread_and_stability_stand_beside_the_median(folder):
    row = at(folder, "D2")[1]
    assert (row["n"], row["stable"], row["soak_s"]) == ("2", "false", "95")
    assert as_written(row["unstable_reason"]) == "'gusts"
    assert float(row["spread_mg_l"]) == pytest.approx(1 / 3 + 6 - 6.1, abs=5e-5)
    values = [one for one in rows_in(folder, "reading_values") if one["reading_id"] == row["reading_id"]]
    assert [(one["value"], one["after_s"], one["do_mg_l"]) for one in values] == [
        ("1", "", "6.1"), ("2", "75.5", "6.333333333333333")]  # fmt: skip
    assert values[1]["water_temp_c"] == "20.300000000000004"


def test_how_far_oxygen_may_be_off_is_told_between_two_checks_without_drift(folder):
    corrected, other = at(folder, "D2")[:2]
    assert corrected["do_uncertainty_mg_l"] == ""
    assert float(other["do_uncertainty_mg_l"]) == pytest.approx((0.46**2 + (0.2333 / 2) ** 2) ** 0.5, abs=0.005)
    assert at(folder, "D4")[0]["do_uncertainty_mg_l"] == ""


@pytest.mark.parametrize(
    ("errors", "spread", "expected"),
    [((0.05, -0.1), 0.0, 0.2), ((0.05, -0.3), 0.0, 0.3), ((0.0, 0.0), 0.3, 0.25), ((0.05, math.nan), 0.0, None)],
)
def test_no_reading_is_said_to_be_better_than_a_repeat_of_it(errors, spread, expected):
    assert may_be_off_mg_l(errors, 0.2, spread) == (expected and pytest.approx(expected))


def test_replicate_is_named_with_its_difference_and_limit(folder):
    third, repeat = at(folder, "D2")[2:]
    assert repeat["replicate_of"] == third["reading_id"]
    (pair,) = [row for row in rows_in(folder, "replicates") if row["what"] == "do_mg_l"]
    assert (pair["first_id"], pair["second_id"]) == (third["reading_id"], repeat["reading_id"])
    assert (pair["difference"], pair["limit"], pair["agrees"]) == ("0.3333", "0.2", "false")
    assert at(folder, "D2", "station_summary")[3]["replicate_difference_mg_l"] == "0.33"


def test_section_says_whether_it_is_mixed(folder):
    section = at(folder, "D2", "sections")[0]
    assert (section["mixed"], section["positions"], section["readings"]) == ("false", "3", "4")
    assert section["visit_id"] == rows_in(folder, "visits")[0]["visit_id"]
    assert at(folder, "D2", "station_summary")[0]["mixed"] == "false"


def test_visit_is_the_sum_of_its_entries_and_what_is_open_is_named(folder):
    (visit,) = rows_in(folder, "visits")
    assert (visit["platform"], visit["status"], visit["partial_reason"]) == ("wade", "partial", "hail")
    assert visit["disputed"] == "stage_m" and visit["stage_m"] in ("0.43", "0.415")
    assert visit["arrived_at"] == "2026-08-12T09:20:00+02:00"
    assert len(rows_in(folder, "visit_entries")) == 2


def test_late_result_is_told_and_one_below_the_limit_is_no_number(folder):
    first, second = sorted(rows_in(folder, "bottles"), key=lambda row: row["code"])
    assert (first["hold_hours"], first["hold_state"], first["value"]) == ("49", "past", "3.1")
    assert "past_hold_time" in first["reasons"].split(";") and first["quality"] == "questionable"
    assert second["replicate_of"] == "D2-1"
    results = rows_in(folder, "lab_results")
    assert [(row["censor"], row["value"], row["limit_value"], row["holds"]) for row in results] == [
        ("less_than", "", "2", "false"), ("none", "3.1", "", "true"), ("none", "3.4", "", "true")]  # fmt: skip
    (pair,) = [row for row in rows_in(folder, "replicates") if row["what"] == "bod5"]
    assert (pair["difference"], pair["agrees"]) == ("0.3", "true")
    assert rows_in(folder, "hand_overs")[0]["bottle_codes"] == "D2-1;D2-2"


def test_every_reason_that_is_given_is_explained(folder):
    known = {(row["about"], row["reason"]) for row in rows_in(folder, "reasons")}
    for about in ("readings", "bottles"):
        given = {one for row in rows_in(folder, about) for one in row["reasons"].split(";") if one}
        assert given and {(about, one) for one in given} <= known


def test_what_deviates_from_the_plan_is_listed(folder):
    kinds = {row["kind"]: row for row in rows_in(folder, "deviations")}
    assert kinds["not_read"]["station_code"] and kinds["partial_visit"]["says"] == "hail"
    assert {"late_for_parcel", "early_for_parcel"} & set(kinds)


def test_completeness_ends_with_the_whole_survey(folder):
    *stations, survey = rows_in(folder, "completeness")
    assert survey["station_code"] == "" and survey["complete"] == "false"
    assert int(survey["covered"]) == sum(int(row["covered"]) for row in stations if row["planned"] == "1")
    assert int(survey["readings"]) == len(rows_in(folder, "readings"))


def test_settings_of_every_version_are_there_and_say_where_a_value_comes_from(folder):
    rows = [row for row in rows_in(folder, "settings") if row["key"] == "oxygen_step_mg_l"]
    assert [(row["settings_version"], row["value"], row["said"]) for row in rows] == [
        ("1", "1", "survey"), ("2", "0.8", "survey")]  # fmt: skip
    low = [row for row in rows_in(folder, "settings") if row["key"] == "oxygen_low_mg_l"]
    assert [row["said"] for row in low] == ["survey", "default"]
    assert rows_in(folder, "survey")[0]["settings_version"] == "2"


def test_readme_tells_the_metadata_from_the_surveys_own_facts(folder):
    text = " ".join((folder / "README.txt").read_text(encoding="utf-8").split())
    told = (
        "draft", "half to even", "downstream of the outfall", "looks downstream", "WGS 84", "Meter A, +Ä, 0042",
        "Olive Reed, who made the survey", "Licence: not stated", "To cite it: Alder Brook", "optical",
        "reviewed by Olive Reed, version draft-12-abc",
    )  # fmt: skip
    for words in told:
        assert words in text, words


def test_the_lines_for_pandas_open_it(folder, monkeypatch):
    monkeypatch.chdir(folder)
    names = {"pandas": pandas}
    exec("\n".join(PANDAS), names)
    readings, good = names["readings"], names["good"]
    assert len(readings) == 8 and len(good) == 7
    assert str(readings["taken_at"].dtype).startswith("datetime64") and readings["do_mg_l_raw"].dtype == float
    assert readings["note"].notna().sum() == 6 and readings["stable"].notna().sum() == 4


def test_the_lines_for_r_open_it(folder):
    rscript = shutil.which("Rscript") or missing("Rscript, of r-base-core,")
    shows = (
        "cat(nrow(readings), nrow(good), is.numeric(readings$do_mg_l_raw), sum(is.na(readings$do_mg_l_final)), "
        'sum(readings$longitude < 0, na.rm = TRUE), format(readings$taken_at[1], tz = "UTC"), '
        'class(readings$replicate), sep = "|")'
    )
    script = "\n".join((*R, shows))
    answer = subprocess.run(
        [rscript, "--vanilla", "-e", script], cwd=folder, capture_output=True, text=True, check=True
    )
    assert answer.stdout == "8|7|TRUE|1|5|2026-08-12 04:30:00|character", answer.stderr
