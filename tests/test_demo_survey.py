"""The demo survey: its files are what its script makes, and its README's numbers are true."""

from pathlib import Path

import pytest

from calc.sag import critical_point
from demo_survey import make
from webapp.plan.prediction import predict_plan

FOLDER = Path(make.__file__).resolve().parent
README = " ".join((FOLDER / "README.md").read_text(encoding="utf-8").split())


def test_files_are_what_the_script_makes():
    for name, text in make.files().items():
        assert (FOLDER / name).read_text(encoding="utf-8") == text.replace("\r\n", "\n"), name


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


@pytest.mark.parametrize("slip", make.SLIPS)
def test_every_slip_is_told(slip):
    assert slip.split(":")[0].split(",")[0] in README
