from flask import Blueprint

bp = Blueprint("dataset", __name__)


@bp.get("/surveys/<survey_id>/dataset")
def page(survey_id):
    return "being built"
