from flask import Blueprint

bp = Blueprint("sag", __name__)


@bp.get("/surveys/<survey_id>/sag")
def page(survey_id):
    return "being built"
