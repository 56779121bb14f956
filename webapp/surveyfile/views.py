"""The survey file: taking one away, and importing one in two steps, first looking, then adding."""

import io

from flask import Blueprint, redirect, render_template, request, send_file, url_for
from flask_login import current_user

from webapp.db import get_db, reads_only
from webapp.display import Show
from webapp.errors import Conflict
from webapp.people.access import needs
from webapp.surveyfile import forms, service
from webapp.surveyfile.service import BadSurveyFile
from webapp.surveys import queries as survey_queries

bp = Blueprint("surveyfile", __name__)
MOST_SHOWN = 100


@bp.get("/surveys/<survey_id>/survey-file")
@needs("export")
def page(survey_id):
    """Offer the survey's file; after an import, say what it did."""
    survey = survey_queries.get_survey(get_db(), survey_id, current_user.id)
    done = [request.args.get(name, "") for name in ("added", "differ")]
    counts = [int(one) for one in done if one.isascii() and one.isdigit() and len(one) < 8]
    return render_template(
        "surveyfile/page.html",
        survey=survey,
        show=Show.of(survey),
        tab="readings",
        done=counts if len(counts) == 2 else None,
    )


@bp.get("/surveys/<survey_id>/survey-file/download")
@needs("export")
def download(survey_id):
    """Give the survey's file."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    return send_file(
        io.BytesIO(service.export(db, survey)),
        mimetype="application/octet-stream",
        as_attachment=True,
        download_name=service.file_name(survey),
        max_age=0,
    )


@bp.get("/survey-file")
@needs("manage")
def import_form():
    """Ask for a survey file."""
    return _import_page()


@bp.post("/survey-file/preview")
@needs("manage")
@reads_only
def preview():
    """Show what a file would add and where it differs. Nothing is stored."""
    upload = request.files.get("file")
    try:
        content = forms.uploaded(upload.read() if upload else b"")
        outcome = service.outcome_of(get_db(), service.read(content), current_user.id)
    except BadSurveyFile as bad:
        return _import_page(422, message=str(bad))
    return _import_page(outcome=outcome, held=forms.holding(content))


@bp.post("/survey-file")
@needs("manage")
def import_file():
    """Add what is new in the file that the preview held, if that is still what the preview showed."""
    try:
        content, mark = forms.held(request.form)
        file = service.read(content)
        outcome = service.import_file(get_db(), file, current_user.id, mark)
    except BadSurveyFile as bad:
        return _import_page(422, message=str(bad))
    except Conflict as conflict:
        get_db().rollback()
        outcome = service.outcome_of(get_db(), file, current_user.id)
        return _import_page(409, message=conflict.message, outcome=outcome, held=forms.holding(content))
    added, differ = outcome.total, len(outcome.differences)
    return redirect(url_for(".page", survey_id=outcome.survey_id, added=added, differ=differ), code=303)


def _import_page(status=200, message="", outcome=None, held=""):
    page = render_template("surveyfile/import.html", message=message, outcome=outcome, held=held, most_shown=MOST_SHOWN)
    return page, status
