"""The release time, as the lead changes it on the field sheet."""

from dataclasses import dataclass
from datetime import datetime

from webapp.forms import Fields


@dataclass(frozen=True)
class NewRelease:
    """When the parcel leaves the outfall, and when it did where the form was opened; None where none was set."""

    release_at: datetime
    was_at: datetime | None


def parse_release(source, show):
    """Return (NewRelease, {}) or (None, {field: message})."""
    fields = Fields(source, show)
    release = NewRelease(
        release_at=fields.local_time("release_at", "time the parcel leaves the outfall"),
        was_at=fields.local_time("was_at", "release time before", required=False),
    )
    return (None, fields.errors) if fields.errors else (release, {})


def typed_release(survey, show):
    """Return the form of the release time as it is."""
    return {"release_at": show.typed_time(survey.release_at), "was_at": show.iso(survey.release_at)}
