"""Bottles, hand-overs and laboratory results."""

import uuid
from datetime import UTC, datetime

from flask import Blueprint, redirect, render_template, request, url_for
from flask_login import current_user, login_required

from webapp import answers
from webapp.bottles import forms, importing, queries, service, shown, words
from webapp.db import get_db, reads_only
from webapp.display import Show
from webapp.errors import Conflict
from webapp.forms import whole_number
from webapp.htmx import page_or_part, wants_fragment
from webapp.people.access import needs
from webapp.readings.queries import get_station
from webapp.surveys import queries as survey_queries
from webapp.tablefile import decode

bp = Blueprint("bottles", __name__)
BOTTLES = "/surveys/<survey_id>/bottles"
AT_STATION = "/surveys/<survey_id>/stations/<code>/bottle"
NOT_YOURS = (
    "Somebody else recorded this bottle, and it is stored under their name only. It waits on this phone until they "
    "sign in here."
)


def _survey(survey_id):
    return survey_queries.get_survey(get_db(), survey_id, current_user.id)


@bp.get(BOTTLES)
@login_required
def page(survey_id):
    """Show every bottle with its clock, and the hand-overs."""
    survey, now = _survey(survey_id), datetime.now(UTC)
    found = shown.bottles_page(get_db(), survey, now)
    added = whole_number(request.args.get("added"))
    return render_template("bottles/page.html", **_context(survey), bottles=found, added=added)


@bp.get(f"{BOTTLES}/<bottle_id>")
@login_required
def bottle(survey_id, bottle_id):
    """Show one bottle: how it was filled, its way, and every result."""
    return _bottle_page(_survey(survey_id), bottle_id)


@bp.get(AT_STATION)
@needs("log")
def new(survey_id, code):
    """Show a fresh form for a bottle at a station."""
    db, survey = get_db(), _survey(survey_id)
    get_station(db, survey_id, code)
    last = queries.last_by(db, survey_id, current_user.id)
    return _form(survey, code, forms.fresh_bottle(Show.of(survey), last, datetime.now(UTC)), fresh=True)


@bp.post(AT_STATION)
@needs("log")
def save(survey_id, code):
    """Store a bottle and show it, or the form again: what can't be, or what is odd and was not asked about."""
    db, survey, now = get_db(), _survey(survey_id), datetime.now(UTC)
    get_station(db, survey_id, code)
    form = request.form.to_dict()
    if form.get("author_id", current_user.id) != current_user.id:
        response = _form(survey, code, form, 409, conflict=NOT_YOURS)
        response.headers["X-Belongs-To"] = "another"
        return response
    filled, errors = forms.parse_bottle(form, answers.show_of_form(form, Show.of(survey)), code, now)
    if not errors and (taken := service.code_taken(db, survey, filled)):
        errors = {"code": taken}
    if errors:
        return _form(survey, code, form, 422, errors)
    asks = service.asks_of(db, survey, filled, now, answers.saved_at(form))
    if open_asks := answers.unanswered(asks, form, {}):
        return _form(survey, code, form, 422, asks=open_asks)
    try:
        stored = service.add_bottle(db, survey, filled.keeping(asks), current_user.id, now)
    except service.CodeTaken as taken:
        return _form(survey, code, form, 422, {"code": taken.message})
    except Conflict as conflict:
        return _form(survey, code, form, 409, conflict=conflict.message)
    return _stored(survey, stored)


@bp.get(f"{BOTTLES}/hand-over")
@needs("log")
def new_hand_over(survey_id):
    """Show a fresh form for a hand-over; the bottles that are still under way are ticked."""
    survey, now = _survey(survey_id), datetime.now(UTC)
    found = shown.bottles_page(get_db(), survey, now)
    form = {"submission_id": str(uuid.uuid4()), "at": Show.of(survey).typed_time(now), "gave": current_user.name}
    return _hand_over_form(survey, found, form, {line.bottle.id for line in found.lines if line.running})


@bp.post(f"{BOTTLES}/hand-over")
@needs("log")
def save_hand_over(survey_id):
    """Store a hand-over, or show the form again with what is wrong beside each field."""
    db, survey, now = get_db(), _survey(survey_id), datetime.now(UTC)
    ticked, bottles = request.form.getlist("bottles"), queries.bottles_of(db, survey_id)
    passed, errors = forms.parse_hand_over(request.form, ticked, Show.of(survey), bottles, now)
    conflict = ""
    if not errors:
        try:
            service.add_hand_over(db, survey, passed, current_user.id)
            return redirect(url_for(".page", survey_id=survey_id), code=303)
        except Conflict as refusal:
            conflict = refusal.message
    found = shown.bottles_page(db, survey, now)
    return _hand_over_form(survey, found, request.form, set(ticked), 409 if conflict else 422, errors, conflict)


@bp.get(f"{BOTTLES}/<bottle_id>/result")
@needs("correct")
def new_result(survey_id, bottle_id):
    """Show a fresh form for a laboratory's result of a bottle."""
    db, survey = get_db(), _survey(survey_id)
    line = shown.bottle_page(db, survey, bottle_id, datetime.now(UTC))
    last = next(reversed(queries.results_of(db, survey_id)), None)
    return _result_form(survey, line, forms.fresh_result(Show.of(survey), line.judged, last))


@bp.post(f"{BOTTLES}/<bottle_id>/result")
@needs("correct")
def save_result(survey_id, bottle_id):
    """Store a result, or show the form again with what is wrong beside each field."""
    db, survey, now = get_db(), _survey(survey_id), datetime.now(UTC)
    line = shown.bottle_page(db, survey, bottle_id, now)
    told, errors = forms.parse_result(request.form, Show.of(survey), line.bottle, now)
    if errors:
        return _result_form(survey, line, request.form, 422, errors)
    try:
        service.add_result(db, survey, told, current_user.id)
    except Conflict as refusal:
        return _result_form(survey, line, request.form, 409, conflict=refusal.message)
    return redirect(url_for(".bottle", survey_id=survey_id, bottle_id=bottle_id), code=303)


@bp.get(f"{BOTTLES}/import")
@needs("correct")
def import_form(survey_id):
    """Show where a laboratory's table is pasted or uploaded."""
    return _import_page(_survey(survey_id))


@bp.post(f"{BOTTLES}/import/preview")
@needs("correct")
@reads_only
def import_preview(survey_id):
    """Show what the results would be, or what is wrong in which cell. Nothing is stored."""
    survey, text = _survey(survey_id), _pasted()
    if not text.strip():
        return _import_page(survey, 422, errors={"text": "Paste the table, or choose a file."})
    found = importing.preview(get_db(), survey, text, datetime.now(UTC))
    return _import_page(survey, 200 if found.good else 422, text, found)


@bp.post(f"{BOTTLES}/import")
@needs("correct")
def import_results(survey_id):
    """Store the results, all of them or, where a cell is wrong, none."""
    survey, text = _survey(survey_id), _pasted()
    found = importing.preview(get_db(), survey, text, datetime.now(UTC))
    if not found.good:
        return _import_page(survey, 422, text, found)
    try:
        added = importing.import_results(get_db(), survey, found, current_user.id)
    except Conflict as refusal:
        return _import_page(survey, 409, text, conflict=refusal.message)
    return redirect(url_for(".page", survey_id=survey_id, added=added), code=303)


@bp.get(f"{BOTTLES}/sheet.csv")
@needs("correct")
def empty_sheet(survey_id):
    """Give a table with a row for each bottle, for the laboratory to fill in."""
    survey = _survey(survey_id)
    return importing.empty_sheet(Show.of(survey), queries.bottles_of(get_db(), survey_id)), {
        "Content-Type": "text/csv; charset=utf-8",
        "Content-Disposition": 'attachment; filename="laboratory-results.csv"',
    }


def _pasted():
    """Return the table's text: of the file where one was chosen, else what was pasted."""
    upload = request.files.get("file")
    return decode(upload.read()) if upload is not None and upload.filename else request.form.get("text", "")


def _context(survey):
    return {"survey": survey, "show": Show.of(survey), "tab": "fieldsheet", "words": words, "now": datetime.now(UTC)}


def _stored(survey, filled):
    """Answer with the bottle and the id that is now stored: the phone lets go of a bottle only for this header."""
    address = url_for(".bottle", survey_id=survey.id, bottle_id=filled.id)
    if wants_fragment():
        response = _bottle_page(survey, filled.id)
        response.headers["HX-Push-Url"] = address
    else:
        response = redirect(address, code=303)
    response.headers["X-Stored-Id"] = filled.id
    return response


def _bottle_page(survey, bottle_id):
    context = _context(survey)
    line = shown.bottle_page(get_db(), survey, bottle_id, context["now"])
    return page_or_part("bottles/bottle.html", "bottles/_bottle.html", **context, line=line)


def _form(survey, code, form, status=200, errors=None, asks=(), conflict="", fresh=False):
    kept, keep = answers.answers(asks, form, {})
    return page_or_part(
        "bottles/new.html",
        "bottles/_form.html",
        status,
        **_context(survey),
        code=code,
        form=form,
        errors=errors or {},
        asks=[(one, "", {}) for one in asks],
        kept=kept,
        keep=keep,
        conflict=conflict,
        fresh=fresh,
        unfolded=forms.unfolded(form, errors or {}, asks),
    )


def _hand_over_form(survey, found, form, ticked, status=200, errors=None, conflict=""):
    page = render_template(
        "bottles/hand_over.html",
        **_context(survey),
        bottles=found,
        form=form,
        ticked=ticked,
        errors=errors or {},
        conflict=conflict,
    )
    return page, status


def _result_form(survey, line, form, status=200, errors=None, conflict=""):
    context = _context(survey)
    return render_template(
        "bottles/result.html", **context, line=line, form=form, errors=errors or {}, conflict=conflict
    ), status


def _import_page(survey, status=200, text="", preview=None, errors=None, conflict=""):
    page = render_template(
        "bottles/import.html",
        **_context(survey),
        columns=importing.columns_in_words(Show.of(survey)),
        form={"text": text},
        preview=preview,
        errors=errors or {},
        conflict=conflict,
    )
    return page, status
