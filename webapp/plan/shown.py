"""A survey's plan as its pages show it: the version, its tables, and what they predict."""

from dataclasses import dataclass

from webapp.charts import sag_chart
from webapp.display import Show
from webapp.models import PlanVersion, Survey
from webapp.plan import queries
from webapp.plan.prediction import predict_plan, prediction_of
from webapp.plan.tables import EMPTY_PLAN
from webapp.surveys.queries import count_readings, get_survey


@dataclass(frozen=True)
class ShownPlan:
    """A plan version, None before the first, and whether a change of it needs a reason."""

    survey: Survey
    show: Show
    version: PlanVersion | None
    needs_reason: bool

    @property
    def number(self):
        """The number of the version; 0 before the first."""
        return self.version.number if self.version else 0

    @property
    def tables(self):
        """Every table of the plan, empty ones too."""
        return {**EMPTY_PLAN, **(self.version.tables if self.version else {})}

    def reaches(self):
        """Return the ReachRates of the plan as planned; none where it can't be predicted."""
        prediction = prediction_of(self.survey, self.version)
        return prediction.reach_rates if prediction.ready else ()

    def outlook(self, tables=None):
        """Return what a page needs to draw the sag of the plan, or of other tables in its place."""
        if tables is None and self.version is not None:
            prediction = prediction_of(self.survey, self.version)
        else:
            prediction = predict_plan(tables or self.tables, self.survey.elevation_m)
        criterion = self.survey.do_criterion_mg_l
        chart = sag_chart(self.show, prediction, criterion=criterion) if prediction.ready else None
        return {"prediction": prediction, "chart": chart}

    def context(self):
        """Return what every page of the plan needs."""
        return {
            "survey": self.survey,
            "show": self.show,
            "version": self.version,
            "based_on": self.number,
            "needs_reason": self.needs_reason,
            "tab": "plan",
        }


def open_plan(db, survey_id, person_id, number=None):
    """Return the ShownPlan of a survey the person is on: the current version, or an earlier one. Raises NotFound."""
    survey = get_survey(db, survey_id, person_id)
    version = queries.current_plan(db, survey_id) if number is None else queries.get_version(db, survey_id, number)
    needs_reason = version is not None and count_readings(db, survey_id) > 0
    return ShownPlan(survey, Show.of(survey), version, needs_reason)


def find_again(old_rows, rows, index, key_column):
    """Return where a row of an older version stands in a newer one, by content or name; None where it is gone."""
    if index is None or index >= len(old_rows):
        return None
    old = old_rows[index]
    if old in rows:
        return rows.index(old)
    names = [row.get(key_column) for row in rows]
    return names.index(old[key_column]) if old.get(key_column) in names and old.get(key_column) else None
