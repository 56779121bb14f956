"""What was read of the water, and what was decided about it."""

from datetime import datetime

from sqlalchemy import JSON, Boolean, Float, String, Text
from sqlalchemy.orm import Mapped, mapped_column, relationship

from webapp.models.base import Base, UtcDateTime, now, row_id, to
from webapp.models.survey import Person, Station


class Reading(Base):
    """One point of the water at one time, as it was recorded. Never changed: see ReadingEvent.

    The id is made by the phone. Numbers are SI; entered keeps each value and unit as they were typed. pressure_mmhg is
    the air pressure at the station that the saturation uses, whatever pressure_source it came from ("meter",
    "barometer", "weather", which is un-reduced, or "standard" where none was given). meter is the name of a Meter of
    the survey, or what was written. series holds the several raw values as {"after_s", "do_mg_l", "water_temp_c"},
    after_s the seconds since the probe went in, each None where not known; do_mg_l is then their median.
    distance_left_m tells the vertical where left, centre and right do not.
    """

    __tablename__ = "reading"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    station_id: Mapped[str] = to("station.id", index=True)
    plan_version_id: Mapped[str] = to("plan_version.id")
    taken_at: Mapped[datetime] = mapped_column(UtcDateTime)
    received_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    author_id: Mapped[str] = to("person.id")
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
    ph: Mapped[float | None] = mapped_column(Float)
    series: Mapped[list] = mapped_column(JSON, default=list)
    soak_s: Mapped[float | None] = mapped_column(Float)
    stable: Mapped[bool | None] = mapped_column(Boolean)
    unstable_reason: Mapped[str] = mapped_column(Text, default="")
    distance_left_m: Mapped[float | None] = mapped_column(Float)
    entered: Mapped[dict] = mapped_column(JSON, default=dict)
    kept_findings: Mapped[list] = mapped_column(JSON, default=list)
    station: Mapped[Station] = relationship()
    author: Mapped[Person] = relationship()
    events: Mapped[list["ReadingEvent"]] = relationship(order_by="ReadingEvent.made_at, ReadingEvent.id")


class ReadingEvent(Base):
    """What was decided about a reading afterwards, always with why.

    kind is "corrected" (field from old_value to new_value), "set_aside", "restored", "kept" (a reviewer looked and
    found it good), "asked" (a question to the crew), "answered", "drift" or "drift_undone". A drift event holds in
    particulars the scale and shift of its line (final = scale * corrected + shift) and the checks it rests on.
    """

    __tablename__ = "reading_event"
    id: Mapped[str] = row_id()
    reading_id: Mapped[str] = to("reading.id", index=True)
    kind: Mapped[str] = mapped_column(String(12))
    field: Mapped[str] = mapped_column(String(30), default="")
    old_value: Mapped[float | None] = mapped_column(Float)
    new_value: Mapped[float | None] = mapped_column(Float)
    reason: Mapped[str] = mapped_column(Text)
    particulars: Mapped[dict] = mapped_column(JSON, default=dict)
    made_by_id: Mapped[str] = to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    made_by: Mapped[Person] = relationship()
