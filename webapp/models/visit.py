"""A crew at a station, in the entries that tell of it."""

from datetime import datetime

from sqlalchemy import JSON, Text
from sqlalchemy.orm import Mapped, mapped_column, relationship

from webapp.models.base import Base, UtcDateTime, now, row_id, to
from webapp.models.survey import Person, Station


class Visit(Base):
    """One occupation of one station by one crew. What is known of it is the sum of its entries."""

    __tablename__ = "visit"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    station_id: Mapped[str] = to("station.id", index=True)
    opened_by_id: Mapped[str] = to("person.id")
    station: Mapped[Station] = relationship()
    opened_by: Mapped[Person] = relationship()
    entries: Mapped[list["VisitEntry"]] = relationship(order_by="VisitEntry.made_at, VisitEntry.id")


class VisitEntry(Base):
    """One save of a visit's form; never changed. The phone makes the id.

    facts holds what was said in SI, a key only where it was said; entered each number as it was typed. seen lists the
    entries that whoever saved it had on the screen: two entries that did not see each other and say different things
    about one fact leave it open until somebody's entry, which saw both, says which holds and why.
    """

    __tablename__ = "visit_entry"
    id: Mapped[str] = row_id()
    visit_id: Mapped[str] = to("visit.id", index=True)
    author_id: Mapped[str] = to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    received_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    seen: Mapped[list] = mapped_column(JSON, default=list)
    facts: Mapped[dict] = mapped_column(JSON, default=dict)
    entered: Mapped[dict] = mapped_column(JSON, default=dict)
    reason: Mapped[str] = mapped_column(Text, default="")
    author: Mapped[Person] = relationship()
