"""What the field sheet asks often: has anything changed, and what was this person shown."""

from sqlalchemy import func, select

from webapp.models import Person, PlanVersion, Reading, ReadingEvent, Seen, Visit, VisitEntry


def counts_of(db, survey_id):
    """Return (number of the newest plan version, readings, decisions about them, entries of visits), in one query."""
    newest = select(func.max(PlanVersion.number)).where(PlanVersion.survey_id == survey_id)
    readings = select(func.count(Reading.id)).where(Reading.survey_id == survey_id)
    events = select(func.count(ReadingEvent.id)).join(Reading).where(Reading.survey_id == survey_id)
    entries = select(func.count(VisitEntry.id)).join(Visit).where(Visit.survey_id == survey_id)
    counts = (one.scalar_subquery() for one in (newest, readings, events, entries))
    number, *others = db.execute(select(*counts)).one()
    return (number or 0, *others)


def find_seen(db, survey_id, person_id):
    """Return what of the field sheet a person was shown last, or None."""
    return db.get(Seen, (survey_id, person_id))


def reasons_since(db, survey_id, number):
    """Return (name of who made it, reason) of every plan version after a number that has a reason, oldest first."""
    query = select(Person.name, PlanVersion.reason).join(Person, PlanVersion.made_by_id == Person.id)
    query = query.where(PlanVersion.survey_id == survey_id, PlanVersion.number > number, PlanVersion.reason != "")
    return db.execute(query.order_by(PlanVersion.number)).all()
