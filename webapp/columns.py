"""What a table is, column by column: the one description that forms, imports, previews and exports share.

Every number is stored in SI under the column's key; quantity says how it is shown and typed (webapp.display). also
holds further header names that an import understands; capitals, blanks and punctuation in headers do not matter.
"""

from dataclasses import dataclass, field


@dataclass(frozen=True)
class Column:
    """One column. low and high are SI and included; choices maps the stored key to its words."""

    key: str
    label: str
    quantity: str = "text"
    required: bool = False
    low: float = float("-inf")
    high: float = float("inf")
    also: tuple = ()
    choices: dict = field(default_factory=dict)
    help: str = ""
    longest: int = 200
    private: bool = False


@dataclass(frozen=True)
class Table:
    """One table: its rows are dictionaries by column key; key_column holds what names a row, order its sorting."""

    key: str
    title: str
    one: str
    says: str
    columns: tuple
    key_column: str
    order: str

    def column(self, key):
        """Return a column by its key."""
        return next(column for column in self.columns if column.key == key)
