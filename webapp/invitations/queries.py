"""Invitations, and the phones they signed in."""

from sqlalchemy import select
from sqlalchemy.orm import joinedload

from webapp.errors import NotFound
from webapp.models import Invitation, PhoneSession


def find_by_hash(db, token_hash):
    """Return the invitation with its person, maker and survey, or None."""
    whole = (joinedload(Invitation.person), joinedload(Invitation.made_by), joinedload(Invitation.survey))
    return db.scalar(select(Invitation).where(Invitation.token_hash == token_hash).options(*whole))


def get_invitation(db, survey_id, invitation_id):
    """Return an invitation of the survey. Raises NotFound."""
    query = select(Invitation).where(Invitation.survey_id == survey_id, Invitation.id == invitation_id)
    if (invitation := db.scalar(query)) is None:
        raise NotFound("There is no such invitation.")
    return invitation


def open_invitations(db, survey_id, now):
    """Return the survey's invitations that can still be used, newest first."""
    query = select(Invitation).where(
        Invitation.survey_id == survey_id,
        Invitation.used_at.is_(None),
        Invitation.withdrawn_at.is_(None),
        Invitation.expires_at > now,
    )
    query = query.options(joinedload(Invitation.person), joinedload(Invitation.made_by))
    return db.scalars(query.order_by(Invitation.made_at.desc())).all()


def get_phone(db, survey_id, phone_id):
    """Return a phone that an invitation to the survey signed in. Raises NotFound."""
    query = select(PhoneSession).where(PhoneSession.survey_id == survey_id, PhoneSession.id == phone_id)
    if (phone := db.scalar(query)) is None:
        raise NotFound("There is no such phone.")
    return phone


def find_phone(db, phone_id):
    """Return a signed-in phone or None."""
    return db.get(PhoneSession, phone_id)


def phone_of(db, invitation_id):
    """Return the phone that an invitation signed in, or None."""
    return db.scalar(select(PhoneSession).where(PhoneSession.invitation_id == invitation_id))


def phones_of(db, survey_id):
    """Return the phones that invitations to the survey signed in, newest first."""
    query = select(PhoneSession).where(PhoneSession.survey_id == survey_id).options(joinedload(PhoneSession.person))
    return db.scalars(query.order_by(PhoneSession.started_at.desc())).all()
