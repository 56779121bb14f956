"""The key that signs sessions and forgery tokens: made at first start, kept beside the database for its owner only."""

import os
import secrets
from pathlib import Path

FILE_NAME = "secret-key"


def read_or_make(data_dir):
    """Return the key in the data folder, making folder and key when they are not there yet."""
    folder = Path(data_dir)
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / FILE_NAME
    try:
        handle = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o600)
    except FileExistsError:
        return path.read_text(encoding="ascii").strip()
    with os.fdopen(handle, "w", encoding="ascii") as file:
        file.write(secrets.token_urlsafe(48))
    return path.read_text(encoding="ascii").strip()
