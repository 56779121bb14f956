"""Reviewed, approved and opened again: the state of a survey."""

import io
import uuid

from flask import Blueprint, redirect, render_template, request, send_file, url_for
from flask_login import current_user, login_required

from webapp.approval import forms, queries, service
from webapp.db import get_db, reads_only, write_aside
from webapp.display import Show
from webapp.errors import Conflict
from webapp.people.access import needs
from webapp.surveys import queries as survey_queries

bp = Blueprint("approval", __name__)


@bp.get("/surveys/<survey_id>/approval")
@login_required
def page(survey_id):
    """Show the survey's state, what stands against it, and how it came there."""
    return _page(survey_id)


@bp.post("/surveys/<survey_id>/approval/review")
@needs("correct")
@reads_only
def review(survey_id):
    """Mark the survey as reviewed."""
    return _step(survey_id, service.mark_reviewed)


@bp.post("/surveys/<survey_id>/approval/approve")
@needs("manage")
@reads_only
def approve(survey_id):
    """Approve the survey, and keep its dataset."""
    return _step(survey_id, service.approve)


@bp.post("/surveys/<survey_id>/approval/reopen")
@needs("manage")
@reads_only
def reopen(survey_id):
    """Open an approved survey again."""
    return _step(survey_id, service.reopen, reason_needed=True)


@bp.get("/surveys/<survey_id>/approval/<event_id>/dataset.zip")
@needs("export")
def frozen(survey_id, event_id):
    """Give the dataset as it was approved, byte by byte."""
    db = get_db()
    survey_queries.get_survey(db, survey_id, current_user.id)
    kept = queries.get_frozen(db, survey_id, event_id)
    return send_file(
        io.BytesIO(kept.content),
        mimetype="application/zip",
        as_attachment=True,
        download_name=kept.file_name,
        max_age=0,
    )


def _step(survey_id, take, reason_needed=False):
    """Take a step: what it rests on is worked out before it stands in the writers' line."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    # What stands against a survey may stay, if whoever reviews or approves it says why.
    reason_needed = reason_needed or not service.standing_of(db, survey).clear
    asked, errors = forms.parse_step(request.form, reason_needed)
    if errors:
        return _page(survey_id, 422, errors)
    prepared = service.prepare(db, survey)
    try:
        with write_aside() as writing:
            take(writing, survey, asked, current_user, prepared)
    except Conflict as conflict:
        db.rollback()
        return _page(survey_id, 409, conflict=conflict.message)
    return redirect(url_for(".page", survey_id=survey_id), code=303)


def _page(survey_id, status=200, errors=None, conflict=""):
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    state, standing = queries.state_of(db, survey_id), service.standing_of(db, survey)
    page = render_template(
        "approval/page.html",
        survey=survey,
        show=Show.of(survey),
        tab="readings",
        state=state,
        standing=standing,
        events=queries.events_of(db, survey_id),
        no_review=service.why_not_review(state, standing),
        no_approval=service.why_not_approve(state, standing, current_user),
        form={
            "submission_id": str(uuid.uuid4()),
            "seen": queries.mark_of(db, survey_id),
            "reason": request.form.get("reason", ""),
        },
        errors=errors or {},
        conflict=conflict,
    )
    return page, status
