"""Which state of a survey was reviewed, approved and opened again."""

from datetime import datetime

from sqlalchemy import LargeBinary, String, Text
from sqlalchemy.orm import Mapped, mapped_column, relationship

from webapp.models.base import Base, UtcDateTime, now, row_id, to
from webapp.models.survey import Person


class SurveyEvent(Base):
    """A survey reviewed, approved, or opened again: kind is "reviewed", "approved" or "reopened", always with why.

    While the last one is "approved" nothing of the survey changes. version is the name of the dataset it was about.
    """

    __tablename__ = "survey_event"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    kind: Mapped[str] = mapped_column(String(12))
    version: Mapped[str] = mapped_column(String(60))
    reason: Mapped[str] = mapped_column(Text, default="")
    made_by_id: Mapped[str] = to("person.id")
    made_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    made_by: Mapped[Person] = relationship()


class FrozenDataset(Base):
    """The bytes of an approved dataset, as they were delivered."""

    __tablename__ = "frozen_dataset"
    event_id: Mapped[str] = to("survey_event.id", primary_key=True)
    file_name: Mapped[str] = mapped_column(String(120))
    sha256: Mapped[str] = mapped_column(String(64))
    content: Mapped[bytes] = mapped_column(LargeBinary)
