"""The list of surveys; making and changing one; who is on it."""

from flask import Blueprint, redirect, render_template, request, url_for
from flask_login import current_user, login_required

from webapp.db import get_db
from webapp.display import Show
from webapp.people import queries as people_queries
from webapp.people.access import needs
from webapp.surveys import queries, service
from webapp.surveys.forms import (
    DISTANCE_RULES,
    SAMPLINGS,
    UNIT_SYSTEMS,
    id_of_new,
    new_id,
    parse_survey,
    with_untouched,
)

bp = Blueprint("surveys", __name__)
OPTIONS = {"unit_systems": UNIT_SYSTEMS, "distance_rules": DISTANCE_RULES, "samplings": SAMPLINGS}


@bp.get("/")
@login_required
def list_surveys():
    """Show the surveys the person is on."""
    surveys = people_queries.surveys_of(get_db(), current_user.id, current_user.survey_id)
    return render_template("surveys/surveys.html", surveys=[(one, Show.of(one)) for one in surveys])


@bp.get("/surveys/new")
@needs("plan")
def new_survey():
    """Show the form for a new survey."""
    return render_template("surveys/new.html", form={"survey_id": new_id()}, errors={}, **OPTIONS)


@bp.post("/surveys/new")
@needs("plan")
def create_survey():
    """Make a survey and go on to its plan."""
    facts, errors = parse_survey(request.form)
    if errors:
        return render_template("surveys/new.html", form=request.form, errors=errors, **OPTIONS), 422
    survey = service.create_survey(get_db(), facts, current_user.id, id_of_new(request.form))
    return redirect(url_for("plan.page", survey_id=survey.id), code=303)


@bp.get("/surveys/<survey_id>/about")
@login_required
def about(survey_id):
    """Show the survey's facts, its people and its history."""
    return _about(survey_id)


@bp.post("/surveys/<survey_id>/about")
@needs("plan")
def change_survey(survey_id):
    """Store changed facts."""
    facts, errors = parse_survey(request.form)
    if errors:
        return _about(survey_id, 422, request.form, errors)
    survey = queries.get_survey(get_db(), survey_id, current_user.id)
    facts = with_untouched(facts, request.form, survey, typed_facts(survey, Show.of(survey)))
    service.change_survey(get_db(), survey_id, facts, current_user.id)
    return redirect(url_for(".about", survey_id=survey_id), code=303)


@bp.post("/surveys/<survey_id>/people")
@needs("plan")
def add_member(survey_id):
    """Put a person on the survey."""
    service.add_member(get_db(), survey_id, request.form.get("person_id", ""), current_user.id)
    return redirect(url_for(".about", survey_id=survey_id), code=303)


@bp.post("/surveys/<survey_id>/people/<person_id>/remove")
@needs("plan")
def remove_member(survey_id, person_id):
    """Take a person off the survey."""
    service.remove_member(get_db(), survey_id, person_id, current_user.id)
    return redirect(url_for(".about", survey_id=survey_id), code=303)


def _about(survey_id, status=200, form=None, errors=None):
    db = get_db()
    survey = queries.get_survey(db, survey_id, current_user.id)
    show = Show.of(survey)
    members = people_queries.members_of(db, survey_id)
    here = {member.id for member in members}
    page = render_template(
        "surveys/about.html",
        survey=survey,
        show=show,
        members=members,
        others=[one for one in people_queries.people(db) if one.active and one.id not in here],
        history=queries.history_of(db, survey_id),
        names={one.id: one.name for one in people_queries.people(db)},
        form=form or typed_facts(survey, show),
        errors=errors or {},
        **OPTIONS,
    )
    return page, status


def typed_facts(survey, show):
    """Return the survey's facts as somebody would type them into its form."""
    words = ("name", "river", "purpose", "time_zone", "unit_system", "distance_rule", "criterion_basis", "sampling")
    return {
        **{name: getattr(survey, name) for name in (*words, "safety_note")},
        "outfall_mark": show.typed("plain", survey.outfall_mark),
        "elevation_m": show.typed("elevation", survey.elevation_m),
        "do_criterion_mg_l": show.typed("oxygen", survey.do_criterion_mg_l),
        "release_at": show.typed_time(survey.release_at),
    }
