"""The dataset: what is in it, the zip, and importing one in two steps, first looking, then storing."""

import io

from flask import Blueprint, redirect, render_template, request, send_file, url_for
from flask_login import current_user

from webapp.approval import queries as approval_queries
from webapp.dataset import forms, importing, service
from webapp.dataset.importing import BadSurveyFile
from webapp.dataset.recipes import BY_TOOL
from webapp.db import get_db, reads_only
from webapp.display import Show
from webapp.errors import Conflict
from webapp.people.access import needs
from webapp.surveys import queries as survey_queries

bp = Blueprint("dataset", __name__)
MOST_SHOWN = 100


@bp.get("/surveys/<survey_id>/dataset")
@needs("export")
def page(survey_id):
    """Say what the dataset holds, in which state it is, and offer it; after an import, say so."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    kept = [(event, frozen) for event, frozen in approval_queries.events_of(db, survey_id) if frozen is not None]
    return render_template(
        "dataset/page.html",
        survey=survey,
        show=Show.of(survey),
        tab="readings",
        counts=service.counts_of(db, survey),
        state=approval_queries.state_of(db, survey_id),
        kept=kept,
        left_out=service.LEFT_OUT,
        recipes=BY_TOOL,
        imported="imported" in request.args,
    )


@bp.get("/surveys/<survey_id>/dataset.zip")
@needs("export")
def download(survey_id):
    """Give the dataset as a zip."""
    db = get_db()
    dataset = service.dataset_of(db, survey_queries.get_survey(db, survey_id, current_user.id))
    return send_file(
        io.BytesIO(service.zip_of(dataset)),
        mimetype="application/zip",
        as_attachment=True,
        download_name=dataset.file_name,
        max_age=0,
    )


@bp.get("/datasets/import")
@needs("manage")
def import_form():
    """Ask for a dataset."""
    return _import_page()


@bp.post("/datasets/import/preview")
@needs("manage")
@reads_only
def preview():
    """Show what a dataset holds, and how it compares with what is here. Nothing is stored."""
    upload = request.files.get("file")
    try:
        content = forms.uploaded(upload.read() if upload else b"")
        found = importing.look(get_db(), content, current_user.id)
    except BadSurveyFile as bad:
        return _refused(bad)
    return _import_page(found=found, held=forms.holding(content))


@bp.post("/datasets/import")
@needs("manage")
def import_dataset():
    """Store the dataset that the preview held, if that is still what the preview showed."""
    try:
        content, mark = forms.held(request.form)
        found = importing.import_dataset(get_db(), content, current_user.id, mark)
    except BadSurveyFile as bad:
        return _refused(bad)
    except Conflict as conflict:
        get_db().rollback()
        found = importing.look(get_db(), content, current_user.id)
        return _import_page(409, message=conflict.message, found=found, held=forms.holding(content))
    return redirect(url_for(".page", survey_id=found.outcome.survey_id, imported=1), code=303)


def _refused(bad):
    return _import_page(422, message=str(bad), cells=getattr(bad, "cells", ()))


def _import_page(status=200, message="", cells=(), found=None, held=""):
    page = render_template(
        "dataset/import.html", message=message, cells=cells, found=found, held=held, most_shown=MOST_SHOWN
    )
    return page, status
