"""The meters of a survey and the checks on them. Whoever asks has shown that they are on the survey."""

from sqlalchemy import func, select
from sqlalchemy.orm import joinedload, selectinload

from webapp.errors import NotFound
from webapp.models import History, Meter, MeterCheck, MeterCheckEvent, Person, Reading

_WITH = (
    joinedload(MeterCheck.meter),
    joinedload(MeterCheck.author),
    selectinload(MeterCheck.events).joinedload(MeterCheckEvent.made_by),
)


def meters_of(db, survey_id):
    """Return the meters of a survey by name."""
    return list(db.scalars(select(Meter).where(Meter.survey_id == survey_id).order_by(Meter.name, Meter.id)))


def checks_of(db, survey_id):
    """Return the checks of a survey in the order they were made."""
    query = select(MeterCheck).where(MeterCheck.survey_id == survey_id).options(*_WITH)
    return list(db.scalars(query.order_by(MeterCheck.checked_at, MeterCheck.id)))


def get_meter(db, survey_id, meter_id):
    """Return a meter of the survey. Raises NotFound."""
    meter = db.scalar(select(Meter).where(Meter.survey_id == survey_id, Meter.id == meter_id))
    if meter is None:
        raise NotFound("This survey has no such meter.")
    return meter


def get_check(db, survey_id, check_id):
    """Return a check of the survey. Raises NotFound."""
    check = find_check(db, check_id)
    if check is None or check.survey_id != survey_id:
        raise NotFound("This survey has no such meter check.")
    return check


def find_check(db, check_id):
    """Return the check of that id, of whatever survey, or None."""
    return db.scalar(select(MeterCheck).where(MeterCheck.id == check_id).options(*_WITH))


def last_check_by(db, survey_id, person_id):
    """Return the check that a person saved last on a survey, or None."""
    query = select(MeterCheck).where(MeterCheck.survey_id == survey_id, MeterCheck.author_id == person_id)
    return db.scalar(query.order_by(MeterCheck.received_at.desc(), MeterCheck.id).limit(1))


def surveys_with_meters(db, surveys):
    """Return (survey, how many meters it has) of those among surveys that have any."""
    ids = [one.id for one in surveys]
    query = select(Meter.survey_id, func.count()).where(Meter.survey_id.in_(ids)).group_by(Meter.survey_id)
    counts = dict(db.execute(query).all()) if ids else {}
    return [(one, counts[one.id]) for one in surveys if one.id in counts]


def changes_of(db, survey_id, meter_id):
    """Return the lines of the history about a meter with who made them, oldest first."""
    query = select(History, Person.name).outerjoin(Person, Person.id == History.person_id)
    query = query.where(History.survey_id == survey_id, History.entity == "meter", History.entity_id == meter_id)
    return db.execute(query.order_by(History.at, History.id)).all()


def latest_readings(db, survey_id, span):
    """Return the readings within a span of time before the last one, with what hangs on them, in time order."""
    last = db.scalar(select(func.max(Reading.taken_at)).where(Reading.survey_id == survey_id))
    if last is None:
        return []
    query = select(Reading).where(Reading.survey_id == survey_id, Reading.taken_at >= last - span)
    query = query.options(joinedload(Reading.station), selectinload(Reading.events))
    return list(db.scalars(query.order_by(Reading.taken_at, Reading.id)))


def names_read_with(db, survey_id):
    """Return every name of a meter that readings of a survey have."""
    query = select(Reading.meter).where(Reading.survey_id == survey_id, Reading.meter != "")
    return list(db.scalars(query.distinct().order_by(Reading.meter)))
