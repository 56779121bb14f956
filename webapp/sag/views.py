"""The sag page: today's sag beside the plan's, where next, and whether the crew may leave."""

import uuid
from datetime import UTC, datetime

from flask import Blueprint, redirect, request, url_for
from flask_login import current_user, login_required

from webapp.charts import sag_chart
from webapp.db import get_db, reads_only, write_aside
from webapp.display import Show
from webapp.errors import Conflict
from webapp.htmx import page_or_part, wants_fragment
from webapp.people.access import needs
from webapp.people.queries import members_of
from webapp.sag import decisions, forms, service
from webapp.sag.leave import CHECK_YOURSELF
from webapp.sag.shown import rate_rows
from webapp.sag.where_next import key_of
from webapp.surveys.queries import get_survey

bp = Blueprint("sag", __name__)
SAG = "/surveys/<survey_id>/sag"


@bp.get(SAG)
@login_required
def page(survey_id):
    """Show the sag as it stands: the answer, the plot, where next, may we leave, the stations."""
    return _page(get_survey(get_db(), survey_id, current_user.id))


@bp.get(f"{SAG}/news")
@login_required
def news(survey_id):
    """Say that something changed since the page was shown, or nothing."""
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    if service.current_mark(db, survey) == request.args.get("shown", ""):
        return "", 204
    if not wants_fragment():
        return _page(survey)
    return page_or_part("sag/page.html", "sag/_news.html", survey=survey, changed=True)


@bp.post(f"{SAG}/station")
@needs("plan")
@reads_only
def choose(survey_id):
    """Take a place for the next station."""
    return _decided(survey_id, decisions.choose_station)


@bp.post(f"{SAG}/decline")
@needs("plan")
@reads_only
def decline(survey_id):
    """Offer a place no longer."""
    return _decided(survey_id, decisions.decline)


@bp.post(f"{SAG}/offer")
@needs("plan")
@reads_only
def offer(survey_id):
    """Offer a declined place again."""
    return _decided(survey_id, decisions.offer_again)


@bp.post(f"{SAG}/crew")
@needs("plan")
def crew(survey_id):
    """Send a person to a station."""
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    code, name, errors = forms.parse_crew(request.form, [person.name for person in members_of(db, survey_id)])
    if errors:
        return _page(survey, 422, errors=errors)
    return _tried(survey, lambda: decisions.assign(db, survey, code, name, current_user.id))


@bp.post(f"{SAG}/leave")
@needs("plan")
@reads_only
def leave(survey_id):
    """Keep that the crew leaves, or stays."""
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    sag = service.sag_of(db, survey, Show.of(survey), datetime.now(UTC))
    asked, errors = forms.parse_leaving(request.form, sag.leave is not None and sag.leave.settled)
    if errors:
        return _page(survey, 422, errors=errors, sag=sag)
    return _tried(survey, lambda: _written(survey, sag, decisions.leave_or_stay, asked))


def _decided(survey_id, decide):
    """Carry out a choice about a place, as its form asks."""
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    asked, errors = forms.parse_choice(request.form)
    if errors:
        return _page(survey, 422, errors=errors)
    sag = service.sag_of(db, survey, Show.of(survey), datetime.now(UTC))
    return _tried(survey, lambda: _written(survey, sag, decide, asked))


def _written(survey, sag, decide, asked):
    """Store a decision on a Sag that was made before it stood in the writers' line; what it shows is then the new."""
    with write_aside() as writing:
        decide(writing, survey, service.marked_now(writing, survey, sag), asked, current_user.id)
    get_db().rollback()


def _tried(survey, deed):
    """Carry out a deed and answer with the page as it is then, or with why it could not be."""
    try:
        deed()
    except Conflict as conflict:
        get_db().rollback()
        return _page(survey, 409, conflict=conflict.message)
    if wants_fragment():
        return _page(survey)
    return redirect(url_for(".page", survey_id=survey.id), code=303)


def _page(survey, status=200, errors=None, conflict="", sag=None):
    db, show, now = get_db(), Show.of(survey), datetime.now(UTC)
    sag = sag or service.sag_of(db, survey, show, now)
    decides = current_user.may("plan")
    chart = None
    if sag.prediction.ready:
        offers = sag.where.offers if sag.where else ()
        today = sag.today if sag.today.ready and sag.today.enough else None
        chart = sag_chart(
            show, sag.prediction, sag.placed, criterion=survey.do_criterion_mg_l, today=today, candidates=offers
        )
    return page_or_part(
        "sag/page.html",
        "sag/_sag.html",
        status,
        survey=survey,
        show=show,
        tab="sag",
        sag=sag,
        chart=chart,
        rates=rate_rows(show, sag.today),
        decides=decides,
        people=members_of(db, survey.id) if decides else [],
        check_yourself=CHECK_YOURSELF,
        form=request.form,
        errors=errors or {},
        conflict=conflict,
        now=now,
        fresh_id=lambda: str(uuid.uuid4()),
        key_of=key_of,
    )
