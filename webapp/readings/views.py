"""The reading form and the on-site check."""

from flask import Blueprint, redirect, request, url_for
from flask_login import current_user, login_required

from webapp.answers import answers, saved_at, show_of_form
from webapp.charts import sag_chart
from webapp.db import get_db
from webapp.display import Show
from webapp.errors import Conflict
from webapp.fieldsheet import service as fieldsheet
from webapp.htmx import page_or_part, wants_fragment
from webapp.people.access import needs
from webapp.readings import columns, forms, queries, service
from webapp.readings.day import Day, Fresh
from webapp.readings.surroundings import where
from webapp.surveys import queries as survey_queries

bp = Blueprint("readings", __name__)
NOT_YOURS = (
    "Somebody else recorded this reading, and it is stored under their name only. It waits on this phone until they "
    "sign in here."
)
OPTIONS = {
    "pressure_sources": columns.PRESSURE_SOURCES,
    "pressure_units": columns.PRESSURE_UNITS,
    "positions": columns.POSITIONS,
    "percent_bases": columns.PERCENT_BASES,
    "velocity_methods": columns.VELOCITY_METHODS,
}


@bp.get("/surveys/<survey_id>/stations/<code>/reading")
@needs("log")
def new(survey_id, code):
    """Show a fresh form for a reading at a station."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    queries.get_station(db, survey_id, code)
    show, day = Show.of(survey), Fresh(db, survey)
    last = queries.last_by(db, survey_id, current_user.id)
    form = forms.fresh_form(show, last, day.now, day.meters, request.args)
    return _form_page(day, show, code, form, fresh=True, **day.before(code))


@bp.post("/surveys/<survey_id>/stations/<code>/reading")
@needs("log")
def save(survey_id, code):
    """Store a reading and show its check, or the form again: what can't be, or what is odd and was not asked about."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    queries.get_station(db, survey_id, code)
    day = Day(db, survey)
    form = request.form.to_dict()
    if form.get("author_id", current_user.id) != current_user.id:
        return _belongs_to_another(day, code, form)
    show = show_of_form(form, Show.of(survey))
    reading, errors, asks = _read(day, form, show, code)
    if taken := forms.with_suggestion(form, asks, show):
        form = taken
        reading, errors, asks = _read(day, form, show, code)
    if errors:
        return _form_page(day, show, code, form, 422, errors, [one for one in asks if one.suggestion])
    if open_asks := forms.unanswered(asks, form):
        return _form_page(day, show, code, form, 422, forms.without_reason(open_asks, form), open_asks)
    try:
        stored = service.add_reading(db, survey, reading.keeping(asks), current_user.id, day.plan, day.now)
    except Conflict as conflict:
        return _form_page(day, show, code, form, 409, conflict=conflict.message)
    return _stored(day, stored)


def _read(day, form, show, code):
    """Return the reading that a form holds, its errors, and what to ask about it."""
    reading, errors = forms.parse_reading(form, show, code, day.now)
    reading = day.settled(reading)
    return reading, errors, day.asks(reading, saved_at(form))


@bp.get("/surveys/<survey_id>/readings/<reading_id>/check")
@login_required
def check(survey_id, reading_id):
    """Show the check of a stored reading."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    return _check_page(Day(db, survey), queries.get_reading(db, survey_id, reading_id))


@bp.get("/surveys/<survey_id>/readings/<reading_id>/check/today")
@login_required
def today(survey_id, reading_id):
    """Show what a stored reading says against today's sag: fetched after the check of a save."""
    db = get_db()
    survey = survey_queries.get_survey(db, survey_id, current_user.id)
    return _check_page(Day(db, survey), queries.get_reading(db, survey_id, reading_id), "readings/_today.html")


def _stored(day, reading):
    """Answer with the check and the id that is now stored: the phone lets go of a reading only for this header."""
    address = url_for(".check", survey_id=day.survey.id, reading_id=reading.id)
    if wants_fragment():
        day.holds(reading)
        response = _check_page(day, reading, waits=True)
        response.headers["HX-Push-Url"] = address
    else:
        response = redirect(address, code=303)
    response.headers["X-Stored-Id"] = reading.id
    return response


def _belongs_to_another(day, code, form):
    """Answer a reading that somebody else recorded on this phone: it waits for them, under their name."""
    response = _form_page(day, Show.of(day.survey), code, form, 409, conflict=NOT_YOURS)
    response.headers["X-Belongs-To"] = "another"
    return response


def _form_page(day, show, code, form, status=200, errors=None, asks=(), conflict="", fresh=False, **known):
    kept, keep = answers(asks, form, forms.FIELD_OF)
    station, place = where(day.plan, code)
    return page_or_part(
        "readings/new.html",
        "readings/_form.html",
        status,
        survey=day.survey,
        show=show,
        tab="fieldsheet",
        code=code,
        station=station,
        place=place,
        form=form,
        errors=errors or {},
        asks=[(one, forms.suggestion_words(one, show), forms.suggested_texts(one, show)) for one in asks],
        kept=kept,
        keep=keep,
        conflict=conflict,
        fresh=fresh,
        unfolded=forms.unfolded(form, errors or {}, asks),
        meters=forms.meter_choices(day.meters, form),
        **{"before": None, "across": "", **known},
        **OPTIONS,
    )


def _check_page(day, reading, part="readings/_check.html", waits=False):
    """Answer with the check; waits leaves what takes all readings or an estimate of the sag for later."""
    survey, show = day.survey, Show.of(day.survey)
    check = day.check(reading)
    context = {"against": None} if waits else day.among_all(reading)
    prediction, sag = check.around.prediction, context.pop("sag", None)
    return page_or_part(
        "readings/check.html",
        part,
        survey=survey,
        show=show,
        tab="fieldsheet",
        reading=reading,
        check=check,
        still=day.still_to_read(reading),
        due=day.replicate_due(reading),
        positions_short=columns.POSITIONS_SHORT,
        waits=waits,
        chart=prediction and sag_chart(show, prediction, day.placed(), reading.id, survey.do_criterion_mg_l, today=sag),
        next=fieldsheet.next_stop(survey, day.plan, day.readings, current_user.name),
        now=day.now,
        **context,
    )
