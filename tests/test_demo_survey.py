"""The demo: its files are what its script makes, and its README's numbers are true."""

import re
from pathlib import Path

import pytest

from calc.quality_drift import drift_correction, grade
from calc.sag import critical_point
from calc.settings import Settings
from demo_survey import finished, make, today
from demo_survey.river import distance_km
from webapp.plan.prediction import predict_plan

FOLDER = Path(make.__file__).resolve().parent
README = " ".join((FOLDER / "README.md").read_text(encoding="utf-8").split())
AUGUST, JULY = re.split(r"## (?:August|July): ", README)[1:]
READINGS = finished.rows()["readings"]


def test_files_are_what_the_script_makes():
    made = make.files()
    for name, text in made.items():
        assert (FOLDER / name).read_bytes() == text.encode(), name
    assert {str(path.relative_to(FOLDER)) for path in FOLDER.rglob("*.csv")} == set(made)


def test_readme_names_every_file():
    for name in make.files():
        assert f"`{name}`" in README or f"`{name.split('/')[0]}/`" in README, name


def test_readme_says_what_the_plan_predicts():
    critical = predict_plan(make.PLAN, make.ELEVATION_M).critical
    told = f"lowest oxygen, {critical.do_mg_l:.1f} mg/L, {critical.distance_km:.1f} km below the outfall and "
    assert told + f"{critical.travel_time_h:.1f} h after it" in README


def test_readme_says_what_the_true_river_does():
    critical = critical_point(make.true_river())
    assert f"lowest oxygen is {critical.do_mg_l:.1f} mg/L, {critical.distance_km:.1f} km below the outfall" in README
    for factor in (*make.TRUE_FACTORS.values(), make.TRUE_BOD):
        assert f"× {factor}" in README


def test_true_river_breaks_the_criterion_that_the_plan_meets():
    criterion = float(make.SURVEY["do_criterion_mg_l"])
    assert predict_plan(make.PLAN, make.ELEVATION_M).critical.do_mg_l > criterion
    assert critical_point(make.true_river()).do_mg_l < criterion - 0.5


@pytest.mark.parametrize("slip", [*today.SLIPS, *finished.SLIPS])
def test_every_slip_is_told(slip):
    told = AUGUST if slip in today.SLIPS else JULY
    assert f"- {slip.split(':')[0].split(',')[0]}: " in told


@pytest.mark.parametrize(("survey", "told"), [(today, AUGUST), (finished, JULY)], ids=["August", "July"])
def test_readme_counts_the_readings(survey, told):
    rows = survey.rows()["readings"]
    assert f"{len(rows)} readings at {len({row['station'] for row in rows})} stations" in told


def test_readme_counts_replicates_and_timed_readings_of_the_finished_survey():
    assert f"{sum('replicate' in row for row in READINGS)} of them replicates" in JULY
    assert f"{sum('values' in row for row in READINGS)} of them the median of five timed values" in JULY
    assert f"all {sum(row['meter'] == 'Meter A' for row in READINGS)} readings of Meter A" in JULY
    assert {len(row["values"].split()) for row in READINGS if "values" in row} == {5}


def test_readme_says_how_meter_a_drifted():
    end = next(row for row in finished.rows()["checks"] if (row["meter"], row["kind"]) == ("Meter A", "end_of_day"))
    shown = float(end["value"])
    factor = finished.drift_scale(finished.when("13:40"))
    expected = factor * shown
    settings = Settings()
    assert f"showed {shown:.2f} mg/L where air-saturated water at {end['water_temp_c']} °C" in JULY
    assert f"{end['pressure']} hPa holds {expected:.2f} mg/L: it drifted by {expected - shown:.2f} mg/L" in JULY
    assert f"({100 * (expected - shown) / expected:.1f} %) over 8 h" in JULY
    assert f"The grade is {grade(shown - expected, expected, settings)}" in JULY
    assert f"a ratio that grows to × {factor:.3f}" in JULY
    assert drift_correction(0, 8, expected, shown, 0.05, settings).method == "ratio"


def test_readme_says_what_one_reading_becomes():
    typed = next(row for row in READINGS if row["do_mg_l"].find(",") > 0)
    right = float(typed["do_mg_l"].replace(",", ".")) * finished.drift_scale(finished.when(typed["taken_at"][-5:]))
    assert f"at {typed['station']}, {typed['position']}, “{typed['do_mg_l']}” as typed becomes {right:.2f} mg/L" in JULY


def test_meter_a_shows_nothing_of_its_drift_right_after_it_was_read_back():
    assert finished.drift_scale(finished.when("05:40")) == 1
    assert finished.drift_scale(finished.when("09:40")) == pytest.approx(1 + 0.059 / 2, abs=0.0005)


def test_readme_says_how_late_d3_was_read_for_the_parcel():
    taken = next(row["taken_at"] for row in READINGS if row["station"] == "D3")
    travel_h = predict_plan(make.PLAN, make.ELEVATION_M).at(distance_km("D3")).travel_time_h
    late_min = (finished.when(taken[-5:]) - finished.RELEASE).total_seconds() / 60 - 60 * travel_h
    assert late_min == pytest.approx(69, abs=1)
    assert "read 1 h 9 min late for the parcel" in JULY


def test_the_finished_survey_goes_on_past_midnight():
    first, last = READINGS[0]["taken_at"], READINGS[-1]["taken_at"]
    assert (first[:10], last[:10]) == ("2026-07-22", "2026-07-23")
    assert [row["taken_at"] for row in READINGS] == sorted(row["taken_at"] for row in READINGS)
