"""Plan versions and stations of a survey. Whoever asks has shown by surveys.queries.get_survey that they are on it."""

from sqlalchemy import select
from sqlalchemy.orm import joinedload

from webapp.errors import NotFound
from webapp.models import PlanVersion, Reading, Station


def current_plan(db, survey_id):
    """Return the newest PlanVersion of the survey, or None where there is none yet."""
    query = select(PlanVersion).where(PlanVersion.survey_id == survey_id)
    return db.scalar(query.order_by(PlanVersion.number.desc()).limit(1))


def plan_versions(db, survey_id):
    """Return the survey's plan versions with who made them, newest first."""
    query = select(PlanVersion).where(PlanVersion.survey_id == survey_id).options(joinedload(PlanVersion.made_by))
    return db.scalars(query.order_by(PlanVersion.number.desc())).all()


def get_version(db, survey_id, number):
    """Return one version of the survey's plan. Raises NotFound."""
    query = select(PlanVersion).where(PlanVersion.survey_id == survey_id, PlanVersion.number == number)
    if (version := db.scalar(query.options(joinedload(PlanVersion.made_by)))) is None:
        raise NotFound("This survey has no plan version of that number.")
    return version


def stations_of(db, survey_id):
    """Return every station the survey ever had, by its code."""
    stations = db.scalars(select(Station).where(Station.survey_id == survey_id).order_by(Station.code))
    return {station.code: station for station in stations}


def codes_with_readings(db, survey_id):
    """Return the codes of the stations at which the survey holds readings."""
    query = select(Station.code).join(Reading, Reading.station_id == Station.id).where(Station.survey_id == survey_id)
    return set(db.scalars(query.distinct()))
