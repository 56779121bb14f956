"""A survey file as it comes in: uploaded, or held by the preview that showed what it would do."""

import base64
import binascii

from webapp.surveyfile.archive import LARGEST, BadSurveyFile


def uploaded(content):
    """Return the bytes of an upload. Raises BadSurveyFile where there are none."""
    if not content:
        raise BadSurveyFile("Choose the survey file first: its name ends with .bankside.")
    return content


def held(source):
    """Return (the file's bytes, the mark agreed to) of the form that the preview made. Raises BadSurveyFile."""
    try:
        content = base64.b64decode((source.get("held") or "").encode("ascii"), validate=True)
    except (UnicodeEncodeError, binascii.Error, ValueError) as wrong:
        raise BadSurveyFile("The page lost the file. Choose it once more.") from wrong
    return uploaded(content), source.get("mark") or ""


def holding(content):
    """Return what the preview's form holds of a file."""
    return base64.b64encode(content[:LARGEST]).decode("ascii")
