"""Inviting a phone to a survey, the phones so signed in, and the page that an invitation opens."""

import re
import secrets
from datetime import UTC, datetime

from flask import Blueprint, current_app, redirect, render_template, request, session, url_for
from flask_login import current_user

from webapp import limiter
from webapp.db import get_db
from webapp.display import Show
from webapp.invitations import queries, service
from webapp.people.access import needs, start_phone_session
from webapp.surveys.queries import get_survey
from webapp.trust.service import Connection, code

bp = Blueprint("invitations", __name__)
IN_A_LOG = re.compile(r"/join/[^\s/\]]+")


@bp.get("/surveys/<survey_id>/invitations")
@needs("plan")
def page(survey_id):
    """Show the form for an invitation, those still open, and the phones signed in."""
    return _page(survey_id)


@bp.post("/surveys/<survey_id>/invitations")
@needs("plan")
def invite(survey_id):
    """Make an invitation and show its code: in this answer only, for the token is kept nowhere."""
    survey = get_survey(get_db(), survey_id, current_user.id)
    config = current_app.config["BANKSIDE"]
    invitation, token = service.invite(
        get_db(),
        survey,
        request.form.get("person_id", ""),
        current_user.id,
        current_user.role,
        config.invitation_minutes,
    )
    here = Connection(request.scheme, request.host)
    link = here.base_for_phones(config.port, config.host) + url_for(".join", token=token)
    return _page(survey_id, made=invitation, link=link, link_code=code(link)), 201


@bp.post("/surveys/<survey_id>/invitations/<invitation_id>/withdraw")
@needs("plan")
def withdraw(survey_id, invitation_id):
    """End an invitation that was not used."""
    get_survey(get_db(), survey_id, current_user.id)
    service.withdraw(get_db(), survey_id, invitation_id, current_user.id)
    return redirect(url_for(".page", survey_id=survey_id), code=303)


@bp.post("/surveys/<survey_id>/phones/<phone_id>/end")
@needs("plan")
def end_phone(survey_id, phone_id):
    """Sign a phone out."""
    get_survey(get_db(), survey_id, current_user.id)
    service.end_phone(get_db(), survey_id, phone_id, current_user.id)
    return redirect(url_for(".page", survey_id=survey_id), code=303)


@bp.get("/join/<token>")
@limiter.limit("30 per minute")
def join(token):
    """Show what the invitation does, and one button: a preview of the link must not use it up."""
    try:
        invitation = service.look_at(get_db(), token)
    except service.InvitationOver as over:
        if over.phone is not None and over.phone.id == getattr(current_user, "phone_id", None):
            return redirect(url_for("fieldsheet.sheet", survey_id=over.phone.survey_id))
        raise
    session.setdefault("browser", secrets.token_urlsafe(24))
    show = Show.of(invitation.survey)
    until = service.stays_until(invitation.survey, datetime.now(UTC))
    return _private(
        render_template("invitations/join.html", invitation=invitation, token=token, show=show, until=until)
    )


@bp.post("/join/<token>")
@limiter.limit("30 per minute")
def use(token):
    """Sign this phone in, once."""
    browser = session.get("browser") or secrets.token_urlsafe(24)
    phone = service.use(get_db(), token, browser, request.headers.get("User-Agent"))
    start_phone_session(phone.person, phone)
    return redirect(url_for("fieldsheet.sheet", survey_id=phone.survey_id), code=303)


@bp.record_once
def _keep_tokens_out_of_the_log(state):
    state.app.logger.addFilter(_without_token)


def _without_token(record):
    record.msg = IN_A_LOG.sub("/join/…", str(record.msg))
    return True


def _private(page):
    # The address holds the token: nothing but the server's name may go on from here as the page one came from.
    return page, 200, {"Referrer-Policy": "strict-origin"}


def _page(survey_id, made=None, link=None, link_code=None):
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    now = datetime.now(UTC)
    return render_template(
        "invitations/page.html",
        survey=survey,
        show=Show.of(survey),
        people=service.invitable(db, current_user.role),
        open=queries.open_invitations(db, survey_id, now),
        phones=queries.phones_of(db, survey_id),
        now=now,
        minutes=current_app.config["BANKSIDE"].invitation_minutes,
        made=made,
        link=link,
        link_code=link_code,
        own_https=current_app.config.get("AUTHORITY") is not None,
    )
