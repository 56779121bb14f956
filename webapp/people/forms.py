"""Sign-in, new accounts and new passwords."""

import re
from dataclasses import dataclass

from webapp.forms import Fields
from webapp.people.access import ROLES

SHORTEST = 10
WELL_KNOWN = {"password", "passw0rd", "1234567890", "0123456789", "qwertyuiop", "abcdefghij", "letmeinplease"}
SIGN_IN = re.compile(r"[a-z0-9][a-z0-9._@+-]*")


@dataclass(frozen=True)
class NewPerson:
    """An account to be made."""

    name: str
    sign_in: str
    role: str
    password: str


def parse_person(source):
    """Return (NewPerson, {}) or (None, {field: message})."""
    fields = Fields(source)
    sign_in = _sign_in(fields)
    person = NewPerson(
        name=fields.text("name", "person's name", 100),
        sign_in=sign_in,
        role=fields.choice("role", "role", ROLES),
        password=_password(fields, source, sign_in),
    )
    return (None, fields.errors) if fields.errors else (person, {})


def parse_password(source, sign_in):
    """Return (password, {}) or (None, {field: message})."""
    fields = Fields(source)
    password = _password(fields, source, sign_in)
    return (None, fields.errors) if fields.errors else (password, {})


def _sign_in(fields):
    text = (fields.text("sign_in", "sign-in name", 100) or "").lower()
    if text and not SIGN_IN.fullmatch(text):
        return fields.refuse("sign_in", "Use letters a to z, digits and . _ @ + - only, for example d.marsh.")
    return text


def _password(fields, source, sign_in):
    password = str(source.get("password") or "")
    plain = password.lower().strip()
    if len(password) < SHORTEST:
        return fields.refuse("password", f"Use {SHORTEST} characters or more; a few words in a row are good.")
    if len(password) > 200:
        return fields.refuse("password", "Use 200 characters or fewer.")
    if plain in WELL_KNOWN or len(set(plain)) < 4 or (sign_in and plain.replace(sign_in, "") == ""):
        return fields.refuse("password", "That one is easy to guess. Use a few words in a row.")
    return password
