"""Readings as a table and as a list to review, one reading with all that speaks for it, drift, and paper sheets."""

import uuid

from flask import Blueprint, redirect, render_template, request, url_for
from flask_login import current_user, login_required

from webapp.approval.queries import state_of
from webapp.db import get_db, reads_only, write_aside
from webapp.display import Show
from webapp.errors import Conflict, NotAllowed
from webapp.htmx import page_or_part, wants_fragment
from webapp.meters import words as meter_words
from webapp.people.access import needs
from webapp.plan import queries as plan_queries
from webapp.readings.judging import judgement_of
from webapp.review import bulk, drifting, forms, importing, listing, queries, service
from webapp.review.evidence import evidence_of
from webapp.review.numbers import CORRECTABLE
from webapp.review.rows import number_lines, rows_of, table_rows, todo_rows
from webapp.review.words import QUALITY_NAMES
from webapp.surveys import queries as survey_queries
from webapp.tablefile import decode

bp = Blueprint("review", __name__)
PAGE_SIZE = 100


def _survey(survey_id):
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    return db, survey, Show.of(survey)


def _asked():
    """Return the filters of this page's address."""
    return {name: request.args[name] for name in forms.FILTER_FIELDS if request.args.get(name)}


@bp.get("/surveys/<survey_id>/readings")
@login_required
def table(survey_id):
    """Show the readings that the filters let through, a page of them."""
    db, survey, show = _survey(survey_id)
    filters, errors = forms.parse_filters(request.args, show)
    plan = plan_queries.current_plan(db, survey_id)
    judged = list(judgement_of(db, survey).by_id.values())
    found = listing.matching(judged, filters, show)[::-1]
    return page_or_part(
        "review/table.html",
        "review/_table.html",
        survey=survey,
        show=show,
        tab="readings",
        rows=table_rows(survey, plan, listing.page_of(found, filters.page, PAGE_SIZE)),
        matching=len(found),
        total=len(judged),
        number=filters.page,
        pages=max(1, -(-len(found) // PAGE_SIZE)),
        asked=_asked(),
        form=request.args,
        errors=errors,
        choices=listing.choices_of(judged, show),
        states=forms.STATES,
        checks=forms.CHECKS,
        looks=forms.LOOKS,
        qualities=QUALITY_NAMES,
        questions=listing.questions_for(judged, current_user.id),
        to_look_at=listing.to_look_at(judged),
        imported=_counts(request.args, "added", "known"),
        has_plan=plan is not None,
        state=state_of(db, survey_id),
    )


@bp.get("/surveys/<survey_id>/review")
@needs("correct")
def todo(survey_id):
    """Show what needs a look, worst first; ?kept= says how many were kept just now."""
    (kept,) = _counts(request.args, "kept") or (None,)
    return _todo(survey_id, outcome=None if kept is None else (kept, ()))


@bp.post("/surveys/<survey_id>/review")
@needs("correct")
def keep_ticked(survey_id):
    """Keep the ticked readings that may be kept together, and say which were left out and why."""
    db, survey, show = _survey(survey_id)
    ticked, errors = forms.parse_ticked(request.form, request.form.getlist("ticked"))
    if errors:
        return _todo(survey_id, 422, errors)
    counts = ticked.counts
    if ticked.all_that_fit:
        filters, _ = forms.parse_filters(request.args, show, "todo")
        fitting = listing.matching(judgement_of(db, survey).by_id.values(), filters, show)
        counts = {one.reading.id: None for one in fitting if not bulk.why_alone(one, current_user.id)}
    try:
        outcome = bulk.keep_many(db, survey, counts, ticked.reason, current_user)
    except Conflict as conflict:
        return _todo(survey_id, 409, conflict=conflict.message)
    if wants_fragment() or outcome[1]:
        return _todo(survey_id, outcome=outcome)
    return redirect(url_for(".todo", survey_id=survey_id, kept=outcome[0], **_asked()), code=303)


def _todo(survey_id, status=200, errors=None, conflict="", outcome=None):
    db, survey, show = _survey(survey_id)
    filters, refused = forms.parse_filters(request.args, show, "todo")
    judged = list(judgement_of(db, survey).by_id.values())
    found = listing.worst_first(listing.matching(judged, filters, show))
    together = [one for one in found if not bulk.why_alone(one, current_user.id)]
    return page_or_part(
        "review/todo.html",
        "review/_todo.html",
        status,
        survey=survey,
        show=show,
        state=state_of(db, survey_id),
        tab="readings",
        rows=todo_rows(listing.page_of(found, filters.page, PAGE_SIZE), current_user.id),
        matching=len(found),
        total=len(judged),
        looked_at=listing.looked_at(judged),
        together=len(together),
        drifts=drifting.count_open(db, survey),
        number=filters.page,
        pages=max(1, -(-len(found) // PAGE_SIZE)),
        asked=_asked(),
        form=request.form if errors else {},
        ticked=set(request.form.getlist("ticked")) if errors else (),
        filled=request.args,
        errors={**(errors or {}), **refused},
        choices=listing.choices_of(judged, show),
        looks=forms.LOOKS,
        conflict=conflict,
        outcome=outcome,
    )


@bp.get("/surveys/<survey_id>/readings/<reading_id>")
@login_required
def reading(survey_id, reading_id):
    """Show one reading with everything that speaks for or against it; ?correct= opens the form for a number."""
    return _reading(survey_id, reading_id)


@bp.post("/surveys/<survey_id>/readings/<reading_id>/correct")
@needs("log")
def correct(survey_id, reading_id):
    """Store a correction as a new layer."""
    db, survey, show = _survey(survey_id)
    (row,) = rows_of(survey, None, [queries.get_reading(db, survey_id, reading_id)])
    correction, errors = forms.parse_correction(request.form, show, row.final, len(row.reading.events))
    if errors:
        return _reading(survey_id, reading_id, 422, errors)
    return _decide(service.correct, survey_id, reading_id, correction)


@bp.post("/surveys/<survey_id>/readings/<reading_id>/set-aside")
@needs("log")
def set_aside(survey_id, reading_id):
    """Keep a reading in the record, out of use."""
    return _decide_with(service.set_aside, survey_id, reading_id, *forms.parse_reason(request.form))


@bp.post("/surveys/<survey_id>/readings/<reading_id>/restore")
@needs("log")
def restore(survey_id, reading_id):
    """Use a reading again."""
    return _decide_with(service.restore, survey_id, reading_id, *forms.parse_reason(request.form))


@bp.post("/surveys/<survey_id>/readings/<reading_id>/keep")
@needs("correct")
def keep(survey_id, reading_id):
    """Let a reading stand as a reviewer."""
    decision = forms.parse_words(request.form, "why_kept", forms.WHY_KEPT)
    return _decide_with(service.keep, survey_id, reading_id, *decision)


@bp.post("/surveys/<survey_id>/readings/<reading_id>/ask")
@needs("correct")
def ask(survey_id, reading_id):
    """Put a question about a reading to the crew."""
    decision = forms.parse_words(request.form, "question", "question")
    return _decide_with(service.ask, survey_id, reading_id, *decision)


@bp.post("/surveys/<survey_id>/readings/<reading_id>/answer")
@needs("log")
def answer(survey_id, reading_id):
    """Answer the open question about a reading."""
    decision = forms.parse_words(request.form, "answer", "answer")
    return _decide_with(service.answer, survey_id, reading_id, *decision)


def _decide_with(decide, survey_id, reading_id, words, errors):
    _survey(survey_id)
    if errors:
        return _reading(survey_id, reading_id, 422, errors)
    return _decide(decide, survey_id, reading_id, words)


def _decide(decide, survey_id, reading_id, decision):
    db = get_db()
    following = _beside(survey_id, reading_id)[1] if decide in (service.keep, service.ask, service.set_aside) else None
    try:
        decide(db, survey_id, reading_id, decision, forms.based_on(request.form), current_user)
    except Conflict as conflict:
        return _reading(survey_id, reading_id, 409, conflict=conflict.message)
    if "list" in request.args:
        shown = {"reading_id": following.reading.id, "done": reading_id} if following else {"reading_id": reading_id}
        return redirect(url_for(".reading", survey_id=survey_id, list="on", **shown, **_asked()), code=303)
    if wants_fragment():
        return _reading(survey_id, reading_id, done=True)
    return redirect(url_for(".reading", survey_id=survey_id, reading_id=reading_id), code=303)


def _beside(survey_id, reading_id):
    """Return the (reading before, reading after) in the list that somebody goes through; two None outside a list."""
    if "list" not in request.args:
        return None, None
    db, survey, show = _survey(survey_id)
    filters, _ = forms.parse_filters(request.args, show, "todo")
    found = listing.matching(judgement_of(db, survey).by_id.values(), filters, show)
    return listing.beside(listing.worst_first(found), reading_id)


def _reading(survey_id, reading_id, status=200, errors=None, conflict="", done=False):
    db, survey, show = _survey(survey_id)
    reading = queries.get_reading(db, survey_id, reading_id)
    (row,) = rows_of(survey, plan_queries.current_plan(db, survey_id), [reading])
    form = {} if done else request.form
    wanted = form.get("field") or ("" if done else request.args.get("correct", ""))
    before, after = _beside(survey_id, reading_id)
    judgement = judgement_of(db, survey)
    return page_or_part(
        "review/reading.html",
        "review/_reading.html",
        status,
        survey=survey,
        show=show,
        state=state_of(db, survey_id),
        tab="readings",
        row=row,
        lines=number_lines(row),
        evidence=evidence_of(db, survey, reading),
        meter_words=meter_words,
        may_decide=service.may_decide(current_user, reading),
        may_review=service.may_review(current_user, reading),
        may_answer=service.may_answer(current_user, reading),
        correcting=CORRECTABLE.get(wanted),
        stands=forms.standing(row.final, wanted) if wanted in CORRECTABLE else None,
        form=form,
        errors=errors or {},
        conflict=conflict,
        listed="list" in request.args,
        asked=_asked(),
        before=before,
        after=after,
        just_done=judgement.by_id.get(request.args.get("done", "")),
    )


@bp.get("/surveys/<survey_id>/review/drift")
@login_required
def drift(survey_id):
    """Show between which checks a meter drifted, and what a correction would change."""
    return _drift(survey_id)


@bp.post("/surveys/<survey_id>/review/drift")
@needs("correct")
def apply_drift(survey_id):
    """Correct the readings between two checks."""
    return _decide_drift(survey_id, drifting.apply_drift)


@bp.post("/surveys/<survey_id>/review/drift/undo")
@needs("correct")
def undo_drift(survey_id):
    """Take a correction for drift back."""
    return _decide_drift(survey_id, drifting.undo_drift)


def _decide_drift(survey_id, decide):
    db, survey, _ = _survey(survey_id)
    choice, errors = forms.parse_drift(request.form)
    if errors:
        return _drift(survey_id, 422, errors)
    try:
        decide(db, survey, choice, current_user)
    except (Conflict, NotAllowed) as refusal:
        return _drift(survey_id, refusal.status, conflict=refusal.message)
    return redirect(url_for(".drift", survey_id=survey_id), code=303)


def _drift(survey_id, status=200, errors=None, conflict=""):
    db, survey, show = _survey(survey_id)
    pairs, gone = drifting.offers_of(db, survey)
    page = render_template(
        "review/drift.html",
        survey=survey,
        show=show,
        tab="readings",
        pairs=pairs,
        gone=gone,
        form=request.form,
        errors=errors or {},
        conflict=conflict,
        meter_words=meter_words,
        new_id=lambda: str(uuid.uuid4()),
    )
    return page, status


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
@reads_only
def import_readings(survey_id):
    """Store the readings, all of them or, where a cell is wrong, none. They are looked at before the writers' line."""
    db, text = get_db(), _pasted()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    checked = importing.checked(db, survey, text)
    if not checked.good:
        return _import_page(survey_id, 422, text, checked)
    file = checked.file
    prepared = importing.prepare(db, survey, file.rows, importing.entered_of(file))
    with write_aside() as writing:
        added, known = importing.store(writing, survey, prepared, current_user.id)
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


def _counts(args, *names):
    """Return what the deed that led here counted, or None."""
    counts = [args.get(name, "") for name in names]
    if all(count.isascii() and count.isdigit() and len(count) <= 6 for count in counts):
        return tuple(int(count) for count in counts)
    return None
