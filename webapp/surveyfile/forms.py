"""A survey file as it comes in: uploaded, or held by the preview that showed what it would do."""

from webapp import heldfile
from webapp.heldfile import holding
from webapp.surveyfile.archive import BadSurveyFile

__all__ = ["held", "holding", "uploaded"]
_MISSING = "Choose the survey file first: its name ends with .bankside."


def uploaded(content):
    """Return the bytes of an upload. Raises BadSurveyFile where there are none."""
    return heldfile.uploaded(content, BadSurveyFile, _MISSING)


def held(source):
    """Return (the file's bytes, the mark agreed to) of the form that the preview made. Raises BadSurveyFile."""
    return heldfile.held(source, BadSurveyFile, _MISSING)
