"""The register of meters, and the checks on them."""

from datetime import UTC, datetime

from flask import Blueprint, redirect, request, url_for
from flask_login import current_user, login_required

from webapp import answers
from webapp.db import get_db
from webapp.display import Show
from webapp.errors import Conflict, NotFound
from webapp.htmx import page_or_part, wants_fragment
from webapp.meters import forms, queries, register, service, words
from webapp.meters.new import find_meter
from webapp.people.access import needs
from webapp.people.queries import surveys_of
from webapp.readings.columns import PRESSURE_SOURCES, PRESSURE_UNITS
from webapp.surveys.queries import get_survey

bp = Blueprint("meters", __name__)
METERS = "/surveys/<survey_id>/meters"
NOT_YOURS = (
    "Somebody else recorded this check, and it is stored under their name only. It waits on this phone until they "
    "sign in here."
)
SHOWN_AT_ONCE = 40


@bp.get(METERS)
@login_required
def page(survey_id):
    """Show the meters as they stand, and every check."""
    return _page(_survey(survey_id))


@bp.get(f"{METERS}/add")
@needs("log")
def new_meter(survey_id):
    """Show the form for a meter."""
    return _meter_page(_survey(survey_id), forms.fresh_meter(request.args.get("name", "")))


@bp.post(f"{METERS}/add")
@needs("log")
def add_meter(survey_id):
    """Register a meter."""
    survey = _survey(survey_id)
    meter, errors = forms.parse_meter(request.form, Show.of(survey))
    if errors:
        return _meter_page(survey, request.form, 422, errors)
    try:
        service.add_meter(get_db(), survey, meter, current_user.id)
    except Conflict as conflict:
        get_db().rollback()
        return _meter_page(survey, request.form, 409, {"name": conflict.message})
    return _back_to_page(survey)


@bp.get(f"{METERS}/<meter_id>/edit")
@needs("log")
def edit_meter(survey_id, meter_id):
    """Show what is known of a meter, to change it."""
    survey = _survey(survey_id)
    meter = queries.get_meter(get_db(), survey_id, meter_id)
    return _meter_page(survey, forms.form_of_meter(meter, Show.of(survey)), meter=meter)


@bp.post(f"{METERS}/<meter_id>/edit")
@needs("log")
def change_meter(survey_id, meter_id):
    """Store what changed of a meter."""
    survey = _survey(survey_id)
    meter = queries.get_meter(get_db(), survey_id, meter_id)
    changed, errors = forms.parse_meter({**request.form, "submission_id": meter.id}, Show.of(survey), meter.name)
    if errors:
        return _meter_page(survey, request.form, 422, errors, meter)
    try:
        service.change_meter(get_db(), survey, meter_id, changed, current_user.id)
    except Conflict as conflict:
        get_db().rollback()
        return _meter_page(survey, request.form, 409, {"note": conflict.message}, meter)
    return _back_to_page(survey)


@bp.post(f"{METERS}/bring")
@needs("log")
def bring(survey_id):
    """Register the meters of another survey that the person is on."""
    survey = _survey(survey_id)
    if current_user.survey_id is not None:
        raise NotFound("This phone was invited to one survey. Sign in with your password to reach others.")
    other = get_survey(get_db(), request.form.get("from_survey", ""), current_user.id)
    service.bring_meters(get_db(), survey, other, current_user.id)
    return _back_to_page(survey)


@bp.get(f"{METERS}/check")
@needs("log")
def new_check(survey_id):
    """Show a fresh form for a check: of ?meter= and ?kind=, or what comes next in the trade's order."""
    db, survey = get_db(), _survey(survey_id)
    asked = {name: request.args.get(name, "") for name in ("meter", "kind", "parameter")}
    show, now = Show.of(survey), datetime.now(UTC)
    last = queries.last_check_by(db, survey_id, current_user.id)
    meter_id, kind, parameter = register.proposed(db, survey, show, now, asked, last)
    form = forms.fresh_check(show, last, now, meter_id, kind, parameter)
    return _check_form(survey, show, form, fresh=True)


@bp.post(f"{METERS}/check")
@needs("log")
def save_check(survey_id):
    """Store a check and show what it says, or the form again: what can't be, or what is odd and was not asked about."""
    db, survey, now = get_db(), _survey(survey_id), datetime.now(UTC)
    form = request.form.to_dict()
    if form.get("author_id", current_user.id) != current_user.id:
        response = _check_form(survey, Show.of(survey), form, 409, conflict=NOT_YOURS)
        response.headers["X-Belongs-To"] = "another"
        return response
    show = answers.show_of_form(form, Show.of(survey))
    new, errors, asks = _read(survey, show, form, now)
    if taken := forms.with_suggestion(form, asks):
        form = taken
        new, errors, asks = _read(survey, show, form, now)
    if errors:
        return _check_form(survey, show, form, 422, errors)
    if open_asks := answers.unanswered(asks, form, forms.FIELD_OF):
        return _check_form(survey, show, form, 422, asks=open_asks)
    try:
        stored = service.add_check(db, survey, new.keeping(asks), current_user.id, now)
    except Conflict as conflict:
        get_db().rollback()
        return _check_form(survey, show, form, 409, conflict=conflict.message)
    return _stored(survey, stored)


def _read(survey, show, form, now):
    """Return (NewCheck, errors, findings to ask about) of a form."""
    db = get_db()
    new, errors = forms.parse_check(form, show, queries.meters_of(db, survey.id), now)
    return new, errors, register.asks_of(db, survey, show, new, now, answers.saved_at(form)) if new else []


def _stored(survey, check):
    """Answer with the check and the id that is now stored: the phone lets go of a check only for this header."""
    address = url_for(".check", survey_id=survey.id, check_id=check.id)
    if wants_fragment():
        response = _check_page(survey, check)
        response.headers["HX-Push-Url"] = address
    else:
        response = redirect(address, code=303)
    response.headers["X-Stored-Id"] = check.id
    return response


@bp.get(f"{METERS}/expected")
@needs("log")
def expected(survey_id):
    """Show what a meter should read, from what stands in the form so far."""
    survey = _survey(survey_id)
    show = answers.show_of_form(request.args, Show.of(survey))
    says = register.expected_words(survey, show, forms.parse_standard(request.args, show))
    return page_or_part(
        "meters/expected.html", "meters/_expected.html", survey=survey, show=show, tab="meters", says=says
    )


@bp.get(f"{METERS}/checks/<check_id>")
@login_required
def check(survey_id, check_id):
    """Show one check: what it says by today's settings, what to do next, and what was decided about it."""
    return _check_page(_survey(survey_id), queries.get_check(get_db(), survey_id, check_id))


@bp.post(f"{METERS}/checks/<check_id>/set-aside")
@needs("log")
def set_aside(survey_id, check_id):
    """Keep a check in the record, out of use."""
    return _decide(survey_id, check_id, service.set_aside)


@bp.post(f"{METERS}/checks/<check_id>/restore")
@needs("log")
def restore(survey_id, check_id):
    """Use a check again."""
    return _decide(survey_id, check_id, service.restore)


def _decide(survey_id, check_id, decide):
    db, survey = get_db(), _survey(survey_id)
    found = queries.get_check(db, survey_id, check_id)
    reason, errors = forms.parse_reason(request.form)
    if errors:
        return _check_page(survey, found, 422, errors)
    try:
        found = decide(db, survey_id, check_id, reason, forms.based_on(request.form), current_user)
    except Conflict as conflict:
        get_db().rollback()
        return _check_page(survey, found, 409, conflict=conflict.message)
    if wants_fragment():
        return _check_page(survey, found, done=True)
    return redirect(url_for(".check", survey_id=survey_id, check_id=check_id), code=303)


def _survey(survey_id):
    return get_survey(get_db(), survey_id, current_user.id)


def _back_to_page(survey):
    address = url_for(".page", survey_id=survey.id)
    return ("", 204, {"HX-Redirect": address}) if wants_fragment() else redirect(address, code=303)


def _page(survey):
    db, show, now = get_db(), Show.of(survey), datetime.now(UTC)
    stands = register.register_of(db, survey, show, now)
    everything = request.args.get("all") == "yes"
    others = [] if current_user.survey_id else [one for one in surveys_of(db, current_user.id) if one.id != survey.id]
    return page_or_part(
        "meters/page.html",
        "meters/_meters.html",
        survey=survey,
        show=show,
        tab="meters",
        stands=stands,
        checks=stands.checks if everything else stands.checks[:SHOWN_AT_ONCE],
        others=queries.surveys_with_meters(db, others),
        words=words,
        now=now,
    )


def _meter_page(survey, form, status=200, errors=None, meter=None):
    return page_or_part(
        "meters/meter.html",
        "meters/_meter_form.html",
        status,
        survey=survey,
        show=Show.of(survey),
        tab="meters",
        meter=meter,
        form=form,
        errors=errors or {},
        changes=queries.changes_of(get_db(), survey.id, meter.id) if meter else [],
        words=words,
    )


def _check_form(survey, show, form, status=200, errors=None, asks=(), conflict="", fresh=False):
    kept, keep = answers.answers(asks, form, forms.FIELD_OF)
    parameter = form.get("parameter") if form.get("parameter") in words.PARAMETERS else "do"
    meters = queries.meters_of(get_db(), survey.id)
    return page_or_part(
        "meters/new_check.html",
        "meters/_check_form.html",
        status,
        survey=survey,
        show=show,
        tab="meters",
        form=form,
        errors=errors or {},
        asks=[(one, forms.suggestion_words(one), forms.suggested_texts(one)) for one in asks],
        kept=kept,
        keep=keep,
        conflict=conflict,
        fresh=fresh,
        unfolded=forms.unfolded(form, errors or {}, asks),
        meters=[one for one in meters if not one.out_of_service or one.id == form.get("meter")],
        chosen=find_meter(meters, form.get("meter") or ""),
        parameter=words.PARAMETERS[parameter],
        words=words,
        pressure_sources=PRESSURE_SOURCES,
        pressure_units=PRESSURE_UNITS,
    )


def _check_page(survey, check, status=200, errors=None, conflict="", done=False):
    db, show = get_db(), Show.of(survey)
    return page_or_part(
        "meters/check.html",
        "meters/_check.html",
        status,
        survey=survey,
        show=show,
        tab="meters",
        seen=register.check_of(db, survey, show, check, datetime.now(UTC)),
        may_decide=service.may_decide(current_user, check),
        form={} if done else request.form,
        errors=errors or {},
        conflict=conflict,
        words=words,
    )
