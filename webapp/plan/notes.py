"""What a plan still lacks, and what its reader should know, in words without units until somebody shows them."""

from dataclasses import dataclass


class NotReady(Exception):
    """The plan can't be predicted yet; missing says why, a sentence each."""

    def __init__(self, missing):
        super().__init__(" ".join(missing))
        self.missing = tuple(dict.fromkeys(missing))


@dataclass(frozen=True)
class Note:
    """A sentence with numbers in it: pattern has {} for each of values, (quantity, SI value) or ("", text)."""

    name: str
    pattern: str
    values: tuple = ()

    def said(self, show):
        """Return the sentence in the survey's units."""
        return self.pattern.format(*(_said(show, quantity, value) for quantity, value in self.values))


def _said(show, quantity, value):
    if not quantity:
        return value
    return show.place(value) if quantity == "place" else show.text(quantity, value)


def row_name(table, row, number):
    """Return how a sentence names a row: the table's title, and the row's own name or its number."""
    own = str(row.get(table.key_column) or "").strip()
    return f"{table.title}, {own}" if own else f"{table.title}, row {number}"


def refused(table, named, error, also=None):
    """Return the sentence for a part that calc refused; its errors begin with the name of what they refuse."""
    key = str(error).split(" ", 1)[0]
    labels = {column.key: column.label for column in table.columns} | (also or {})
    what = labels.get(key)
    if what is None:
        return f"{named}: its numbers do not fit together; check them."
    return f"{named}: {what[0].lower() + what[1:]} lies outside what the equations hold for; check it."
