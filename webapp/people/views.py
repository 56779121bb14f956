"""Signing in and out; the office's list of people."""

from urllib.parse import urlsplit

from flask import Blueprint, redirect, render_template, request, url_for
from flask_login import current_user, login_required

from webapp import limiter
from webapp.db import get_db, reads_only
from webapp.errors import Conflict, NotAllowed
from webapp.invitations.service import sign_out as sign_out_phone
from webapp.people import queries, service
from webapp.people.access import ROLES, end_session, needs, start_session
from webapp.people.forms import parse_password, parse_person

bp = Blueprint("people", __name__)


def _account_tried():
    return (request.form.get("sign_in") or "").strip().lower()[:100] or "nobody"


@bp.route("/sign-in")
def sign_in():
    """Show the sign-in form."""
    return render_template("people/sign_in.html", form={}, errors={}, next=_here(request.args.get("next")))


@bp.post("/sign-in")
@limiter.limit("30 per minute")
@limiter.limit("10 per 5 minutes", key_func=_account_tried, deduct_when=lambda response: response.status_code == 422)
@reads_only
def do_sign_in():
    """Sign in, or say that name and password do not fit."""
    person = service.check_sign_in(get_db(), request.form.get("sign_in", ""), request.form.get("password", ""))
    after = _here(request.form.get("next"))
    if person is None:
        errors = {"password": "Name and password do not fit together. Check both; capitals count in the password."}
        return render_template("people/sign_in.html", form=request.form, errors=errors, next=after), 422
    start_session(person)
    return redirect(after, code=303)


@bp.post("/sign-out")
def sign_out():
    """End this session."""
    if (phone_id := getattr(current_user, "phone_id", None)) is not None:
        sign_out_phone(get_db(), phone_id)
    end_session()
    return redirect(url_for("people.sign_in"), code=303)


@bp.get("/people")
@needs("manage")
def list_people():
    """Show every account."""
    return _people()


@bp.post("/people")
@needs("manage")
def add_person():
    """Make an account."""
    new, errors = parse_person(request.form)
    if errors:
        return _people(422, request.form, errors)
    try:
        service.add_person(get_db(), new, current_user.id)
    except Conflict as conflict:
        return _people(409, request.form, {"sign_in": conflict.message})
    return redirect(url_for(".list_people"), code=303)


@bp.post("/people/<person_id>/active")
@needs("manage")
def set_active(person_id):
    """Open or close an account."""
    service.set_active(get_db(), person_id, request.form.get("active") == "yes", current_user.id)
    return redirect(url_for(".list_people"), code=303)


@bp.get("/people/<person_id>/password")
@login_required
def password_form(person_id):
    """Show the form for a new password: one's own, or by the office."""
    return _password_page(person_id)


@bp.post("/people/<person_id>/password")
@login_required
def change_password(person_id):
    """Set a new password."""
    person = _own_or_managed(person_id)
    password, errors = parse_password(request.form, person.sign_in)
    if errors:
        return _password_page(person_id, 422, errors)
    person = service.change_password(get_db(), person_id, password, current_user.id)
    if person.id == current_user.id:
        start_session(person)
        return redirect(url_for("surveys.list_surveys"), code=303)
    return redirect(url_for(".list_people"), code=303)


def _own_or_managed(person_id):
    if current_user.phone_id is not None:
        raise NotAllowed("This phone was signed in by an invitation. Sign in with your password to change it.")
    if person_id != current_user.id and not current_user.may("manage"):
        person_id = ""  # for anybody else, nobody has this id
    return queries.get_person(get_db(), person_id)


def _password_page(person_id, status=200, errors=None):
    return render_template("people/password.html", person=_own_or_managed(person_id), errors=errors or {}), status


def _people(status=200, form=None, errors=None):
    people = queries.people(get_db())
    return render_template(
        "people/people.html", people=people, roles=ROLES, form=form or {}, errors=errors or {}
    ), status


def _here(address):
    """Return the address when it is a path of this server, else the front page."""
    try:
        parts = urlsplit(address or "")
    except ValueError:  # a bracket that never closes
        return "/"
    local = not parts.scheme and not parts.netloc and parts.path.startswith("/") and not parts.path.startswith("//")
    if not local or "\\" in parts.path or parts.path.startswith(("/sign-", "/look")):
        return "/"
    return parts.path + (f"?{parts.query}" if parts.query else "")
