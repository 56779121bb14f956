"""Invitations: made by lead or office, used once by one phone, which stays signed in for the survey and can be ended.

Whoever makes an invitation could use it, so nobody may invite to a role as strong as their own: leads invite crew, the
office invites crew and leads. Making one puts the person on the survey.
"""

import hashlib
import secrets
from datetime import UTC, datetime, time, timedelta
from zoneinfo import ZoneInfo

from sqlalchemy import update

from webapp.display import Show
from webapp.errors import Conflict, NotAllowed, NotFound, Refusal
from webapp.invitations import queries
from webapp.models import Invitation, PhoneSession, SurveyMember, new_id
from webapp.people.queries import get_person, members_of, people
from webapp.surveys.service import remember

MAY_INVITE = {"lead": ("crew",), "office": ("crew", "lead")}
AFTER_THE_SURVEY = timedelta(hours=48)
LONGEST = timedelta(days=7)
SAME_PHONE_AGAIN = timedelta(minutes=5)
DEVICES = (("iPhone", "iPhone"), ("iPad", "iPad"), ("Android", "Android"), ("Windows", "Windows"), ("Mac OS", "Mac"))


class InvitationOver(Refusal):
    """The invitation can't be used any more; phone is the PhoneSession that used it, where one did."""

    status, title = 410, "This invitation is over"

    def __init__(self, message, phone=None):
        super().__init__(message)
        self.phone = phone


def invitable(db, by_role):
    """Return the active people whom somebody of this role may invite, by name."""
    return [person for person in people(db) if person.active and person.role in MAY_INVITE.get(by_role, ())]


def invite(db, survey, person_id, by_id, by_role, minutes, now=None):
    """Store an invitation and return it with its token, which is kept nowhere else. An earlier unused one ends."""
    now = now or datetime.now(UTC)
    person = get_person(db, person_id)
    if person.role not in MAY_INVITE.get(by_role, ()):
        raise NotAllowed(f"You can't invite {person.name}: a lead invites crew, the office invites crew and leads.")
    if not person.active:
        raise Conflict(f"{person.name}'s account is closed. Open it first.")
    if person.id not in {member.id for member in members_of(db, survey.id)}:
        db.add(SurveyMember(survey_id=survey.id, person_id=person.id))
        remember(db, survey.id, by_id, "person added", "person", person.id)
    for earlier in queries.open_invitations(db, survey.id, now):
        if earlier.person_id == person.id:
            earlier.withdrawn_at = now
    token = secrets.token_urlsafe(24)
    invitation = Invitation(
        id=new_id(),
        survey_id=survey.id,
        person_id=person.id,
        token_hash=_hash(token),
        made_by_id=by_id,
        made_at=now,
        expires_at=now + timedelta(minutes=minutes),
    )
    db.add(invitation)
    remember(db, survey.id, by_id, "phone invited", "person", person.id, {"invitation": invitation.id})
    db.commit()
    return invitation, token


def withdraw(db, survey_id, invitation_id, by_id):
    """End an invitation that was not used."""
    invitation = queries.get_invitation(db, survey_id, invitation_id)
    if invitation.used_at is not None:
        raise Conflict("A phone has used this invitation; sign that phone out instead.")
    if invitation.withdrawn_at is None:
        invitation.withdrawn_at = datetime.now(UTC)
        remember(db, survey_id, by_id, "invitation withdrawn", "person", invitation.person_id)
    db.commit()


def look_at(db, token, now=None):
    """Return the invitation that the token opens, not using it. Raises NotFound or InvitationOver."""
    now = now or datetime.now(UTC)
    invitation = queries.find_by_hash(db, _hash(token))
    if invitation is None:
        raise NotFound("This invitation is not known here. Ask who invited you for a new one, and scan it whole.")
    again = f"Ask {invitation.made_by.name} for a new one."
    if invitation.used_at is not None:
        raise InvitationOver(_used(invitation, again), queries.phone_of(db, invitation.id))
    if invitation.withdrawn_at is not None:
        raise InvitationOver(f"It was withdrawn, perhaps because a newer one was made. {again}")
    if invitation.expires_at <= now:
        raise InvitationOver(f"It was good for a few minutes only, until {_clock(invitation, 'expires_at')}. {again}")
    members = {member.id for member in members_of(db, invitation.survey_id)}
    if not invitation.person.active or invitation.person_id not in members:
        raise InvitationOver(f"{invitation.person.name} is not on this survey any more. {again}")
    return invitation


def use(db, token, browser, user_agent, now=None):
    """Use the invitation for this phone and return its PhoneSession. Raises NotFound or InvitationOver.

    browser is a secret of the phone's browser: the same one may use it again for a few minutes, for a tap is easily
    doubled and an answer lost.
    """
    now = now or datetime.now(UTC)
    try:
        invitation = look_at(db, token, now)
    except InvitationOver as over:
        if _same_phone_again(over.phone, browser, now):
            return over.phone
        raise
    unused = (Invitation.id == invitation.id, Invitation.used_at.is_(None))
    if db.execute(update(Invitation).where(*unused).values(used_at=now)).rowcount != 1:
        db.rollback()
        raise InvitationOver(f"Another phone was quicker. Ask {invitation.made_by.name} for a new one.")
    phone = PhoneSession(
        id=new_id(),
        survey_id=invitation.survey_id,
        person_id=invitation.person_id,
        invitation_id=invitation.id,
        device=device_of(user_agent),
        browser_hash=_hash(browser),
        started_at=now,
        until=stays_until(invitation.survey, now),
    )
    db.add(phone)
    remember(db, phone.survey_id, phone.person_id, "phone signed in by invitation", "phone", phone.id)
    db.commit()
    return phone


def end_phone(db, survey_id, phone_id, by_id):
    """Sign a phone out; its next request finds that it is. What waits on it stays there."""
    phone = queries.get_phone(db, survey_id, phone_id)
    if phone.ended_at is None:
        phone.ended_at = datetime.now(UTC)
        remember(db, survey_id, by_id, "phone signed out", "phone", phone.id)
    db.commit()


def sign_out(db, phone_id):
    """End the session of a phone whose person signs out."""
    if (phone := queries.find_phone(db, phone_id)) is not None:
        end_phone(db, phone.survey_id, phone.id, phone.person_id)


def stays_until(survey, now):
    """Return when a phone that is signed in now must sign in again: the survey's day and 48 h, at most 7 days."""
    zone = ZoneInfo(survey.time_zone)
    day = max(now, survey.release_at or now).astimezone(zone).date() + timedelta(days=1)
    end_of_day = datetime.combine(day, time(), zone).astimezone(UTC)
    return min(end_of_day + AFTER_THE_SURVEY, now + LONGEST)


def device_of(user_agent):
    """Return what kind of device a browser says it runs on, in a word."""
    return next((name for mark, name in DEVICES if mark in (user_agent or "")), "another device")


def _same_phone_again(phone, browser, now):
    recent = phone is not None and phone.ended_at is None and now - phone.started_at < SAME_PHONE_AGAIN
    return recent and phone.browser_hash == _hash(browser)


def _hash(token):
    return hashlib.sha256(token.encode("utf-8", "surrogatepass")).hexdigest()


def _clock(invitation, field):
    return Show.of(invitation.survey).day_clock(getattr(invitation, field))


def _used(invitation, again):
    return (
        f"It was used on {_clock(invitation, 'used_at')}, and each works once. On another phone? {again} "
        f"If you don't know the phone that used it, tell {invitation.made_by.name}, who can sign it out."
    )
