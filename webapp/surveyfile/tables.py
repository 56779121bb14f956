"""Which tables a survey file carries, which it leaves out and why, and how their rows belong to a survey.

Columns come from the models, so that a new column travels without a word here; a new table must be named in one of the
two lists, since what it holds may be nobody else's business: a test holds them complete.
"""

from dataclasses import dataclass
from functools import lru_cache

from webapp.models import Base

CARRIED = {
    "person": ("Person", "People"),
    "survey": ("Survey", "Survey"),
    "survey_member": ("Person on it", "People on it"),
    "settings_version": ("Settings version", "Settings versions"),
    "plan_version": ("Plan version", "Plan versions"),
    "station": ("Station", "Stations"),
    "reading": ("Reading", "Readings"),
    "reading_event": ("Decision about a reading", "Decisions about readings"),
    "meter": ("Meter", "Meters"),
    "meter_check": ("Meter check", "Meter checks"),
    "meter_check_event": ("Decision about a meter check", "Decisions about meter checks"),
    "visit": ("Visit", "Visits"),
    "visit_entry": ("Entry of a visit", "Entries of visits"),
    "bottle": ("Bottle", "Bottles"),
    "hand_over": ("Hand-over", "Hand-overs"),
    "lab_result": ("Laboratory result", "Laboratory results"),
    "survey_event": ("Review or approval", "Reviews and approvals"),
    "decision": ("Decision on site", "Decisions on site"),
    "history": ("Line of the history", "Lines of the history"),
}
LEFT_OUT = {
    "frozen_dataset": "the approved dataset can be made again from the survey's rows",
    "seen": "what each person was shown last is of this server",
    "invitation": "a way to sign in here",
    "phone_session": "a phone signed in here",
}

# All that is told of a person: never how they sign in.
OF_PEOPLE = ("id", "name", "role")
# Each server has its own.
NOT_COMPARED = {name: {"received_at"} for name in ("reading", "meter_check", "visit_entry", "bottle")}
NUMBERED = ("settings_version", "plan_version")
# Lines of the history about this server's own doings.
FILE_IMPORTED, DATASET_IMPORTED = "survey file imported", "dataset imported"
STAYS_HERE = (FILE_IMPORTED, DATASET_IMPORTED)


@dataclass(frozen=True)
class Carried:
    """A table of the file: columns by name; parents maps a column to the carried table that it points at."""

    name: str
    columns: dict
    key: tuple
    parents: dict

    @property
    def one(self):
        """Return what a row is called."""
        return CARRIED[self.name][0]

    def key_of(self, row):
        """Return what tells a row from others."""
        return tuple(row[name] for name in self.key)


@lru_cache(maxsize=1)
def carried():
    """Return the carried tables by name, parents before children."""
    found = {}
    for table in Base.metadata.sorted_tables:
        if table.name in CARRIED:
            names = OF_PEOPLE if table.name == "person" else tuple(table.columns.keys())
            parents = {key.parent.name: key.column.table.name for key in table.foreign_keys if key.parent.name in names}
            key = tuple(column.name for column in table.primary_key)
            found[table.name] = Carried(table.name, {name: table.columns[name] for name in names}, key, parents)
    return found
