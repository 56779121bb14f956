"""Who signs in, and the phones that an invitation signed in."""

from datetime import datetime

from sqlalchemy import String
from sqlalchemy.orm import Mapped, mapped_column, relationship

from webapp.models.base import Base, UtcDateTime, now, row_id, to
from webapp.models.survey import Person, Survey


class Invitation(Base):
    """A link that signs one phone in as a person, once, for a survey. Only the hash of its token is kept."""

    __tablename__ = "invitation"
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    person_id: Mapped[str] = to("person.id")
    token_hash: Mapped[str] = mapped_column(String(64), unique=True)
    made_by_id: Mapped[str] = to("person.id")
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
    id: Mapped[str] = row_id()
    survey_id: Mapped[str] = to("survey.id", index=True)
    person_id: Mapped[str] = to("person.id")
    invitation_id: Mapped[str] = to("invitation.id", unique=True)
    device: Mapped[str] = mapped_column(String(60), default="")
    browser_hash: Mapped[str] = mapped_column(String(64))
    started_at: Mapped[datetime] = mapped_column(UtcDateTime, default=now)
    until: Mapped[datetime] = mapped_column(UtcDateTime)
    ended_at: Mapped[datetime | None] = mapped_column(UtcDateTime)
    person: Mapped[Person] = relationship()
