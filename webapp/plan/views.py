"""The plan: its page and versions, one row at a time, a whole table from a file, and proposed stations."""

from dataclasses import dataclass

from flask import Blueprint, Response, redirect, render_template, request, url_for
from flask_login import current_user, login_required

from webapp.columns import Table
from webapp.db import get_db, reads_only
from webapp.errors import Conflict, NotFound
from webapp.htmx import page_or_part
from webapp.people.access import needs
from webapp.plan import day_forms, forms, proposal, queries, service
from webapp.plan.day import day_changes, predict_today
from webapp.plan.day_words import effect
from webapp.plan.rows import in_order, row_title, with_row
from webapp.plan.shown import find_again, open_plan
from webapp.plan.tables import LISTS, PLAN_TABLES
from webapp.tablefile import decode, write_table

bp = Blueprint("plan", __name__)
PLAN = "/surveys/<survey_id>/plan"


@bp.get(PLAN)
@login_required
def page(survey_id):
    """Show the plan: the sag it predicts, its rates, its tables and its versions."""
    return _plan_page(_open(survey_id), queries.plan_versions(get_db(), survey_id), current_user.may("plan"))


@bp.get(f"{PLAN}/versions/<int(max=99999999):number>")  # a longer one fits no column
@login_required
def version(survey_id, number):
    """Show a version of the plan as it was."""
    return _plan_page(_open(survey_id, number), [], False, old=True)


@bp.get(f"{PLAN}/<key>.csv")
@login_required
def download(survey_id, key):
    """Give a table as a file that a spreadsheet opens and the import takes back."""
    plan, table = _open(survey_id), _table(key)
    text = write_table(plan.tables[table.key], table, plan.show)
    headers = {"Content-Disposition": f'attachment; filename="{table.key}.csv"'}
    return Response(text.encode("utf-8-sig"), mimetype="text/csv", headers=headers)


@bp.get(f"{PLAN}/<key>/new")
@bp.get(f"{PLAN}/<key>/<int:index>/edit")
@needs("plan")
def edit_row(survey_id, key, index=None):
    """Show the form of a row, or of a new one, under the sag that the plan gives."""
    plan, table = _open(survey_id), _table(key, index)
    edit = _edit(plan, table, index, plan.number)
    row = edit.rows[edit.index] if edit.index is not None else {}
    return _row_page(plan, edit, forms.typed_row(row, table, plan.show))


@bp.post(f"{PLAN}/<key>/new/look")
@bp.post(f"{PLAN}/<key>/<int:index>/look")
@needs("plan")
@reads_only
def look(survey_id, key, index=None):
    """Show the sag with the row as it is typed; nothing is saved."""
    plan, edit, read = _typed(survey_id, key, index)
    return _row_page(plan, edit, request.form, read.errors, 422 if read.errors else 200, read=read)


@bp.post(f"{PLAN}/<key>/new")
@bp.post(f"{PLAN}/<key>/<int:index>/edit")
@needs("plan")
def save_row(survey_id, key, index=None):
    """Store the plan with the row as typed as a new version, or show the form again with what is wrong."""
    plan, edit, read = _typed(survey_id, key, index)
    reason, errors = forms.parse_reason(request.form, plan.needs_reason)
    rows = with_row(edit.rows, edit.index, read.row)
    return _store(plan, edit, rows, reason, read.errors | errors, request.form, read)


@bp.post(f"{PLAN}/<key>/<int:index>/remove")
@needs("plan")
def remove_row(survey_id, key, index):
    """Store the plan without the row as a new version."""
    plan, table = _open(survey_id), _table(key, None)
    edit = _edit(plan, table, index, forms.parse_based_on(request.form))
    if edit.index is None:
        return _plan_after(plan, table)
    form = forms.typed_row(edit.rows[edit.index], table, plan.show)
    form |= {"version_reason": request.form.get("version_reason", "")}
    reason, errors = forms.parse_reason(request.form, plan.needs_reason)
    errors = {"remove_reason": errors["version_reason"]} if errors else {}
    return _store(plan, edit, edit.rows[: edit.index] + edit.rows[edit.index + 1 :], reason, errors, form)


@bp.get(f"{PLAN}/<key>/import")
@needs("plan")
def import_form(survey_id, key):
    """Show where a table is pasted or uploaded, with the names of its columns."""
    plan, table = _open(survey_id), _table(key)
    return _import_page(plan, table, {"based_on": str(plan.number)})


@bp.post(f"{PLAN}/<key>/import")
@needs("plan")
@reads_only
def import_check(survey_id, key):
    """Show the table as it is read, with every bad cell; nothing is saved."""
    plan, table = _open(survey_id), _table(key)
    form = request.form.to_dict()
    if (upload := request.files.get("file")) is not None and upload.filename:
        form["text"] = decode(upload.read()).replace("\x00", "")
    read = forms.parse_file(form.get("text", ""), table.key, plan.show)
    return _import_page(plan, table, form, read, 200 if read.good else 422)


@bp.post(f"{PLAN}/<key>/import/save")
@needs("plan")
def import_save(survey_id, key):
    """Replace a table with the one that was checked, as a new version."""
    plan, table = _open(survey_id), _table(key)
    form = request.form.to_dict()
    read = forms.parse_file(form.get("text", ""), table.key, plan.show)
    reason, errors = forms.parse_reason(form, plan.needs_reason)
    if errors or not read.good:
        return _import_page(plan, table, form, read, 422, errors)
    based_on = forms.parse_based_on(form)
    try:
        service.replace_table(get_db(), plan.survey, table.key, read.rows, reason, current_user.id, based_on)
    except Conflict as conflict:
        form["based_on"] = str(plan.number)
        return _import_page(plan, table, form, read, 409, message=conflict.message)
    return _plan_after(plan, table)


@bp.get(f"{PLAN}/stations/proposal")
@needs("plan")
def propose_stations(survey_id):
    """Show the stations that the predicted sag asks for, each with a tick to take it."""
    return _proposal_page(_open(survey_id))


@bp.post(f"{PLAN}/stations/proposal")
@needs("plan")
def save_proposal(survey_id):
    """Add the ticked proposals to the stations, as a new version."""
    plan = _open(survey_id)
    if forms.parse_based_on(request.form) != plan.number:
        return _proposal_page(plan, 409, message=service.overtaken(plan.version))
    known = queries.stations_of(get_db(), survey_id)
    rows, errors = forms.parse_proposal(request.form, plan.show, known, plan.needs_reason)
    reason, more = forms.parse_reason(request.form, plan.needs_reason)
    if errors or more:
        return _proposal_page(plan, 422, request.form, errors | more)
    rows = plan.tables["stations"] + [row | ({"reason": reason} if reason else {}) for row in rows]
    try:
        service.replace_table(get_db(), plan.survey, "stations", rows, reason, current_user.id, plan.number)
    except Conflict as conflict:
        return _proposal_page(plan, 409, request.form, message=conflict.message)
    return _plan_after(plan, PLAN_TABLES["stations"])


@bp.get(f"{PLAN}/day")
@needs("plan")
def day_form(survey_id):
    """Show what the day showed, beside what was planned, with what it changes."""
    plan = _open(survey_id)
    return _day_page(plan, day_forms.typed_day(plan.tables, plan.reaches(), plan.show), plan.tables)


@bp.post(f"{PLAN}/day/look")
@needs("plan")
@reads_only
def day_look(survey_id):
    """Show what the day as typed changes; nothing is saved."""
    plan = _open(survey_id)
    tables, errors = day_forms.parse_day(request.form, plan.reaches(), plan.show)
    return _day_page(plan, request.form, plan.tables | tables, errors, 422 if errors else 200)


@bp.post(f"{PLAN}/day")
@needs("plan")
def save_day(survey_id):
    """Store what the day showed as a new version of the plan, which every field sheet follows."""
    plan = _open(survey_id)
    tables, errors = day_forms.parse_day(request.form, plan.reaches(), plan.show)
    reason, more = forms.parse_reason(request.form, plan.needs_reason)
    if errors or more or plan.version is None:
        return _day_page(plan, request.form, plan.tables | tables, errors | more, 422)
    based_on = forms.parse_based_on(request.form)
    try:
        service.save_tables(get_db(), plan.survey, tables, reason, current_user.id, based_on)
    except Conflict as conflict:
        return _day_page(plan, request.form, plan.tables | tables, {}, 409, conflict.message)
    return redirect(url_for("fieldsheet.sheet", survey_id=plan.survey.id), code=303)


@dataclass(frozen=True)
class _Edit:
    """A row that is being changed: where it stands in the table as it is now, None for a new one."""

    table: Table
    rows: list
    index: int | None
    overtaken: str = ""


def _open(survey_id, number=None):
    return open_plan(get_db(), survey_id, current_user.id, number)


def _table(key, index=0):
    """Return the table of an address; one row of its own, without others, has no new one. Raises NotFound."""
    if key not in PLAN_TABLES or (index is None and key not in LISTS):
        raise NotFound("A plan has no such table.")
    return PLAN_TABLES[key]


def _edit(plan, table, index, based_on):
    """Return the _Edit of a form that was made from version based_on, which may no longer be the current one."""
    rows = plan.tables[table.key]
    if based_on != plan.number:
        old = queries.get_version(get_db(), plan.survey.id, based_on).tables if based_on else {}
        now = find_again(old.get(table.key, []), rows, index, table.key_column)
        return _Edit(table, rows, now, service.overtaken(plan.version))
    if index is not None and index >= len(rows):
        raise NotFound(f"There is no such {table.one} in the plan any more.")
    return _Edit(table, rows, index)


def _typed(survey_id, key, index):
    """Return the plan, the _Edit and the RowForm of a form that was sent."""
    plan, table = _open(survey_id), _table(key, index)
    edit = _edit(plan, table, index, forms.parse_based_on(request.form))
    source = forms.with_access_place(request.form, table, plan.tables, plan.show)
    return plan, edit, forms.parse_row(source, table, plan.show, edit.rows, edit.index)


def _store(plan, edit, rows, reason, errors, form, read=None):
    """Store a table's rows and go back to the plan, or show the row's form again with what stands against it."""
    if edit.overtaken:
        return _row_page(plan, edit, form, errors, 409, read, edit.overtaken)
    if errors:
        return _row_page(plan, edit, form, errors, 422, read)
    try:
        service.replace_table(get_db(), plan.survey, edit.table.key, rows, reason, current_user.id, plan.number)
    except Conflict as conflict:
        return _row_page(plan, edit, form, errors, 409, read, conflict.message)
    return _plan_after(plan, edit.table)


def _plan_after(plan, table):
    address = url_for("plan.page", survey_id=plan.survey.id, open=table.key, _anchor=table.key)
    return redirect(address, code=303)


def _plan_page(plan, versions, may_change, old=False):
    return render_template(
        "plan/plan.html",
        **plan.context(),
        **plan.outlook(),
        day=day_forms.shown_day(plan.tables, plan.show),
        shown={key: forms.shown_rows(key, plan.tables[key], plan.show) for key in PLAN_TABLES},
        plan_tables=PLAN_TABLES,
        lists=LISTS,
        versions=versions,
        opened=request.args.get("open", ""),
        may_change=may_change,
        old=old,
    )


def _row_page(plan, edit, form, errors=None, status=200, read=None, message=""):
    """Return the page of a row, or for htmx the sag that it gives. read is the RowForm of what is typed."""
    tables = None
    if read is not None and not (read.errors and edit.index is None):
        rows = with_row(edit.rows, edit.index, read.row)
        tables = plan.tables | {edit.table.key: in_order(edit.table.key, rows)}
    is_new, access = edit.index is None, [one["name"] for one in plan.tables["access"]]
    fields = forms.row_fields(edit.table, plan.show, form, access)
    return page_or_part(
        "plan/row.html",
        "plan/_look.html",
        status,
        **plan.context(),
        **plan.outlook(tables),
        table=edit.table,
        index=edit.index,
        title=f"New {edit.table.one}" if is_new else row_title(edit.table.key, edit.rows[edit.index], edit.index + 1),
        fields=fields,
        unfolded=any(field.folded and (form.get(field.key) or (errors or {}).get(field.key)) for field in fields),
        form=form,
        errors=errors or {},
        message=message,
    )


def _day_page(plan, form, tables, errors=None, status=200, message=""):
    """Return the page of what the day showed, or for htmx what it changes."""
    errors, elevation_m = errors or {}, plan.survey.elevation_m
    planned = plan.outlook()["prediction"]
    words = effect(plan.survey, plan.show, planned, predict_today(tables, elevation_m)) if day_changes(tables) else ()
    return page_or_part(
        "plan/day.html",
        "plan/_day_effect.html",
        status,
        **plan.context(),
        planned=planned,
        effect=words,
        groups=day_forms.day_groups(plan.tables, plan.show),
        times=day_forms.time_fields(plan.show, form, errors),
        reaches=day_forms.reach_fields(plan.reaches(), plan.show, form, errors),
        form=form,
        errors=errors,
        message=message,
    )


def _import_page(plan, table, form, read=None, status=200, errors=None, message=""):
    page = render_template(
        "plan/import.html",
        **plan.context() | {"based_on": form.get("based_on", "")},
        table=table,
        header=write_table([], table, plan.show).strip(),
        form=form,
        read=read,
        lines=forms.read_lines(read, plan.show) if read else [],
        errors=errors or {},
        message=message,
        now=len(plan.tables[table.key]),
    )
    return page, status


def _proposal_page(plan, status=200, form=None, errors=None, message=""):
    outlook = plan.outlook()
    prediction = outlook["prediction"]
    proposed = proposal.propose(plan.tables, prediction) if prediction.ready else None
    if proposed and form is None:
        form = forms.typed_proposal(proposed, queries.stations_of(get_db(), plan.survey.id), plan.show)
    page = render_template(
        "plan/proposal.html",
        **plan.context(),
        **outlook,
        proposed=proposed,
        form=form or {},
        errors=errors or {},
        message=message,
    )
    return page, status
