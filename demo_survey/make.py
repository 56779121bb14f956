"""Makes the files of the demo: an invented river and works, a survey that is going on, and one three weeks earlier.

Run from the checkout with `python -m demo_survey.make`. The plan's tables are written in the form that the plan's
imports take, everything else as it is typed into the forms. The readings come from a true river that differs from the
plan (slower reaeration and water, more BOD), read through calc.sag, with noise, slips and a meter that drifts. The same
run gives the same files.
"""

from pathlib import Path

from demo_survey import finished, today
from demo_survey.river import (
    ELEVATION_M,
    PLAN,
    READ_SD_MG_L,
    STATION_PLACES,
    STATIONS,
    TRUE_BOD,
    TRUE_FACTORS,
    WHERE,
    true_river,
)
from demo_survey.rows import facts, table
from demo_survey.today import RELEASE, SLIPS, SURVEY, readings
from webapp.display import Show
from webapp.plan.tables import PLAN_TABLES
from webapp.tablefile import write_table

__all__ = [
    "ELEVATION_M",
    "PLAN",
    "READ_SD_MG_L",
    "RELEASE",
    "SLIPS",
    "STATIONS",
    "STATION_PLACES",
    "SURVEY",
    "TRUE_BOD",
    "TRUE_FACTORS",
    "WHERE",
    "files",
    "readings",
    "true_river",
]

HERE = Path(__file__).resolve().parent


def files():
    """Return every file of the demo: a dictionary from name to text."""
    show = Show(time_zone=today.SURVEY["time_zone"])
    texts = {f"{key}.csv": write_table(rows, PLAN_TABLES[key], show) for key, rows in PLAN.items()}
    for folder, survey in (("", today), ("finished/", finished)):
        texts[f"{folder}survey.csv"] = facts(survey.SURVEY)
        texts |= {f"{folder}{name}.csv": table(rows) for name, rows in survey.rows().items()}
    return texts


def main():
    """Write the files beside this one."""
    for name, text in files().items():
        (HERE / name).write_text(text, encoding="utf-8", newline="")


if __name__ == "__main__":
    main()
