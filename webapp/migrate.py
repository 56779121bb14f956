"""Brings a database to this version's tables: a copy of the file first, then every migration in one transaction."""

import sqlite3
from datetime import UTC, datetime
from pathlib import Path

from alembic import command
from alembic.config import Config as AlembicConfig
from alembic.migration import MigrationContext
from alembic.script import ScriptDirectory

from webapp.db import make_engine

MIGRATIONS = Path(__file__).resolve().parent / "migrations"


def upgrade(database_url, copies_dir=None):
    """Upgrade the database; return the path of the copy kept before it, or None where nothing had to change."""
    engine = make_engine(database_url)
    try:
        with engine.connect() as connection:
            current = MigrationContext.configure(connection).get_current_revision()
        script = ScriptDirectory(str(MIGRATIONS))
        if current == script.get_current_head():
            return None
        copy = _keep_copy(engine, current, copies_dir) if current else None
        _run(engine)
        return copy
    finally:
        engine.dispose()


def copy_sqlite(source_path, target_path):
    """Copy a SQLite database, also while it is in use."""
    source, target = sqlite3.connect(source_path), sqlite3.connect(target_path)
    try:
        source.backup(target)
    finally:
        source.close()
        target.close()


def _keep_copy(engine, revision, copies_dir):
    if engine.dialect.name != "sqlite":
        return None  # a database server has its own backups: see the README
    path = Path(engine.url.database)
    folder = Path(copies_dir or path.parent / "copies")
    folder.mkdir(parents=True, exist_ok=True)
    stamp = datetime.now(UTC).strftime("%Y%m%dT%H%M%SZ")
    copy = folder / f"{path.stem}-before-upgrade-from-{revision}-{stamp}{path.suffix}"
    copy_sqlite(path, copy)
    copy.chmod(0o600)
    return copy


def _run(engine):
    config = AlembicConfig()
    config.set_main_option("script_location", str(MIGRATIONS).replace("%", "%%"))
    sqlite = engine.dialect.name == "sqlite"
    with engine.connect().execution_options(bankside_writes=True) as connection:
        if sqlite:
            # Outside the transaction, or it has no effect; with the keys on, rebuilding a parent deletes its children.
            connection.connection.driver_connection.execute("PRAGMA foreign_keys=OFF")
        with connection.begin():
            config.attributes["connection"] = connection
            command.upgrade(config, "head")
            if sqlite and (broken := connection.exec_driver_sql("PRAGMA foreign_key_check").fetchall()):
                raise RuntimeError(f"the upgrade would leave rows without their parents: {broken[:3]}")
