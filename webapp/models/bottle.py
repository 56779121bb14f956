"""Bottles of water, their way to the laboratory and what it found."""

from datetime import datetime

from sqlalchemy import JSON, Boolean, Float, String, Text
from sqlalchemy.orm import Mapped, mapped_column, relationship

from webapp.models.base import Base, UtcDateTime, now, row_id, to
from webapp.models.survey import Person, Station


class Bottle(Base):
    """One bottle filled at a station; never changed. code is on its label, once in a survey. The phone makes the id."""

    __tablename__ = "bottle"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    station_id: Mapped[str] = to("station.id", index=True)
    code: Mapped[str] = mapped_column(String(40))
    analysis: Mapped[str] = mapped_column(String(16))
    kind: Mapped[str] = mapped_column(String(10), default="sample")
    replicate_of: Mapped[str] = mapped_column(String(40), default="")
    collected_at: Mapped[datetime] = mapped_column(UtcDateTime)
    received_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    author_id: Mapped[str] = to("person.id")
    sample_depth_m: Mapped[float | None] = mapped_column(Float)
    position: Mapped[str] = mapped_column(String(10), default="")
    volume_ml: Mapped[float | None] = mapped_column(Float)
    preservative: Mapped[str] = mapped_column(String(60), default="")
    full: Mapped[bool | None] = mapped_column(Boolean)
    filtered: Mapped[bool] = mapped_column(Boolean, default=False)
    on_ice_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    note: Mapped[str] = mapped_column(Text, default="")
    entered: Mapped[dict] = mapped_column(JSON, default=dict)
    station: Mapped[Station] = relationship()
    author: Mapped[Person] = relationship()


class HandOver(Base):
    """Bottles passed from one keeper to the next; bottles lists their ids. Never changed."""

    __tablename__ = "hand_over"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    bottles: Mapped[list] = mapped_column(JSON, default=list)
    gave: Mapped[str] = mapped_column(String(100))
    took: Mapped[str] = mapped_column(String(100))
    at: Mapped[datetime] = mapped_column(UtcDateTime)
    place: Mapped[str] = mapped_column(String(100), default="")
    temperature_c: Mapped[float | None] = mapped_column(Float)
    seal: Mapped[str] = mapped_column(String(60), default="")
    note: Mapped[str] = mapped_column(Text, default="")
    author_id: Mapped[str] = to("person.id")
    author: Mapped[Person] = relationship()


class LabResult(Base):
    """What a laboratory found in a bottle; the latest of a bottle holds, the earlier ones stay.

    censor is "none", "less_than" or "greater_than"; then value is empty and limit_value says of what. quality holds the
    run's own checks where told: blank_mg_l, gga_mg_l, depletion_mg_l, residual_mg_l, incubation_c.
    """

    __tablename__ = "lab_result"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    bottle_id: Mapped[str] = to("bottle.id", index=True)
    laboratory: Mapped[str] = mapped_column(String(100), default="")
    lab_number: Mapped[str] = mapped_column(String(40), default="")
    method: Mapped[str] = mapped_column(String(60), default="")
    arrived_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    arrival_temp_c: Mapped[float | None] = mapped_column(Float)
    started_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    finished_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    censor: Mapped[str] = mapped_column(String(12), default="none")
    value: Mapped[float | None] = mapped_column(Float)
    limit_value: Mapped[float | None] = mapped_column(Float)
    quality: Mapped[dict] = mapped_column(JSON, default=dict)
    analyst: Mapped[str] = mapped_column(String(100), default="")
    note: Mapped[str] = mapped_column(Text, default="")
    entered: Mapped[dict] = mapped_column(JSON, default=dict)
    author_id: Mapped[str] = to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    author: Mapped[Person] = relationship()
    bottle: Mapped[Bottle] = relationship()
