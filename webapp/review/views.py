from flask import Blueprint

bp = Blueprint("review", __name__)


@bp.get("/surveys/<survey_id>/readings")
def table(survey_id):
    return "being built"
