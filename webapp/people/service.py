"""Accounts: making them, signing in, ending their sessions."""

from functools import lru_cache

from werkzeug.security import check_password_hash, generate_password_hash

from webapp.errors import Conflict
from webapp.models import History, Person, new_id
from webapp.people import queries


@lru_cache(maxsize=1)
def _hash_of_nobody():
    return generate_password_hash(new_id())


def check_sign_in(db, sign_in, password):
    """Return the active person these belong to, or None. Takes as long for a name that does not exist."""
    person = queries.find_by_sign_in(db, sign_in)
    fits = check_password_hash(person.password_hash if person else _hash_of_nobody(), password)
    return person if person is not None and fits and person.active else None


def add_person(db, new, by_id=None):
    """Store an account and return it. Raises Conflict when the sign-in name is taken."""
    if queries.find_by_sign_in(db, new.sign_in) is not None:
        raise Conflict(f"The sign-in name {new.sign_in} is taken; choose another.")
    person = Person(
        id=new_id(),
        name=new.name,
        sign_in=new.sign_in,
        password_hash=generate_password_hash(new.password),
        role=new.role,
    )
    db.add(person)
    _remember(db, by_id or person.id, "account made", person, {"role": person.role})
    db.commit()
    return person


def change_password(db, person_id, password, by_id):
    """Set a new password and end every session of the person."""
    person = queries.get_person(db, person_id)
    person.password_hash = generate_password_hash(password)
    person.session_key = new_id()
    _remember(db, by_id, "password changed", person)
    db.commit()
    return person


def set_active(db, person_id, active, by_id):
    """Open or close an account; closing ends its sessions. Raises Conflict for the last office account."""
    person = queries.get_person(db, person_id)
    if not active and person.role == "office" and person.active and queries.active_offices(db) == 1:
        raise Conflict("This is the last office account. Make another one before you close it.")
    person.active = active
    person.session_key = new_id()
    _remember(db, by_id, "account opened" if active else "account closed", person)
    db.commit()
    return person


def _remember(db, by_id, what, person, particulars=None):
    db.flush()
    db.add(History(person_id=by_id, what=what, entity="person", entity_id=person.id, particulars=particulars or {}))
