"""The sag page's forms: which place is chosen or declined, who reads a station, whether the crew leaves."""

from dataclasses import dataclass

from webapp.forms import Fields
from webapp.sag.leave import CHECK_YOURSELF

REASON_LONGEST = 200


@dataclass(frozen=True)
class Choice:
    """A place chosen or declined. shown is the mark of the screen it was chosen on."""

    id: str
    shown: str
    place: str
    reason: str


@dataclass(frozen=True)
class Leaving:
    """Whether the crew leaves ("left") or stays; ticked are the keys of what was checked by hand."""

    id: str
    shown: str
    choice: str
    reason: str
    ticked: tuple[str, ...]


def parse_choice(source):
    """Return (Choice, {}) or (None, messages)."""
    fields = Fields(source)
    choice = Choice(
        id=fields.uuid("id"),
        shown=fields.text("shown", "mark of the screen", 40, required=False),
        place=fields.text("place", "place", 100),
        reason=fields.text("reason", "reason", REASON_LONGEST, required=False),
    )
    return (None, fields.errors) if fields.errors else (choice, {})


def parse_leaving(source, settled):
    """Return (Leaving, {}) or (None, messages). Leaving while the low point is not settled needs a reason."""
    fields = Fields(source)
    choice = fields.choice("choice", "answer", ("left", "stayed"))
    reason = fields.text("leave_reason", "reason", 1000, required=False)
    if choice == "left" and not settled and not reason:
        fields.refuse("leave_reason", "Say why you leave although the low point is not settled.")
    leaving = Leaving(
        id=fields.uuid("id"),
        shown=fields.text("shown", "mark of the screen", 40, required=False),
        choice=choice,
        reason=reason,
        ticked=tuple(key for key, _ in CHECK_YOURSELF if fields.ticked(f"check_{key}")),
    )
    return (None, fields.errors) if fields.errors else (leaving, {})


def parse_crew(source, names):
    """Return (station's code, name, {}) or (None, None, messages); names are those of the survey's people."""
    fields = Fields(source)
    code = fields.text("code", "station", 20)
    name = fields.choice("crew", "person", names)
    return (None, None, fields.errors) if fields.errors else (code, name, {})
