from flask import Blueprint

bp = Blueprint("plan", __name__)


@bp.get("/surveys/<survey_id>/plan")
def page(survey_id):
    return "being built"
