"""The key that signs sessions and forgery tokens: made at first start, kept beside the database for its owner only."""

import os
import secrets
from pathlib import Path

from webapp.config import BadSetting

FILE_NAME = "secret-key"
SHORTEST = 32


def read_or_make(data_dir):
    """Return the key in the data folder, making folder and key when they are not there yet."""
    folder = Path(data_dir)
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / FILE_NAME
    if not path.exists():
        _make(path)
    key = path.read_text(encoding="ascii").strip()
    if len(key) < SHORTEST:
        raise BadSetting(f"{path} holds no key. Delete it: the next start makes one, and everybody signs in again.")
    return key


def _make(path):
    """Put a new key in its place whole, or leave the one that another process was quicker to put there."""
    draft = path.with_name(f"{FILE_NAME}.{secrets.token_hex(4)}")
    with os.fdopen(os.open(draft, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o600), "w", encoding="ascii") as file:
        file.write(secrets.token_urlsafe(48))
        file.flush()
        os.fsync(file.fileno())
    try:
        os.link(draft, path)
    except FileExistsError:
        pass
    except OSError:  # a file system without links
        os.replace(draft, path)
    draft.unlink(missing_ok=True)
