from flask import Blueprint

bp = Blueprint("fieldsheet", __name__)


@bp.get("/surveys/<survey_id>/sheet")
def sheet(survey_id):
    return "being built"
