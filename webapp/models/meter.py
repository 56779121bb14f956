"""The meters of a survey and the checks on them."""

from datetime import datetime

from sqlalchemy import JSON, Boolean, Float, String, Text
from sqlalchemy.orm import Mapped, mapped_column, relationship

from webapp.models.base import Base, UtcDateTime, now, row_id, to
from webapp.models.survey import Person


class Meter(Base):
    """A meter or sensor of a survey. Its name never changes: readings and paper sheets know it by that.

    Two rows of one name, registered on two servers, are one meter.
    """

    __tablename__ = "meter"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    name: Mapped[str] = mapped_column(String(60))
    method: Mapped[str] = mapped_column(String(12), default="")
    maker: Mapped[str] = mapped_column(String(60), default="")
    model: Mapped[str] = mapped_column(String(60), default="")
    serial: Mapped[str] = mapped_column(String(60), default="")
    cap_changed_on: Mapped[str] = mapped_column(String(10), default="")
    serviced_on: Mapped[str] = mapped_column(String(10), default="")
    resolution_mg_l: Mapped[float | None] = mapped_column(Float)
    percent_basis: Mapped[str] = mapped_column(String(8), default="local")
    out_of_service: Mapped[bool] = mapped_column(Boolean, default=False)
    note: Mapped[str] = mapped_column(Text, default="")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)


class MeterCheck(Base):
    """One check of a meter against something known; never changed, see MeterCheckEvent. The phone makes the id.

    kind, parameter and standard are those of calc.quality_meter. value is what the meter showed, expected what it
    should have shown, both in the unit of the parameter; compared is the other value (titration, second meter,
    thermometer, standard solution) where the expected one is not computed. judged keeps what was said of it when it was
    saved, and by which settings version; what is shown is judged by today's settings.
    """

    __tablename__ = "meter_check"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    meter_id: Mapped[str] = to("meter.id", index=True)
    checked_at: Mapped[datetime] = mapped_column(UtcDateTime)
    received_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    author_id: Mapped[str] = to("person.id")
    kind: Mapped[str] = mapped_column(String(14))
    parameter: Mapped[str] = mapped_column(String(12), default="do")
    standard: Mapped[str] = mapped_column(String(30))
    value: Mapped[float] = mapped_column(Float)
    expected: Mapped[float | None] = mapped_column(Float)
    compared: Mapped[float | None] = mapped_column(Float)
    water_temp_c: Mapped[float | None] = mapped_column(Float)
    pressure_mmhg: Mapped[float | None] = mapped_column(Float)
    pressure_source: Mapped[str] = mapped_column(String(10), default="standard")
    conductance_us_cm: Mapped[float | None] = mapped_column(Float)
    place: Mapped[str] = mapped_column(String(60), default="")
    lot: Mapped[str] = mapped_column(String(60), default="")
    expires_on: Mapped[str] = mapped_column(String(10), default="")
    action: Mapped[str] = mapped_column(String(12), default="")
    note: Mapped[str] = mapped_column(Text, default="")
    entered: Mapped[dict] = mapped_column(JSON, default=dict)
    judged: Mapped[dict] = mapped_column(JSON, default=dict)
    meter: Mapped[Meter] = relationship()
    author: Mapped[Person] = relationship()
    events: Mapped[list["MeterCheckEvent"]] = relationship(order_by="MeterCheckEvent.made_at, MeterCheckEvent.id")


class MeterCheckEvent(Base):
    """A check set aside, or used again: kind is "set_aside" or "restored", always with why."""

    __tablename__ = "meter_check_event"
    id: Mapped[str] = row_id()
    check_id: Mapped[str] = to("meter_check.id", index=True)
    kind: Mapped[str] = mapped_column(String(12))
    reason: Mapped[str] = mapped_column(Text)
    made_by_id: Mapped[str] = to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    made_by: Mapped[Person] = relationship()
