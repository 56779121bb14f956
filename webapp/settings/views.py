"""Every threshold of a survey, in versions."""

from flask import Blueprint, redirect, render_template, request, url_for
from flask_login import current_user, login_required

from webapp.approval import queries as approval_queries
from webapp.db import get_db, reads_only, write_aside
from webapp.display import Show
from webapp.errors import Conflict
from webapp.people.access import needs
from webapp.settings import forms, queries, service
from webapp.surveys import queries as survey_queries

bp = Blueprint("settings", __name__)


@bp.get("/surveys/<survey_id>/settings")
@login_required
def page(survey_id):
    """Show every threshold; ?fill= puts the trade's defaults, or those of an earlier version, into the form."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    wanted = request.args.get("fill", "")
    if wanted == "defaults":
        return _page(db, survey, form=forms.typed_values({}), filled="The trade's defaults")
    if wanted.isascii() and wanted.isdigit() and len(wanted) <= 6:
        version = queries.get_version(db, survey_id, int(wanted))
        return _page(db, survey, form=forms.typed_values(version.thresholds), filled=f"Version {version.number}")
    return _page(db, survey)


@bp.post("/surveys/<survey_id>/settings")
@needs("correct")
@reads_only
def change(survey_id):
    """Store the changed values as a new version, or show the form again with what is wrong beside each field."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    current = survey_queries.current_settings(db, survey_id)
    seen = queries.get_version(db, survey_id, forms.based_on(request.form, current.number))
    asked, errors = forms.parse_change(request.form, seen)
    if errors:
        return _page(db, survey, 422, _typed_over(current, seen), errors)
    told = service.otherwise_under(db, survey, asked)
    try:
        with write_aside() as writing:
            version = service.change_settings(writing, survey, asked, current_user.id, told)
    except Conflict as conflict:
        db.rollback()
        current = survey_queries.current_settings(db, survey_id)
        return _page(db, survey, 409, _typed_over(current, seen), conflict=conflict.message, seen=seen)
    return redirect(url_for(".page", survey_id=survey_id, saved=version.number), code=303)


def _typed_over(current, seen):
    """Return the current values with what the person typed over those they saw."""
    texts = forms.touched(request.form, forms.typed_values(seen.thresholds))
    return forms.typed_values(current.thresholds) | texts | {"reason": request.form.get("reason", "")}


def _page(db, survey, status=200, form=None, errors=None, conflict="", seen=None, filled=""):
    lines = service.lines_of(db, survey)
    current = lines[0].version
    now = forms.typed_values(current.thresholds)
    saved = request.args.get("saved", "")
    page = render_template(
        "settings/page.html",
        survey=survey,
        show=Show.of(survey),
        state=approval_queries.state_of(db, survey.id),
        tab="plan",
        topics=service.TOPICS,
        lines=lines,
        now=now,
        defaults=forms.typed_values({}),
        form=form or now,
        errors=errors or {},
        conflict=conflict,
        others={key: new for key, _, _, new, _ in service.differing(seen.thresholds, current.thresholds)}
        if seen
        else {},
        filled=filled,
        saved=lines[0] if saved == str(current.number) else None,
        may_change=current_user.may("correct"),
    )
    return page, status
