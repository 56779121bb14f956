"""What somebody says when they mark a survey as reviewed, approve it, or open it again."""

from dataclasses import dataclass

from webapp.forms import Fields


@dataclass(frozen=True)
class Asked:
    """A step with its id, made by the form, the mark of what was on the screen, and why."""

    id: str
    seen: str
    reason: str


def parse_step(source, reason_needed=False):
    """Return (Asked, {}) or (None, {field: message})."""
    fields = Fields(source)
    asked = Asked(
        id=fields.uuid("submission_id"),
        seen=fields.text("seen", "mark of the page", 60, required=False) or "",
        reason=fields.text("reason", "reason: whoever opens the survey next must see why", 500, required=reason_needed)
        or "",
    )
    return (None, fields.errors) if fields.errors else (asked, {})
