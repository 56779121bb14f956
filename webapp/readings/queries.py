"""Readings of a survey. Whoever asks has shown by surveys.queries.get_survey that the person is on it."""

from collections import namedtuple

from sqlalchemy import func, select
from sqlalchemy.orm import joinedload, selectinload

from webapp.errors import NotFound
from webapp.models import MeterCheck, MeterCheckEvent, Person, Reading, ReadingEvent, Station, Visit, VisitEntry
from webapp.readings.layers import NUMBERS

_NAMED_AT_MOST = 500
_IN_ORDER = (Reading.taken_at, Reading.received_at, Reading.id)
_JUDGED_BY = (
    Reading.id,
    Reading.station_id,
    Reading.author_id,
    Reading.taken_at,
    Reading.received_at,
    *(getattr(Reading, name) for name in NUMBERS),
    Reading.pressure_source,
    Reading.position,
    Reading.meter,
    Reading.replicate,
    Reading.series,
    Reading.stable,
    Reading.kept_findings,
)
PlainReading = namedtuple("PlainReading", [*(column.key for column in _JUDGED_BY), "station", "author", "events"])


_Station, _Author = namedtuple("_Station", ["code"]), namedtuple("_Author", ["name"])
Mark = namedtuple("Mark", ["readings", "checks", "visits"])


def readings_of(db, survey_id):
    """Return the survey's readings with station, author and events, in the order they were taken."""
    query = _with_all(select(Reading).where(Reading.survey_id == survey_id))
    return db.scalars(query.order_by(Reading.taken_at, Reading.received_at, Reading.id)).all()


def plain_readings_of(db, survey_id, held=()):
    """Return what readings_of does as PlainReadings, which hold what readings are judged by, in a fifth of the time.

    They are for reading only, and stay readable whatever becomes of the session. held are those of the survey that
    were returned before. No reading is ever changed, nor a decision about it: so only what is new is loaded, and a
    reading about which nothing was decided since is the same object.
    """
    if not held:
        events = _events_of(db, survey_id)
        return [one._replace(events=events[one.id]) if one.id in events else one for one in _loaded(db, survey_id)]
    counts = _counted(db, survey_id)
    known = {one.id: one for one in held}
    if missing := [one for one in counts if one not in known]:
        known |= {one.id: one for one in _loaded(db, survey_id, missing)}
    if behind := [one for one, count in counts.items() if len(known[one].events) != count]:
        events = _events_of(db, survey_id, behind)
        known |= {one: known[one]._replace(events=events[one]) for one in behind}
    return [known[one] for one in counts]


def _loaded(db, survey_id, ids=None):
    """Return the PlainReadings of these ids, or of all, without what was decided about them."""
    query = select(*_JUDGED_BY, Station.code, Person.name).join(Reading.station).join(Reading.author)
    query = _of_these(query.where(Reading.survey_id == survey_id), ids)
    return [
        PlainReading(*rest, _Station(code), _Author(name), ())
        for *rest, code, name in db.execute(query.order_by(*_IN_ORDER))
    ]


def _counted(db, survey_id):
    """Return how many decisions there are about each reading, by its id, in the order they were taken."""
    query = select(Reading.id, func.count(ReadingEvent.id)).outerjoin(ReadingEvent)
    query = query.where(Reading.survey_id == survey_id).group_by(Reading.id).order_by(*_IN_ORDER)
    return {row[0]: row[1] for row in db.execute(query)}


def _events_of(db, survey_id, ids=None):
    """Return the decisions about each of these readings, or of all, by its id in the order they were made."""
    query = _of_these(select(ReadingEvent).join(Reading).where(Reading.survey_id == survey_id), ids)
    query = query.options(joinedload(ReadingEvent.made_by)).order_by(ReadingEvent.made_at, ReadingEvent.id)
    found = {}
    for event in db.scalars(query):
        found.setdefault(event.reading_id, []).append(event)
    return found


def _of_these(query, ids):
    """Return the query of a survey's readings for these alone, where they are few enough to be named."""
    return query if ids is None or len(ids) > _NAMED_AT_MOST else query.where(Reading.id.in_(ids))


def mark_of(db, survey_id):
    """Return how many rows there are of all that readings are judged by, a Mark. None is ever changed or taken away."""
    counted = (
        select(func.count()).where(Reading.survey_id == survey_id),
        select(func.count(ReadingEvent.id)).join(Reading).where(Reading.survey_id == survey_id),
        select(func.count()).where(MeterCheck.survey_id == survey_id),
        select(func.count(MeterCheckEvent.id)).join(MeterCheck).where(MeterCheck.survey_id == survey_id),
        select(func.count(VisitEntry.id)).join(Visit).where(Visit.survey_id == survey_id),
    )
    counts = tuple(db.execute(select(*(one.scalar_subquery() for one in counted))).one())
    return Mark(counts[:2], counts[2:4], counts[4:])


def find_reading(db, reading_id):
    """Return the reading with this id, of whatever survey, or None."""
    return db.scalar(_with_all(select(Reading).where(Reading.id == reading_id)))


def get_reading(db, survey_id, reading_id):
    """Return one reading of the survey. Raises NotFound."""
    reading = find_reading(db, reading_id)
    if reading is None or reading.survey_id != survey_id:
        raise NotFound("There is no such reading in this survey.")
    return reading


def get_station(db, survey_id, code):
    """Return the station of this code. Raises NotFound."""
    station = db.scalar(select(Station).where(Station.survey_id == survey_id, Station.code == code))
    if station is None:
        raise NotFound("There is no such station in this survey. Open the field sheet for those there are.")
    return station


def last_by(db, survey_id, person_id):
    """Return the reading a person recorded last on the survey, or None."""
    query = select(Reading).where(Reading.survey_id == survey_id, Reading.author_id == person_id)
    return db.scalar(query.order_by(Reading.received_at.desc()).limit(1))


def _with_all(query):
    return query.options(
        joinedload(Reading.station),
        joinedload(Reading.author),
        selectinload(Reading.events).joinedload(ReadingEvent.made_by),
    )
