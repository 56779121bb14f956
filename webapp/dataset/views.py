"""The dataset: what is in it, and the zip."""

import io

from flask import Blueprint, render_template, send_file
from flask_login import current_user

from webapp.dataset import service
from webapp.db import get_db
from webapp.display import Show
from webapp.people.access import needs
from webapp.surveys import queries as survey_queries

bp = Blueprint("dataset", __name__)


@bp.get("/surveys/<survey_id>/dataset")
@needs("export")
def page(survey_id):
    """Say what the dataset holds, and offer it."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    return render_template(
        "dataset/page.html",
        survey=survey,
        show=Show.of(survey),
        tab="readings",
        counts=service.counts_of(db, survey),
        left_out=service.LEFT_OUT,
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
