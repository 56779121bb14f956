"""The crew's page of the day."""

from datetime import UTC, datetime

from flask import Blueprint, render_template
from flask_login import current_user, login_required

from webapp.db import get_db
from webapp.display import Show
from webapp.fieldsheet import service
from webapp.plan.queries import current_plan
from webapp.readings.queries import readings_of
from webapp.surveys.queries import get_survey

bp = Blueprint("fieldsheet", __name__)


@bp.get("/surveys/<survey_id>/sheet")
@login_required
def sheet(survey_id):
    """Show the stations in the order of the day."""
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    return render_template(
        "fieldsheet/sheet.html",
        survey=survey,
        show=Show.of(survey),
        tab="fieldsheet",
        sheet=service.sheet_of(survey, current_plan(db, survey_id), readings_of(db, survey_id)),
        now=datetime.now(UTC),
    )
