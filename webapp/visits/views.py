"""A crew at a station: arrival, stage, width, flow, weather."""

import uuid
from datetime import UTC, datetime

from flask import Blueprint, redirect, render_template, request, url_for
from flask_login import current_user, login_required

from webapp.answers import show_of_form
from webapp.db import get_db, reads_only
from webapp.display import Show
from webapp.errors import Conflict
from webapp.htmx import page_or_part, wants_fragment
from webapp.people.access import needs
from webapp.plan.queries import current_plan
from webapp.readings.asking import thresholds
from webapp.readings.judging import judgement_of
from webapp.readings.quality_words import QUALITIES, REASONS
from webapp.readings.queries import get_station
from webapp.readings.surroundings import where
from webapp.surveys.queries import current_settings, get_survey
from webapp.visits import account, changes, forms, queries, service, words
from webapp.visits.layers import final_visit

bp = Blueprint("visits", __name__)
AT_STATION = "/surveys/<survey_id>/stations/<code>/visit"
NOT_YOURS = (
    "Somebody else recorded this, and it is stored under their name only. It waits on this phone until they sign in "
    "here."
)
OPTIONS = {"choices": words.CHOICES}


@bp.get(AT_STATION)
@needs("log")
def new(survey_id, code):
    """Show the form of a visit: of the one that goes on here, or of another."""
    db, now = get_db(), datetime.now(UTC)
    survey = get_survey(db, survey_id, current_user.id)
    get_station(db, survey_id, code)
    show = Show.of(survey)
    own = _own(db, survey)
    going_on = _going_on(db, survey, code, own, now)
    if going_on is None:
        form = forms.fresh_form(show, now, _crew_before(own))
        return _form_page(survey, show, code, form, fresh=True)
    visit, final = going_on
    form = forms.form_of(show, final, visit.entries, now, leaving="leaving" in request.args)
    return _form_page(survey, show, code, form, fresh=True, final=final)


def _own(db, survey):
    """Return (visit, its final state) of this person's visits to any station."""
    own = [one for one in queries.visits_of(db, survey.id) if one.opened_by_id == current_user.id]
    return [(one, final_visit(one)) for one in own]


def _going_on(db, survey, code, own, now):
    """Return (visit, its final state) that the form goes on with: the one asked for, else this person's own."""
    if "another" in request.args:
        return None
    if wanted := request.args.get("visit"):
        visit = queries.get_visit(db, survey.id, wanted)
        return (visit, final_visit(visit)) if visit.station.code == code else None
    recent = [pair for pair in own if pair[1].station_code == code and forms.is_recent(pair[1], now)]
    return max(recent, key=lambda pair: pair[1].arrived_at, default=None)


def _crew_before(own):
    """Return who was there at this person's last visit: usually the same people as now."""
    finals = sorted((final for _, final in own if final.arrived_at), key=lambda one: one.arrived_at)
    return (finals[-1].facts.get("crew") if finals else "") or current_user.name


@bp.post(AT_STATION)
@needs("log")
def save(survey_id, code):
    """Store an entry and show the visit, or the form again with what is wrong beside each field."""
    db, now = get_db(), datetime.now(UTC)
    survey = get_survey(db, survey_id, current_user.id)
    get_station(db, survey_id, code)
    form = request.form.to_dict()
    show = show_of_form(form, Show.of(survey))
    if form.get("author_id", current_user.id) != current_user.id:
        response = _form_page(survey, show, code, form, 409, conflict=NOT_YOURS)
        response.headers["X-Belongs-To"] = "another"
        return response
    entry, errors = forms.parse_entry(form, show, code, now)
    if errors:
        return _form_page(survey, show, code, form, 422, errors)
    try:
        stored = service.add_entry(db, survey, entry, current_user.id, now)
    except Conflict as conflict:
        return _form_page(survey, show, code, form, 409, conflict=conflict.message)
    return _stored(survey, stored)


def _stored(survey, entry):
    """Answer with the visit and the id that is now stored: the phone lets go of an entry only for this header."""
    address = url_for(".page", survey_id=survey.id, visit_id=entry.visit_id)
    if wants_fragment():
        response = _visit_page(survey, entry.visit_id)
        response.headers["HX-Push-Url"] = address
    else:
        response = redirect(address, code=303)
    response.headers["X-Stored-Id"] = entry.id
    return response


@bp.post("/surveys/<survey_id>/wading")
@needs("log")
@reads_only
def wading(survey_id):
    """Say what depth times velocity means for whoever would wade, while it is typed."""
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    show = show_of_form(request.form, Show.of(survey))
    settings = thresholds(current_settings(db, survey_id))
    judged = changes.judged_wading(*forms.parse_wading(request.form, show), settings)
    return render_template("visits/_wading.html", show=show, wading=judged)


@bp.get("/surveys/<survey_id>/visits/<visit_id>")
@login_required
def page(survey_id, visit_id):
    """Show a visit with its readings and everything that was said about it."""
    return _visit_page(get_survey(get_db(), survey_id, current_user.id), visit_id)


@bp.post("/surveys/<survey_id>/visits/<visit_id>/choice")
@needs("correct")
def choose(survey_id, visit_id):
    """Store which of two entries that disagree holds, and why."""
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    choice, errors = forms.parse_choice(request.form)
    if errors:
        return _visit_page(survey, visit_id, 422, errors, request.form)
    service.settle(db, survey, visit_id, choice, current_user.id)
    return redirect(url_for(".page", survey_id=survey_id, visit_id=visit_id), code=303)


def _form_page(survey, show, code, form, status=200, errors=None, conflict="", fresh=False, final=None):
    db = get_db()
    plan, settings = current_plan(db, survey.id), thresholds(current_settings(db, survey.id))
    station, place = where(plan, code)
    depth_and_velocity = forms.parse_wading(form, show)
    return page_or_part(
        "visits/new.html",
        "visits/_form.html",
        status,
        survey=survey,
        show=show,
        tab="fieldsheet",
        code=code,
        station=station,
        place=place,
        form=form,
        errors=errors or {},
        conflict=conflict,
        fresh=fresh,
        final=final,
        limits=changes.wading_limits(settings),
        wading=changes.judged_wading(*depth_and_velocity, settings),
        **OPTIONS,
    )


def _visit_page(survey, visit_id, status=200, errors=None, form=None):
    db, show = get_db(), Show.of(survey)
    visit = queries.get_visit(db, survey.id, visit_id)
    plan, settings = current_plan(db, survey.id), thresholds(current_settings(db, survey.id))
    visits, judgement = queries.visits_of(db, survey.id), judgement_of(db, survey)
    told = account.account_of(show, visit, visits, judgement.occasions, plan.tables if plan else {}, settings)
    return page_or_part(
        "visits/page.html",
        "visits/_visit.html",
        status,
        survey=survey,
        show=show,
        tab="fieldsheet",
        account=told,
        judged=judgement.by_id,
        qualities=QUALITIES,
        reasons=REASONS,
        visit=told.visit,
        errors=errors or {},
        form=form or {},
        fresh_id=str(uuid.uuid4()),
        seen=forms.seen_of(visit.entries),
        now=datetime.now(UTC),
    )
