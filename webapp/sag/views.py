"""The sag page: what was read against what was predicted."""

from flask import Blueprint, render_template
from flask_login import current_user, login_required

from webapp.charts import sag_chart
from webapp.db import get_db
from webapp.display import Show
from webapp.sag import service
from webapp.surveys.queries import get_survey

bp = Blueprint("sag", __name__)


@bp.get("/surveys/<survey_id>/sag")
@login_required
def page(survey_id):
    """Show the sag as it stands: the answer, the plot, the stations, the mixing."""
    survey = get_survey(get_db(), survey_id, current_user.id)
    show = Show.of(survey)
    sag = service.sag_of(get_db(), survey)
    chart = None
    if sag.prediction.ready:
        chart = sag_chart(show, sag.prediction, sag.placed, criterion=survey.do_criterion_mg_l)
    return render_template("sag/page.html", survey=survey, show=show, tab="sag", sag=sag, chart=chart)
