"""An entry about a visit on its way in, before it is stored."""

from dataclasses import dataclass, field
from datetime import datetime


@dataclass(frozen=True)
class NewEntry:
    """What one save of the form says.

    id is made by the phone; visit_id is that of the visit it belongs to, the entry's own where it begins one. facts
    hold SI numbers, texts, and times as ISO text in UTC; None where the form was left empty. entered holds everything
    as it was typed. seen lists the entries that were on the screen. saved_at is when a phone saved it without signal.
    """

    id: str
    visit_id: str
    station_code: str
    facts: dict
    entered: dict = field(default_factory=dict)
    seen: tuple = ()
    reason: str = ""
    saved_at: datetime | None = None


@dataclass(frozen=True)
class Choice:
    """Which of the entries that disagree about a fact holds, and why; id is that of the entry this becomes."""

    id: str
    name: str
    entry_id: str
    seen: tuple
    reason: str
