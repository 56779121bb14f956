"""Who is signed in, for how long, and what their role may do."""

from datetime import UTC, datetime, timedelta
from functools import wraps

from flask import request, session
from flask_login import LoginManager, current_user, login_user, logout_user

from webapp.db import get_db
from webapp.errors import NotAllowed, NotFound
from webapp.people import queries

ROLES = {"crew": "Crew", "lead": "Lead", "office": "Office"}
STAYS = {"crew": timedelta(days=7), "lead": timedelta(days=7), "office": timedelta(hours=12)}
MAY = {
    "log": {"crew", "lead", "office"},
    "plan": {"lead", "office"},
    "correct": {"lead", "office"},
    "export": {"office"},
    "manage": {"office"},
}

login_manager = LoginManager()
login_manager.login_view = "people.sign_in"
login_manager.login_message = "Sign in to go on."
login_manager.session_protection = None  # phones change address and browser build within a day


class SignedIn:
    """The person of this request, as Flask-Login wants it."""

    is_authenticated = True
    is_active = True
    is_anonymous = False

    def __init__(self, person, phone_id=None, survey_id=None):
        self.id, self.name, self.role = person.id, person.name, person.role
        self.phone_id, self.survey_id = phone_id, survey_id  # of a phone that an invitation signed in, else None
        self.session_key = person.session_key

    def get_id(self):
        """Return what the session keeps: the person and the key that ends when their sessions must."""
        return f"{self.id}:{self.session_key}"

    def may(self, deed):
        """Return whether the role does this."""
        return self.role in MAY[deed]


@login_manager.user_loader
def load(session_id):
    """Return the signed-in person, or None where the session ended or was ended."""
    person_id, _, key = session_id.partition(":")
    until, phone_id, now = session.get("until"), session.get("phone"), datetime.now(UTC)
    if not isinstance(until, (int, float)) or now.timestamp() > until:
        return None
    person = queries.find_person(get_db(), person_id)
    if person is None or not person.active or person.session_key != key:
        return None
    if phone_id is None:
        return SignedIn(person)
    survey_id = queries.find_survey_of_phone(get_db(), phone_id, person.id, now)
    return None if survey_id is None else SignedIn(person, phone_id, survey_id)


def keep_to_its_survey():
    """Refuse an invited phone every survey but its own: whoever made the link may be on that one alone."""
    asked = (request.view_args or {}).get("survey_id")
    its_own = getattr(current_user, "survey_id", None) if asked is not None else None
    if its_own is not None and asked != its_own:
        raise NotFound("This phone was invited to another survey. Sign in with your password to reach this one.")


def start_session(person):
    """Sign the person in, in a fresh session."""
    session.clear()
    session.permanent = True
    session["until"] = (datetime.now(UTC) + STAYS[person.role]).timestamp()
    login_user(SignedIn(person))


def start_phone_session(person, phone):
    """Sign the person in on a phone that used an invitation; its PhoneSession is asked at every request."""
    start_session(person)
    session["until"], session["phone"] = phone.until.timestamp(), phone.id


def end_session():
    """Sign out."""
    logout_user()
    session.clear()


def needs(deed):
    """Let a view run only for a signed-in person whose role does the deed."""

    def decorate(view):
        @wraps(view)
        def guarded(*args, **kwargs):
            if not current_user.is_authenticated:
                return login_manager.unauthorized()
            if not current_user.may(deed):
                raise NotAllowed(f"This page is for {' and '.join(sorted(ROLES[role].lower() for role in MAY[deed]))}.")
            return view(*args, **kwargs)

        return guarded

    return decorate
