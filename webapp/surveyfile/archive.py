"""The file itself: a zip of one JSON Lines file a table, a manifest and checksums. It is unpacked in memory only."""

import hashlib
import io
import json
import struct
import zipfile
import zlib

from webapp.dataset.package import checksums, zipped
from webapp.heldfile import LARGEST
from webapp.surveyfile.tables import CARRIED

FORMAT = "Bankside survey file"
VERSION = 1
MANIFEST = "survey-file.json"
CHECKSUMS = "checksums.txt"
LARGEST_UNPACKED = 50_000_000
MOST_ROWS = 200_000
_NEWER = "Update Bankside on this server, then import the file again."


class BadSurveyFile(Exception):
    """This is no survey file that can be imported; the message says why, and what to do."""


def pack(about, tables):
    """Return the file's bytes; tables holds the lines of each table as bytes. The same survey gives the same bytes."""
    manifest = {"format": FORMAT, "version": VERSION, **about}
    files = {f"{name}.jsonl": content for name, content in tables.items()}
    files[MANIFEST] = (json.dumps(manifest, ensure_ascii=False, indent=2, sort_keys=True) + "\n").encode("utf-8")
    files[CHECKSUMS] = checksums(files)
    return zipped(files)


def unpack(content):
    """Return (manifest, lines of each table as bytes) of a file that is whole. Raises BadSurveyFile."""
    if len(content) <= LARGEST and not content.startswith(b"PK"):
        raise BadSurveyFile("This is no survey file. Choose one that Bankside made: its name ends with .bankside.")
    files = files_of(content, len(CARRIED) + 20, "survey file")
    manifest = _manifest(files)
    _check_sums(files)
    _check_names(files)
    return manifest, {name: files[f"{name}.jsonl"] for name in CARRIED}


def files_of(content, most, what):
    """Return {name: bytes} of a zip of at most so many files; what says what it should be. Raises BadSurveyFile."""
    if len(content) > LARGEST:
        raise BadSurveyFile(f"The file has {len(content) / 1e6:.1f} MB; Bankside takes up to {LARGEST / 1e6:.1f} MB.")
    try:
        return _files(content, most, what)
    except (zipfile.BadZipFile, zlib.error, EOFError, OSError, struct.error, ValueError) as broken:
        raise BadSurveyFile("The file is damaged or cut short. Copy it once more from where it was made.") from broken
    except (RuntimeError, NotImplementedError) as strange:
        raise BadSurveyFile("The file was packed anew by another program. Take it as Bankside made it.") from strange


def _files(content, most, what):
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        entries = archive.infolist()
        names = [entry.filename for entry in entries]
        if len(names) > most or len(set(names)) != len(names):
            raise BadSurveyFile(f"The file holds what no {what} holds. Take it as Bankside made it.")
        files, room = {}, LARGEST_UNPACKED
        for entry in entries:
            with archive.open(entry) as opened:
                files[entry.filename] = opened.read(room + 1)
            room -= len(files[entry.filename])
            if room < 0:
                raise BadSurveyFile(f"Unpacked, the file has more than {LARGEST_UNPACKED / 1e6:.0f} MB.")
    return files


def _manifest(files):
    try:
        manifest = json.loads(files[MANIFEST].decode("utf-8"))
        kind, version = manifest["format"], manifest["version"]
    except (KeyError, TypeError, ValueError, RecursionError) as wrong:
        raise BadSurveyFile("This zip is no survey file: it does not say that it is one.") from wrong
    if kind != FORMAT or not isinstance(version, int) or isinstance(version, bool) or version < 1:
        raise BadSurveyFile("This zip is no survey file: it does not say that it is one.")
    if version > VERSION:
        raise BadSurveyFile(f"A newer Bankside made this file (format {version}; this one reads {VERSION}). {_NEWER}")
    return manifest


def _check_sums(files):
    sums = files.get(CHECKSUMS, b"").decode("ascii", "replace").splitlines()
    told = dict(reversed(line.split("  ", 1)) for line in sums if "  " in line)
    for name in sorted(set(files) - {CHECKSUMS} | set(told)):
        if name not in files:
            raise BadSurveyFile(f"{_shown(name)} is missing from the file. Copy it once more from where it was made.")
        if told.get(name) != hashlib.sha256(files[name]).hexdigest():
            raise BadSurveyFile(f"{_shown(name)} in the file was changed or damaged: its checksum does not fit.")


def _check_names(files):
    wanted = {f"{name}.jsonl" for name in CARRIED} | {MANIFEST, CHECKSUMS}
    if further := sorted(set(files) - wanted):
        raise BadSurveyFile(f"The file holds {_shown(further[0])}, which this Bankside does not know. {_NEWER}")
    if absent := sorted(wanted - set(files)):
        raise BadSurveyFile(f"{absent[0]} is missing from the file. Copy it once more from where it was made.")


def _shown(name):
    return "".join(letter if letter.isprintable() else "?" for letter in name)[:60]
