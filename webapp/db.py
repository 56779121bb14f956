"""The engine, and one session per request.

SQLite runs in WAL mode with synchronous FULL and foreign keys on. A request that may write begins IMMEDIATE, behind
one lock in this process: SQLite's own busy back-off is unfair and costs a tenth of a second at ten writers. After its
commit the same session only reads, so the lock is held no longer than the write.
"""

import threading

from flask import current_app, g, request
from sqlalchemy import create_engine, event
from sqlalchemy.orm import Session

READING_METHODS = {"GET", "HEAD", "OPTIONS"}


def make_engine(database_url, pool_size=8):
    """Return an engine for the URL; for SQLite with Bankside's durability settings on every connection."""
    if not database_url.startswith("sqlite"):
        return create_engine(database_url, pool_size=pool_size, pool_pre_ping=True)
    engine = create_engine(database_url, pool_size=pool_size, max_overflow=8)
    event.listen(engine, "connect", _prepare_sqlite)
    event.listen(engine, "begin", _begin_sqlite)
    return engine


def _prepare_sqlite(connection, _record):
    connection.isolation_level = None  # Python's driver must not issue BEGIN itself: half a migration would stay
    for pragma in ("journal_mode=WAL", "synchronous=FULL", "foreign_keys=ON", "busy_timeout=10000"):
        connection.execute(f"PRAGMA {pragma}")


def _begin_sqlite(connection):
    writes = connection.get_execution_options().get("bankside_writes")
    connection.exec_driver_sql("BEGIN IMMEDIATE" if writes else "BEGIN")


class Database:
    """An engine, and for SQLite the lock that lines up this process's writers."""

    def __init__(self, engine):
        self.engine = engine
        self.lock = threading.Lock() if engine.dialect.name == "sqlite" else None

    def reading(self):
        """Return a session that only reads."""
        return Session(self.engine, expire_on_commit=False)

    def writing(self):
        """Return a session that may write; wait for the writer before it."""
        return WritingSession(self)


class WritingSession(Session):
    """A session that holds the write lock until its commit or rollback, and only reads from then on."""

    def __init__(self, database):
        self._lock = database.lock
        self._reading_engine = database.engine
        if self._lock is not None:
            self._lock.acquire()
        super().__init__(database.engine.execution_options(bankside_writes=True), expire_on_commit=False)

    def commit(self):
        """Commit, then let the next writer go."""
        super().commit()
        self._stop_writing()

    def rollback(self):
        """Roll back, then let the next writer go."""
        super().rollback()
        self._stop_writing()

    def close(self):
        """Close, giving up what was not committed."""
        super().close()
        self._stop_writing()

    def _stop_writing(self):
        if self._lock is not None:
            self._lock.release()
            self._lock = None
            self.bind = self._reading_engine


def reads_only(view):
    """Mark a POST view that writes nothing, such as a preview: it needs no place in the writers' line."""
    view.reads_only = True
    return view


def get_db():
    """Return this request's session."""
    if "db" not in g:
        view = current_app.view_functions.get(request.endpoint)
        only_reads = request.method in READING_METHODS or getattr(view, "reads_only", False)
        database = current_app.extensions["bankside_database"]
        g.db = database.reading() if only_reads else database.writing()
    return g.db


def write_aside():
    """Return a session of its own for the little that a GET may write; close it with a with statement."""
    return current_app.extensions["bankside_database"].writing()


def close_db(_error=None):
    """Close this request's session, if it had one."""
    if (db := g.pop("db", None)) is not None:
        db.close()
