"""The table of readings, one reading with everything decided about it, and the import of a paper sheet."""

from flask import Blueprint, redirect, request, url_for
from flask_login import current_user, login_required

from webapp.db import get_db, reads_only
from webapp.display import Show
from webapp.errors import Conflict
from webapp.htmx import page_or_part, wants_fragment
from webapp.people.access import needs
from webapp.plan import queries as plan_queries
from webapp.review import forms, importing, queries, service
from webapp.review.numbers import CORRECTABLE
from webapp.review.rows import number_lines, rows_of
from webapp.surveys import queries as survey_queries
from webapp.tablefile import decode

bp = Blueprint("review", __name__)
PAGE_SIZE = 100
FILTER_FIELDS = ("station", "state", "author", "since", "until")


@bp.get("/surveys/<survey_id>/readings")
@login_required
def table(survey_id):
    """Show the readings that the filters let through, a page of them."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    show = Show.of(survey)
    filters, errors = forms.parse_filters(request.args, show)
    plan = plan_queries.current_plan(db, survey_id)
    matching = queries.count_matching(db, survey_id, filters)
    asked = {name: request.args[name] for name in FILTER_FIELDS if request.args.get(name)}
    return page_or_part(
        "review/table.html",
        "review/_table.html",
        survey=survey,
        show=show,
        tab="readings",
        rows=rows_of(survey, plan, queries.page_of(db, survey_id, filters, PAGE_SIZE)),
        matching=matching,
        total=survey_queries.count_readings(db, survey_id) if asked else matching,
        number=filters.page,
        pages=max(1, -(-matching // PAGE_SIZE)),
        asked=asked,
        form=request.args,
        errors=errors,
        states=forms.STATES,
        stations=sorted(plan_queries.stations_of(db, survey_id)),
        authors=queries.authors_of(db, survey_id),
        imported=_counts(request.args),
        has_plan=plan is not None,
    )


@bp.get("/surveys/<survey_id>/readings/<reading_id>")
@login_required
def reading(survey_id, reading_id):
    """Show one reading with everything that was recorded and decided; ?correct= opens the form for a number."""
    return _reading(survey_id, reading_id)


@bp.post("/surveys/<survey_id>/readings/<reading_id>/correct")
@needs("log")
def correct(survey_id, reading_id):
    """Store a correction as a new layer."""
    db, show, row = _found(survey_id, reading_id)
    correction, errors = forms.parse_correction(request.form, show, row.final, len(row.reading.events))
    if errors:
        return _reading(survey_id, reading_id, 422, errors)
    return _decide(service.correct, survey_id, reading_id, correction)


@bp.post("/surveys/<survey_id>/readings/<reading_id>/set-aside")
@needs("log")
def set_aside(survey_id, reading_id):
    """Keep a reading in the record, out of use."""
    return _decide_with_reason(service.set_aside, survey_id, reading_id)


@bp.post("/surveys/<survey_id>/readings/<reading_id>/restore")
@needs("log")
def restore(survey_id, reading_id):
    """Use a reading again."""
    return _decide_with_reason(service.restore, survey_id, reading_id)


def _decide_with_reason(decide, survey_id, reading_id):
    survey_queries.get_survey(get_db(), survey_id, current_user.id)
    reason, errors = forms.parse_reason(request.form)
    if errors:
        return _reading(survey_id, reading_id, 422, errors)
    return _decide(decide, survey_id, reading_id, reason)


def _decide(decide, survey_id, reading_id, decision):
    try:
        decide(get_db(), survey_id, reading_id, decision, forms.based_on(request.form), current_user)
    except Conflict as conflict:
        return _reading(survey_id, reading_id, 409, conflict=conflict.message)
    if wants_fragment():
        return _reading(survey_id, reading_id, done=True)
    return redirect(url_for(".reading", survey_id=survey_id, reading_id=reading_id), code=303)


def _found(survey_id, reading_id):
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    plan = plan_queries.current_plan(db, survey_id)
    return db, Show.of(survey), rows_of(survey, plan, [queries.get_reading(db, survey_id, reading_id)])[0]


def _reading(survey_id, reading_id, status=200, errors=None, conflict="", done=False):
    db, show, row = _found(survey_id, reading_id)
    form = {} if done else request.form
    wanted = form.get("field") or ("" if done else request.args.get("correct", ""))
    return page_or_part(
        "review/reading.html",
        "review/_reading.html",
        status,
        survey=survey_queries.get_survey(db, survey_id, current_user.id),
        show=show,
        tab="readings",
        row=row,
        lines=number_lines(row),
        may_decide=service.may_decide(current_user, row.reading),
        correcting=CORRECTABLE.get(wanted),
        form=form,
        errors=errors or {},
        conflict=conflict,
    )


@bp.get("/surveys/<survey_id>/readings/import")
@needs("correct")
def import_form(survey_id):
    """Show where a paper sheet's readings are pasted or uploaded."""
    return _import_page(survey_id)


@bp.post("/surveys/<survey_id>/readings/import/preview")
@needs("correct")
@reads_only
def import_preview(survey_id):
    """Show what the readings would be, or what is wrong in which cell. Nothing is stored."""
    text = _pasted()
    if not text.strip():
        return _import_page(survey_id, 422, errors={"text": "Paste the table, or choose a file."})
    survey = survey_queries.get_survey(get_db(), survey_id, current_user.id)
    preview = importing.preview(get_db(), survey, text)
    return _import_page(survey_id, 200 if preview.good else 422, text, preview)


@bp.post("/surveys/<survey_id>/readings/import")
@needs("correct")
def import_readings(survey_id):
    """Store the readings, all of them or, where a cell is wrong, none."""
    db, text = get_db(), _pasted()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    checked = importing.checked(db, survey, text)
    if not checked.good:
        return _import_page(survey_id, 422, text, checked)
    file = checked.file
    entered = importing.entered_of(file)
    added, known = service.import_readings(db, survey, file.rows, current_user.id, entered)
    address = url_for(".table", survey_id=survey_id, added=added, known=known)
    if not wants_fragment():
        return redirect(address, code=303)
    return "", 204, {"HX-Redirect": address}


def _import_page(survey_id, status=200, text="", preview=None, errors=None):
    survey = survey_queries.get_survey(get_db(), survey_id, current_user.id)
    return page_or_part(
        "review/import.html",
        "review/_import.html",
        status,
        survey=survey,
        show=Show.of(survey),
        tab="readings",
        columns=importing.columns_in_words(Show.of(survey)),
        form={"text": text},
        preview=preview,
        errors=errors or {},
    )


@bp.get("/surveys/<survey_id>/readings/sheet.csv")
@needs("correct")
def empty_sheet(survey_id):
    """Give an empty table with the right column names, to fill in."""
    survey = survey_queries.get_survey(get_db(), survey_id, current_user.id)
    return importing.empty_sheet(Show.of(survey)), {
        "Content-Type": "text/csv; charset=utf-8",
        "Content-Disposition": 'attachment; filename="readings.csv"',
    }


def _pasted():
    """Return the table's text: of the file where one was chosen, else what was pasted."""
    upload = request.files.get("file")
    if upload is not None and upload.filename:
        return decode(upload.read())
    return request.form.get("text", "")


def _counts(args):
    """Return (added, known) of an import that led here, or None."""
    counts = [args.get(name, "") for name in ("added", "known")]
    if all(count.isascii() and count.isdigit() and len(count) <= 6 for count in counts):
        return tuple(int(count) for count in counts)
    return None
