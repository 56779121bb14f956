from flask import Blueprint

bp = Blueprint("readings", __name__)


@bp.get("/surveys/<survey_id>/readings/new")
def placeholder(survey_id):
    return "being built"
