"""People, a survey, its plan and settings in versions, what was decided, and its history."""

from datetime import datetime

from sqlalchemy import JSON, Boolean, Float, Integer, String, Text
from sqlalchemy import UniqueConstraint as Unique
from sqlalchemy.orm import Mapped, mapped_column, relationship

from webapp.models.base import Base, UtcDateTime, new_id, now, row_id, to


class Person(Base):
    """Somebody who signs in. session_key changes when all their sessions must end."""

    __tablename__ = "person"
    id: Mapped[str] = row_id()
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
    id: Mapped[str] = row_id()
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
    created_by_id: Mapped[str] = to("person.id")


class SurveyMember(Base):
    """Who is on a survey. Every query for a survey joins this table."""

    __tablename__ = "survey_member"
    survey_id: Mapped[str] = to("survey.id", primary_key=True)
    person_id: Mapped[str] = to("person.id", primary_key=True, index=True)


class SettingsVersion(Base):
    """One version of every threshold of a survey, by the keys of calc.settings; never changed, only followed."""

    __tablename__ = "settings_version"
    __table_args__ = (Unique("survey_id", "number"),)
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id")
    number: Mapped[int] = mapped_column(Integer)
    thresholds: Mapped[dict] = mapped_column(JSON)
    reason: Mapped[str] = mapped_column(Text, default="")
    made_by_id: Mapped[str] = to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)


class PlanVersion(Base):
    """One version of a plan, never changed. tables holds the rows of each plan table in SI, as plan.tables defines."""

    __tablename__ = "plan_version"
    __table_args__ = (Unique("survey_id", "number"),)
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id")
    number: Mapped[int] = mapped_column(Integer)
    tables: Mapped[dict] = mapped_column(JSON)
    reason: Mapped[str] = mapped_column(Text, default="")
    made_by_id: Mapped[str] = to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    made_by: Mapped[Person] = relationship()


class Station(Base):
    """The lasting identity of a station: its code within the survey. Where it is stands in the plan version."""

    __tablename__ = "station"
    __table_args__ = (Unique("survey_id", "code"),)
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id")
    code: Mapped[str] = mapped_column(String(20))


class Decision(Base):
    """What somebody decided on site, why, and what was on the screen: screen holds its numbers (SI) and sentences.

    kind is "leave" for leaving the river, "station" for where to read next; chosen is what was chosen, in a word or by
    a station's code.
    """

    __tablename__ = "decision"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    plan_version_id: Mapped[str] = to("plan_version.id")
    kind: Mapped[str] = mapped_column(String(12))
    chosen: Mapped[str] = mapped_column(String(100))
    reason: Mapped[str] = mapped_column(Text, default="")
    screen: Mapped[dict] = mapped_column(JSON, default=dict)
    made_by_id: Mapped[str] = to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    made_by: Mapped[Person] = relationship()


class Seen(Base):
    """What of a survey's field sheet a person was shown last: against it a newer plan or release time is news."""

    __tablename__ = "seen"
    survey_id: Mapped[str] = to("survey.id", primary_key=True)
    person_id: Mapped[str] = to("person.id", primary_key=True)
    plan_number: Mapped[int] = mapped_column(Integer)
    release_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)


class History(Base):
    """Every change to a survey or a person, in the order it happened: who, when, what, and the particulars."""

    __tablename__ = "history"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str | None] = to("survey.id", index=True)
    person_id: Mapped[str | None] = to("person.id")
    at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    what: Mapped[str] = mapped_column(String(40))
    entity: Mapped[str] = mapped_column(String(40), default="")
    entity_id: Mapped[str] = mapped_column(String(36), default="")
    particulars: Mapped[dict] = mapped_column(JSON, default=dict)
