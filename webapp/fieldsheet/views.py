"""The crew's page of the day, which follows the plan while it is open."""

from datetime import UTC, datetime

from flask import Blueprint, make_response, redirect, render_template, request, url_for
from flask_login import current_user, login_required

from webapp.db import get_db, write_aside
from webapp.display import Show
from webapp.errors import Conflict
from webapp.fieldsheet import forms, news, queries, release, service, snapshot
from webapp.htmx import wants_fragment
from webapp.people.access import needs
from webapp.plan.queries import current_plan
from webapp.readings.asking import thresholds
from webapp.readings.judging import judgement_of
from webapp.readings.queries import readings_of
from webapp.surveys.queries import current_settings, get_survey
from webapp.visits.line import visits_on_sheet
from webapp.visits.queries import visits_of

bp = Blueprint("fieldsheet", __name__)
SHEET = "/surveys/<survey_id>/sheet"


@bp.get(SHEET)
@login_required
def sheet(survey_id):
    """Show the stations in the order of the day, with a mark on what is new since the person looked."""
    survey = get_survey(get_db(), survey_id, current_user.id)
    context = _context(survey)
    page = render_template(
        "fieldsheet/sheet.html", **context, form=forms.typed_release(survey, context["show"]), errors={}
    )
    _remember_the_look(survey, context["plan_number"], context["seen"])
    return page


@bp.get(f"{SHEET}/news")
def since(survey_id):
    """Give the open sheet its stations anew if anything changed since it had the mark, else 204."""
    if not current_user.is_authenticated:  # a sign-in page must not take the place of the stations
        return "", 401
    if not wants_fragment():
        return redirect(url_for(".sheet", survey_id=survey_id), code=303)
    survey = get_survey(get_db(), survey_id, current_user.id)
    if request.args.get("have") == news.mark_of(get_db(), survey):
        return "", 204
    response = make_response(render_template("fieldsheet/_update.html", **_context(survey)))
    response.headers["Vary"] = "HX-Request"
    return response


@bp.post(f"{SHEET}/release")
@needs("plan")
def change_release(survey_id):
    """Store another release time, and show the sheet that follows from it."""
    survey = get_survey(get_db(), survey_id, current_user.id)
    new, errors = forms.parse_release(request.form, Show.of(survey))
    status = 422
    if new is not None:
        try:
            release.change_release(get_db(), survey, new, current_user.id)
            return redirect(url_for(".sheet", survey_id=survey_id), code=303)
        except Conflict as conflict:
            errors, status = {"release_at": conflict.message}, 409
    form = forms.typed_release(survey, Show.of(survey)) | {"release_at": request.form.get("release_at", "")}
    return render_template("fieldsheet/sheet.html", **_context(survey), form=form, errors=errors), status


def _context(survey):
    db, show = get_db(), Show.of(survey)
    mark = news.mark_of(db, survey)  # before what it stands for: a change meanwhile comes with the next update
    plan, readings = current_plan(db, survey.id), readings_of(db, survey.id)
    seen, now = queries.find_seen(db, survey.id, current_user.id), datetime.now(UTC)
    settings = thresholds(current_settings(db, survey.id))
    return {
        "survey": survey,
        "show": show,
        "tab": "fieldsheet",
        "mark": mark,
        "seen": seen,
        "plan_number": plan.number if plan else 0,
        "sheet": service.sheet_of(survey, plan, readings, current_user.name),
        "news": news.news_of(db, survey, show, plan, seen, current_user.name),
        "visits": visits_on_sheet(show, visits_of(db, survey.id), settings, datetime.now(UTC)),
        "points": service.points_on_sheet(survey, judgement_of(db, survey), settings, current_user.id, now),
        "window": snapshot.window_of(survey, plan, settings, readings),
        "now": now,
    }


def _remember_the_look(survey, plan_number, seen):
    """Record that the person is shown this page; a browser that fetches it ahead or for another page shows nobody."""
    shown = request.method == "GET" and request.headers.get("Sec-Fetch-Dest", "document") == "document"
    if shown and "Sec-Purpose" not in request.headers and news.unseen(seen, plan_number, survey.release_at):
        with write_aside() as db:
            news.looked(db, survey.id, current_user.id, plan_number, survey.release_at)
