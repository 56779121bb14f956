"""Every setting, its default and the environment name it is read from. A bad value stops the start with a reason."""

import os
from dataclasses import dataclass
from pathlib import Path

HERE = Path(__file__).resolve().parent
SHIPPED = HERE / "shipped" if (HERE / "shipped").is_dir() else HERE.parent  # an installed copy, or a checkout


class BadSetting(ValueError):
    """A setting that Bankside can't start with; the message says what to write instead."""


@dataclass(frozen=True)
class Config:
    """What one running Bankside is told.

    BANKSIDE_DATA: folder of the database file, its copies and the secret key (default: bankside-data in this folder).
    BANKSIDE_DATABASE_URL: another database, for example postgresql+psycopg://name@host/bankside (default: a SQLite
    file in the data folder). BANKSIDE_HOST, BANKSIDE_PORT: where to listen (all addresses, 8080).
    BANKSIDE_THREADS: requests served at once (4). BANKSIDE_PROXIES: trusted proxies in front (0).
    BANKSIDE_SECURE_COOKIES: yes when phones reach it by HTTPS (no). BANKSIDE_INVITATION_MINUTES: how long an invitation
    can be used (15).
    """

    data_dir: Path
    database_url: str
    host: str = "0.0.0.0"
    port: int = 8080
    threads: int = 4
    proxies: int = 0
    secure_cookies: bool = False
    invitation_minutes: int = 15

    @property
    def sqlite_path(self):
        """The database file, or None where the database is a server."""
        prefix = "sqlite:///"
        return Path(self.database_url[len(prefix) :]) if self.database_url.startswith(prefix) else None


def read_config(environ=None, **overrides):
    """Return the Config of the environment; overrides that are not None win. Raises BadSetting."""
    env = os.environ if environ is None else environ
    given = {name: value for name, value in overrides.items() if value is not None}
    data_dir = Path(given.pop("data_dir", None) or env.get("BANKSIDE_DATA") or "bankside-data").expanduser().resolve()
    default_url = f"sqlite:///{data_dir / 'bankside.sqlite3'}"
    values = {
        "database_url": _database_url(env.get("BANKSIDE_DATABASE_URL") or default_url),
        "host": env.get("BANKSIDE_HOST") or "0.0.0.0",
        "port": _whole(env, "BANKSIDE_PORT", 8080, 1, 65535),
        "threads": _whole(env, "BANKSIDE_THREADS", 4, 1, 64),
        "proxies": _whole(env, "BANKSIDE_PROXIES", 0, 0, 5),
        "secure_cookies": _yes_no(env, "BANKSIDE_SECURE_COOKIES", False),
        "invitation_minutes": _whole(env, "BANKSIDE_INVITATION_MINUTES", 15, 1, 1440),
    }
    return Config(data_dir=data_dir, **{**values, **given})


def _database_url(url):
    if not url.startswith(("sqlite:///", "postgresql+psycopg://")):
        raise BadSetting("BANKSIDE_DATABASE_URL must begin with sqlite:/// or postgresql+psycopg://")
    return url


def _whole(env, name, default, low, high):
    text = env.get(name, "").strip()
    if not text:
        return default
    if not text.isascii() or not text.isdigit() or not low <= int(text) <= high:
        raise BadSetting(f"{name} must be a whole number from {low} to {high}, not {text!r}")
    return int(text)


def _yes_no(env, name, default):
    text = env.get(name, "").strip().lower()
    if not text:
        return default
    if text not in {"yes", "no"}:
        raise BadSetting(f"{name} must be yes or no, not {text!r}")
    return text == "yes"
