"""Copies a Bankside that may be running into a folder that is a data folder itself: serve from it, or put it back."""

import os
import shutil
import sqlite3
import tempfile
from dataclasses import dataclass
from pathlib import Path

from webapp.migrate import copy_sqlite

DATABASE_NAME = "bankside.sqlite3"
# Copies kept before upgrades are copies already.
_NOT_COPIED = {"copies"}


class NoBackup(Exception):
    """There is no backup, and nothing was left behind; the message says why and what to do."""


@dataclass(frozen=True)
class Backup:
    """A finished backup: where it is, how large its database is, and how many readings that holds."""

    folder: Path
    size_mb: float
    readings: int


def backup(config, target):
    """Copy database, secret key and whatever else the data folder holds to the new folder target; return the Backup.

    The copy is one moment of the database: it holds every save that was acknowledged before the call. It is made
    beside target and named so only when it is whole, checked and on the disk. Raises NoBackup.
    """
    target = Path(target).expanduser().absolute()
    _refuse(config, target)
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        unfinished = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.parent))  # for its owner only
    except OSError as trouble:
        raise NoBackup(f"Could not write to {target.parent}: {trouble}.") from trouble
    try:
        readings = _copy_database(config.sqlite_path, unfinished / DATABASE_NAME)
        _copy_the_rest(config, unfinished)
        _onto_the_disk(unfinished)
        _refuse(config, target)
        unfinished.rename(target)
        _sync(target.parent)
    except (OSError, sqlite3.Error) as trouble:
        raise NoBackup(f"The copy could not be made: {trouble}.") from trouble
    finally:
        shutil.rmtree(unfinished, ignore_errors=True)
    return Backup(target, (target / DATABASE_NAME).stat().st_size / 1e6, readings)


def _refuse(config, target):
    if config.sqlite_path is None:
        raise NoBackup(
            "This Bankside keeps its data in PostgreSQL. Back that up with the server's own tools, for example "
            "pg_dump, and keep a copy of the data folder beside it."
        )
    if not config.sqlite_path.is_file():
        raise NoBackup(f"There is no database at {config.sqlite_path}. Say where it is with --data.")
    if target.exists() or target.is_symlink():
        raise NoBackup(f"{target} is there already; a backup never replaces anything. Choose another name.")
    if config.data_dir.absolute() in target.parents:
        raise NoBackup(f"{target} lies in the data folder itself. Choose a place outside, best on another disk.")


def _copy_database(source, copy):
    """Copy the database in one read transaction, check the copy, and return how many readings it holds."""
    copy.touch(mode=0o600)
    copy_sqlite(source, copy)
    connection = sqlite3.connect(copy)
    try:
        found = connection.execute("PRAGMA integrity_check").fetchall()
        orphans = connection.execute("PRAGMA foreign_key_check").fetchall()
        if found != [("ok",)] or orphans:
            raise NoBackup(f"The copy is not sound ({(found + orphans)[0]}). Check the disk, then try again.")
        return connection.execute("SELECT count(*) FROM reading").fetchone()[0]
    finally:
        connection.close()


def _copy_the_rest(config, unfinished):
    databases = {config.sqlite_path.name, DATABASE_NAME}  # with their journals, which belong to no copy
    own = _NOT_COPIED | {name + end for name in databases for end in ("", "-wal", "-shm", "-journal")}
    for path in sorted(config.data_dir.iterdir()) if config.data_dir.is_dir() else ():
        if path.name in own:
            continue
        if path.is_dir():
            shutil.copytree(path, unfinished / path.name)
        elif path.is_file():
            shutil.copyfile(path, unfinished / path.name)


def _onto_the_disk(folder):
    for path in (folder, *folder.rglob("*")):
        path.chmod(0o700 if path.is_dir() else 0o600)
        _sync(path)


def _sync(path):
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
