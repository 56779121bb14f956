"""A file as it comes in: uploaded, or held by the page that showed what it would do, until somebody agrees."""

import base64
import binascii

# On the way in it travels once more inside a form, a third longer: both must fit into what a request may hold.
LARGEST = 3_500_000


def uploaded(content, bad, missing):
    """Return the bytes of an upload. Raises bad, an exception class, with missing where there are none."""
    if not content:
        raise bad(missing)
    return content


def held(source, bad, missing):
    """Return (the file's bytes, the mark agreed to) of the form that the preview made. Raises bad."""
    try:
        content = base64.b64decode((source.get("held") or "").encode("ascii"), validate=True)
    except (UnicodeEncodeError, binascii.Error, ValueError) as wrong:
        raise bad("The page lost the file. Choose it once more.") from wrong
    return uploaded(content, bad, missing), source.get("mark") or ""


def holding(content):
    """Return what the preview's form holds of a file."""
    return base64.b64encode(content[:LARGEST]).decode("ascii")
