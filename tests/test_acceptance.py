"""The trade's fifteen acceptance tests in short words, and which tests hold each; that none of them is lost unnoticed.

Each id was read against its item: together the tests of an item hold every clause of it. A test that is renamed or
taken away is named here by the suite, so that its item gets another one.
"""

import ast
from functools import cache
from pathlib import Path
from typing import NamedTuple

import pytest

ROOT = Path(__file__).resolve().parent.parent


class Item(NamedTuple):
    says: str
    tests: tuple


ITEMS = (
    Item(
        "Saturation meets the pocket table over temperature and pressure to 0.01 mg/L, 8.04 at 20 °C and 674.1 mmHg.",
        (
            "tests/webapp/test_acceptance_river.py::test_the_pocket_table_of_saturation_is_met_to_a_hundredth",
            "tests/calc/test_oxygen.py::test_saturation_agrees_with_published_value",
        ),
    ),
    Item(
        "762 mmHg at 500 m is taken for a sea-level value: about 718 is offered and an effect of about 0.54 mg/L told.",
        (
            "tests/webapp/test_reading_acceptance.py::"
            "test_762_mmhg_at_500_m_warns_of_a_sea_level_value_offers_718_and_tells_the_effect",
            "tests/calc/test_quality_pressure.py::"
            "test_sea_level_pressure_at_500_m_tells_the_effect_and_offers_the_pressure_here",
            "tests/calc/test_quality_pressure.py::test_effect_of_standard_sea_level_pressure_is_that_of_the_trade",
        ),
    ),
    Item(
        "29.5 in the mmHg box is offered as inches of mercury, 68 °C between twenties as Fahrenheit.",
        (
            "tests/webapp/test_reading_acceptance.py::test_295_in_the_mmhg_box_is_offered_as_inches_of_mercury",
            "tests/webapp/test_reading_acceptance.py::test_68_between_stations_of_20_degrees_is_offered_as_fahrenheit",
            "tests/calc/test_quality_water.py::test_68_among_twenties_is_offered_as_fahrenheit",
        ),
    ),
    Item(
        "Decimal comma and point are one number on English, French and German phones; 1,234 is asked about.",
        (
            "tests/browser/test_acceptance_decimals.py::"
            "test_comma_and_point_are_one_number_and_1_234_is_asked_about_whatever_the_phone_speaks",
            "tests/webapp/test_reading_acceptance.py::test_decimal_comma_and_decimal_point_are_the_same_number",
            "tests/webapp/test_reading_acceptance.py::test_1_234_is_asked_about_wherever_it_is_typed",
        ),
    ),
    Item(
        "6.1 6.3 6.2 6.2 6.2 are stable with median 6.2; 5.8 to 6.4 are not, and are saved with a reason.",
        (
            "tests/webapp/test_reading_acceptance.py::"
            "test_five_values_within_the_limit_are_stable_and_their_median_is_the_reading",
            "tests/webapp/test_reading_acceptance.py::"
            "test_values_from_58_to_64_are_not_stable_and_saved_with_a_reason_only",
            "tests/browser/test_reading_form.py::test_phone_takes_the_median_that_the_server_takes",
        ),
    ),
    Item(
        "A meter 0.46 mg/L low after 8 h is good, a ratio growing to 1.059 is offered, raw stays; 2.3 is too much.",
        (
            "tests/calc/test_quality_meter.py::test_air_saturated_water_of_25_degrees_at_sea_level_reads_8_26",
            "tests/calc/test_quality_meter.py::"
            "test_a_drift_of_0_46_at_the_end_of_a_day_fails_is_good_and_can_be_corrected",
            "tests/webapp/test_review_drift.py::"
            "test_appendix_a6_end_check_046_low_after_8_h_is_good_and_offers_a_ratio_that_grows_to_1_059",
            "tests/webapp/test_review_drift.py::"
            "test_appendix_a6_error_of_2_3_is_not_reportable_and_no_correction_is_offered",
            "tests/webapp/test_demo_finished.py::"
            "test_a_meter_that_drifts_is_graded_corrected_traced_to_what_was_typed_and_approved",
        ),
    ),
    Item(
        "Without a check at its end every reading of a day is questionable for want of a bracket.",
        (
            "tests/webapp/test_judging.py::test_a_day_without_an_end_check_leaves_every_reading_questionable",
            "tests/webapp/test_judging.py::test_a_reviewers_word_does_not_make_up_for_a_missing_check",
            "tests/calc/test_quality_bracket.py::test_a_day_without_an_end_check_leaves_every_reading_unbracketed",
        ),
    ),
    Item(
        "Lowest at the last station fails clause c of the bracket; S12A is added after S12 and every code stays.",
        (
            "tests/webapp/test_acceptance_river.py::test_lowest_at_the_last_station_is_not_bracketed_by_clause_c_"
            "and_a_station_added_keeps_every_code",
            "tests/calc/test_siting_brackets.py::test_each_clause_can_fail_alone",
            "tests/webapp/test_leave.py::test_code_of_an_added_station_stands_beside_its_neighbours_and_is_new",
        ),
    ),
    Item(
        "0.00 and -0.05 mg/L are stored as read and reported below 0.2; 182 % is taken once somebody stands by it.",
        (
            "tests/webapp/test_reading_acceptance.py::"
            "test_no_oxygen_is_stored_as_it_was_read_and_told_as_below_the_limit",
            "tests/webapp/test_acceptance_export.py::"
            "test_oxygen_of_zero_and_below_is_exported_as_read_and_told_as_less_than_the_limit",
            "tests/webapp/test_reading_acceptance.py::test_182_percent_of_saturation_is_asked_about_and_taken",
        ),
    ),
    Item(
        "A bottle set up after 48.8 h is past its hold time, and exported with its result.",
        (
            "tests/calc/test_quality_bottle.py::test_a_bottle_of_06_10_set_up_at_07_00_two_days_later_waited_48_8_h",
            "tests/webapp/test_acceptance_export.py::"
            "test_a_bottle_of_06_10_set_up_at_07_00_two_days_later_is_exported_late_with_its_result",
        ),
    ),
    Item(
        "A browser killed during entry and opened again offline has lost nothing that was typed.",
        (
            "tests/browser/test_waiting_elsewhere.py::"
            "test_browser_killed_during_entry_and_opened_again_offline_lost_nothing_that_was_typed",
        ),
    ),
    Item(
        "Forty unsent, the session over and another user signing in: none is lost, none sent under a wrong name.",
        (
            "tests/browser/test_waiting_kinds.py::test_forty_unsent_with_an_expired_session_and_another_user_"
            "signing_in_lose_none_and_none_goes_under_a_wrong_name",
        ),
    ),
    Item(
        "Five taps on save at 2 s latency are one reading; of two phones both entries stay, the chief chooses.",
        (
            "tests/browser/test_way_out.py::test_five_taps_on_save_at_two_seconds_of_latency_are_one_reading",
            "tests/webapp/test_visits.py::test_two_phones_that_edit_one_visit_are_both_kept_and_both_shown",
            "tests/webapp/test_visits.py::test_the_chief_chooses_with_a_reason_and_the_history_shows_both",
        ),
    ),
    Item(
        "Order and offsets hold over both clock changes; the export reads back equal; west is a number, =cmd is text.",
        (
            "tests/webapp/test_acceptance_export.py::"
            "test_readings_over_both_changes_of_the_clocks_keep_their_order_their_lengths_and_their_offsets",
            "tests/webapp/test_acceptance_export.py::test_read_back_on_another_server_it_is_the_same_bytes",
            "tests/webapp/test_acceptance_export.py::"
            "test_a_longitude_west_of_zero_stays_a_number_and_a_formula_in_a_note_does_not_stay_one",
            "tests/webapp/test_visit_day.py::test_visit_over_the_end_of_summer_time_keeps_its_order_and_length",
            "tests/webapp/test_dataset_roundtrip.py::test_export_then_import_is_the_identity",
        ),
    ),
    Item(
        "The same version exported twice is the same bytes; an approved survey changes only after it is opened again.",
        (
            "tests/webapp/test_dataset.py::test_same_data_exported_twice_is_the_same_bytes",
            "tests/webapp/test_demo_finished.py::"
            "test_a_meter_that_drifts_is_graded_corrected_traced_to_what_was_typed_and_approved",
            "tests/webapp/test_approval_lock.py::test_every_way_to_write_is_refused_until_the_survey_is_opened_again",
            "tests/webapp/test_approval_lock.py::test_a_survey_file_that_adds_to_an_approved_survey_is_refused",
        ),
    ),
)


@cache
def names_in(path):
    """Return the names of the test functions of a file, without importing it."""
    tree = ast.parse((ROOT / path).read_text(encoding="utf-8"))
    return {one.name for one in tree.body if isinstance(one, ast.FunctionDef) and one.name.startswith("test_")}


@pytest.mark.parametrize("item", ITEMS, ids=[f"item {number}" for number in range(1, len(ITEMS) + 1)])
def test_every_test_that_holds_an_acceptance_item_is_there(item):
    named = [one.split("::") for one in item.tests]
    assert named and [name for path, name in named if name not in names_in(path)] == []


def test_there_are_fifteen_items():
    assert len(ITEMS) == 15
