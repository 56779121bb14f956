"""Every table. Ids are UUIDs made by whoever makes the row, so that rows can move between servers unchanged."""

import uuid
from datetime import UTC, datetime

from sqlalchemy import JSON, Boolean, DateTime, Float, ForeignKey, Integer, MetaData, String, Text, TypeDecorator
from sqlalchemy import UniqueConstraint as Unique
from sqlalchemy.orm import DeclarativeBase, Mapped, mapped_column, relationship

NAMES = {
    "ix": "ix_%(column_0_label)s",
    "uq": "uq_%(table_name)s_%(column_0_name)s",
    "fk": "fk_%(table_name)s_%(column_0_name)s",
    "pk": "pk_%(table_name)s",
}


class UtcDateTime(TypeDecorator):
    """An instant: stored in UTC, always read back with its zone. SQLite would drop the offset in silence."""

    impl = DateTime
    cache_ok = True

    def process_bind_param(self, value, dialect):
        """Refuse a time without zone; store UTC."""
        if value is None:
            return None
        if value.tzinfo is None:
            raise ValueError("a stored time needs its zone")
        return value.astimezone(UTC).replace(tzinfo=None)

    def process_result_value(self, value, dialect):
        """Give the zone back."""
        return None if value is None else value.replace(tzinfo=UTC)


class Base(DeclarativeBase):
    """What every table shares."""

    metadata = MetaData(naming_convention=NAMES)


def new_id():
    """Return a new row id."""
    return str(uuid.uuid4())


def now():
    """Return the present instant, to the second below which no reader cares."""
    return datetime.now(UTC)


def _id():
    return mapped_column(String(36), primary_key=True, default=new_id)


def _to(target, **more):
    return mapped_column(String(36), ForeignKey(target), **more)


class Person(Base):
    """Somebody who signs in. session_key changes when all their sessions must end."""

    __tablename__ = "person"
    id: Mapped[str] = _id()
    name: Mapped[str] = mapped_column(String(100))
    sign_in: Mapped[str] = mapped_column(String(100), unique=True)
    password_hash: Mapped[str] = mapped_column(String(300))
    role: Mapped[str] = mapped_column(String(10))
    active: Mapped[bool] = mapped_column(Boolean, default=True)
    session_key: Mapped[str] = mapped_column(String(36), default=new_id)
    created_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)


class Survey(Base):
    """One survey of one river. Numbers are SI; outfall_mark is the outfall's river km or mile where those are shown."""

    __tablename__ = "survey"
    id: Mapped[str] = _id()
    name: Mapped[str] = mapped_column(String(120))
    river: Mapped[str] = mapped_column(String(120))
    purpose: Mapped[str] = mapped_column(Text, default="")
    time_zone: Mapped[str] = mapped_column(String(64))
    unit_system: Mapped[str] = mapped_column(String(2), default="si")
    distance_rule: Mapped[str] = mapped_column(String(12), default="downstream")
    outfall_mark: Mapped[float | None] = mapped_column(Float)
    elevation_m: Mapped[float] = mapped_column(Float, default=0.0)
    do_criterion_mg_l: Mapped[float | None] = mapped_column(Float)
    criterion_basis: Mapped[str] = mapped_column(String(200), default="")
    sampling: Mapped[str] = mapped_column(String(12), default="same_parcel")
    release_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    safety_note: Mapped[str] = mapped_column(Text, default="")
    created_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    created_by_id: Mapped[str] = _to("person.id")


class SurveyMember(Base):
    """Who is on a survey. Every query for a survey joins this table."""

    __tablename__ = "survey_member"
    survey_id: Mapped[str] = _to("survey.id", primary_key=True)
    person_id: Mapped[str] = _to("person.id", primary_key=True, index=True)


class SettingsVersion(Base):
    """One version of every threshold of a survey, by the keys of calc.settings; never changed, only followed."""

    __tablename__ = "settings_version"
    __table_args__ = (Unique("survey_id", "number"),)
    id: Mapped[str] = _id()
    survey_id: Mapped[str] = _to("survey.id")
    number: Mapped[int] = mapped_column(Integer)
    thresholds: Mapped[dict] = mapped_column(JSON)
    reason: Mapped[str] = mapped_column(Text, default="")
    made_by_id: Mapped[str] = _to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)


class PlanVersion(Base):
    """One version of a plan, never changed. tables holds the rows of each plan table in SI, as plan.tables defines."""

    __tablename__ = "plan_version"
    __table_args__ = (Unique("survey_id", "number"),)
    id: Mapped[str] = _id()
    survey_id: Mapped[str] = _to("survey.id")
    number: Mapped[int] = mapped_column(Integer)
    tables: Mapped[dict] = mapped_column(JSON)
    reason: Mapped[str] = mapped_column(Text, default="")
    made_by_id: Mapped[str] = _to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    made_by: Mapped[Person] = relationship()


class Station(Base):
    """The lasting identity of a station: its code within the survey. Where it is stands in the plan version."""

    __tablename__ = "station"
    __table_args__ = (Unique("survey_id", "code"),)
    id: Mapped[str] = _id()
    survey_id: Mapped[str] = _to("survey.id")
    code: Mapped[str] = mapped_column(String(20))


class Reading(Base):
    """One point of the water at one time, as it was recorded. Never changed: see ReadingEvent.

    The id is made by the phone. Numbers are SI; entered keeps each value and unit as they were typed. pressure_mmhg is
    the air pressure at the station that the saturation uses, whatever pressure_source it came from ("meter",
    "barometer", "weather", which is un-reduced, or "standard" where none was given).
    """

    __tablename__ = "reading"
    id: Mapped[str] = _id()
    survey_id: Mapped[str] = _to("survey.id", index=True)
    station_id: Mapped[str] = _to("station.id", index=True)
    plan_version_id: Mapped[str] = _to("plan_version.id")
    taken_at: Mapped[datetime] = mapped_column(UtcDateTime)
    received_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    author_id: Mapped[str] = _to("person.id")
    do_mg_l: Mapped[float | None] = mapped_column(Float)
    water_temp_c: Mapped[float | None] = mapped_column(Float)
    depth_m: Mapped[float | None] = mapped_column(Float)
    do_percent: Mapped[float | None] = mapped_column(Float)
    percent_basis: Mapped[str] = mapped_column(String(8), default="local")
    conductance_us_cm: Mapped[float | None] = mapped_column(Float)
    pressure_mmhg: Mapped[float | None] = mapped_column(Float)
    pressure_source: Mapped[str] = mapped_column(String(10), default="standard")
    position: Mapped[str] = mapped_column(String(10), default="")
    sensor_depth_m: Mapped[float | None] = mapped_column(Float)
    velocity_m_s: Mapped[float | None] = mapped_column(Float)
    velocity_method: Mapped[str] = mapped_column(String(10), default="")
    meter: Mapped[str] = mapped_column(String(60), default="")
    replicate: Mapped[bool] = mapped_column(Boolean, default=False)
    note: Mapped[str] = mapped_column(Text, default="")
    latitude: Mapped[float | None] = mapped_column(Float)
    longitude: Mapped[float | None] = mapped_column(Float)
    position_radius_m: Mapped[float | None] = mapped_column(Float)
    entered: Mapped[dict] = mapped_column(JSON, default=dict)
    kept_findings: Mapped[list] = mapped_column(JSON, default=list)
    station: Mapped[Station] = relationship()
    author: Mapped[Person] = relationship()
    events: Mapped[list["ReadingEvent"]] = relationship(order_by="ReadingEvent.made_at, ReadingEvent.id")


class ReadingEvent(Base):
    """What was decided about a reading afterwards: kind is "corrected", "set_aside" or "restored", always with why."""

    __tablename__ = "reading_event"
    id: Mapped[str] = _id()
    reading_id: Mapped[str] = _to("reading.id", index=True)
    kind: Mapped[str] = mapped_column(String(12))
    field: Mapped[str] = mapped_column(String(30), default="")
    old_value: Mapped[float | None] = mapped_column(Float)
    new_value: Mapped[float | None] = mapped_column(Float)
    reason: Mapped[str] = mapped_column(Text)
    made_by_id: Mapped[str] = _to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    made_by: Mapped[Person] = relationship()


class Decision(Base):
    """What somebody decided on site, why, and what was on the screen: screen holds its numbers (SI) and sentences.

    kind is "leave" for leaving the river, "station" for where to read next; chosen is what was chosen, in a word or by
    a station's code.
    """

    __tablename__ = "decision"
    id: Mapped[str] = _id()
    survey_id: Mapped[str] = _to("survey.id", index=True)
    plan_version_id: Mapped[str] = _to("plan_version.id")
    kind: Mapped[str] = mapped_column(String(12))
    chosen: Mapped[str] = mapped_column(String(100))
    reason: Mapped[str] = mapped_column(Text, default="")
    screen: Mapped[dict] = mapped_column(JSON, default=dict)
    made_by_id: Mapped[str] = _to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    made_by: Mapped[Person] = relationship()


class Seen(Base):
    """What of a survey's field sheet a person was shown last: against it a newer plan or release time is news."""

    __tablename__ = "seen"
    survey_id: Mapped[str] = _to("survey.id", primary_key=True)
    person_id: Mapped[str] = _to("person.id", primary_key=True)
    plan_number: Mapped[int] = mapped_column(Integer)
    release_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)


class Invitation(Base):
    """A link that signs one phone in as a person, once, for a survey. Only the hash of its token is kept."""

    __tablename__ = "invitation"
    id: Mapped[str] = _id()
    survey_id: Mapped[str] = _to("survey.id", index=True)
    person_id: Mapped[str] = _to("person.id")
    token_hash: Mapped[str] = mapped_column(String(64), unique=True)
    made_by_id: Mapped[str] = _to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    expires_at: Mapped[datetime] = mapped_column(UtcDateTime)
    used_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    withdrawn_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    person: Mapped[Person] = relationship(foreign_keys=[person_id])
    made_by: Mapped[Person] = relationship(foreign_keys=[made_by_id])
    survey: Mapped[Survey] = relationship()


class PhoneSession(Base):
    """A phone that an invitation signed in: for how long, and when it was ended before that.

    browser_hash knows the browser that used the invitation, which may ask again when the answer was lost on its way.
    """

    __tablename__ = "phone_session"
    id: Mapped[str] = _id()
    survey_id: Mapped[str] = _to("survey.id", index=True)
    person_id: Mapped[str] = _to("person.id")
    invitation_id: Mapped[str] = _to("invitation.id", unique=True)
    device: Mapped[str] = mapped_column(String(60), default="")
    browser_hash: Mapped[str] = mapped_column(String(64))
    started_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    until: Mapped[datetime] = mapped_column(UtcDateTime)
    ended_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    person: Mapped[Person] = relationship()


class History(Base):
    """Every change to a survey or a person, in the order it happened: who, when, what, and the particulars."""

    __tablename__ = "history"
    id: Mapped[str] = _id()
    survey_id: Mapped[str | None] = _to("survey.id", index=True)
    person_id: Mapped[str | None] = _to("person.id")
    at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    what: Mapped[str] = mapped_column(String(40))
    entity: Mapped[str] = mapped_column(String(40), default="")
    entity_id: Mapped[str] = mapped_column(String(36), default="")
    particulars: Mapped[dict] = mapped_column(JSON, default=dict)
