"""What a phone asks besides pages: who is signed in, the field pack of a survey, the worker that keeps its pages."""

import json
from datetime import UTC, datetime

from flask import Blueprint, Response, jsonify, render_template, request, url_for
from flask_login import current_user, login_required

from webapp.db import get_db
from webapp.fieldpack import copies, service
from webapp.look import asset, read_script, script_names
from webapp.people.access import needs
from webapp.plan.queries import current_plan
from webapp.readings.queries import readings_of
from webapp.surveys.queries import current_settings, get_survey

bp = Blueprint("fieldpack", __name__)


@bp.get("/phone/here")
def here():
    """Say who is signed in and give a token that fits, or the form to sign in over the page."""
    return render_template("fieldpack/_here.html")


@bp.get("/phone")
@login_required
def phone():
    """Show what waits on this phone; the phone itself fills it in."""
    return render_template("fieldpack/phone.html")


@bp.get("/surveys/<survey_id>/fieldpack")
@login_required
def pack(survey_id):
    """Give the field pack of a survey, with the pages and files that must be on the phone to use it."""
    db = get_db()
    survey = get_survey(db, survey_id, current_user.id)
    plan, settings = current_plan(db, survey_id), current_settings(db, survey_id)
    made = service.pack_of(survey, plan, settings, readings_of(db, survey_id), datetime.now(UTC))
    made["person"] = current_user.id
    made["pages"] = [
        url_for("surveys.list_surveys"),
        url_for(".phone"),
        url_for("fieldsheet.sheet", survey_id=survey_id),
        *_forms(survey_id, [one["code"] for one in made["stations"]]),
    ]
    made["files"] = _files()
    response = jsonify(made)
    response.headers["Cache-Control"] = "no-store"
    return response


def _forms(survey_id, codes):
    """Return the address of every form that a crew may need without signal."""
    at_station = ("readings.new", "visits.new", "bottles.new")
    return [
        url_for("meters.new_check", survey_id=survey_id),
        *(url_for(one, survey_id=survey_id, code=code) for code in codes for one in at_station),
    ]


@bp.post("/phone/copy")
@needs("log")
def take_copy():
    """Store the records of a file that a phone saved, and list what became of each."""
    upload = request.files.get("file")
    try:
        read = copies.read_copy(upload.read() if upload else b"")
    except copies.BadCopy as bad:
        return render_template("fieldpack/copy.html", trouble=str(bad), taken=()), 422
    taken = copies.take_copies(get_db(), read, current_user)
    return render_template("fieldpack/copy.html", trouble="", taken=taken)


@bp.get("/worker.js")
def worker():
    """Give the worker; its first line names the files of this version, so that a new version is another worker."""
    script = f"const FILES = {json.dumps(_files())};\n{read_script('worker.js')}"
    return Response(script, mimetype="text/javascript", headers={"Cache-Control": "no-cache"})


def _files():
    names = ("app.css", "icons/bankside.svg", "htmx.js", *script_names())
    return [asset(name) for name in names]
