"""What an import of a table would do, told before anything is stored."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Preview:
    """What a file would do: its bad cells, or what it brings and how many rows are here already."""

    file: object
    errors: tuple
    new: tuple = ()
    known: int = 0

    @property
    def good(self):
        """Return whether the file can be taken as it is."""
        return not self.errors and not self.file.header_errors

    @property
    def wrong(self):
        """Return the (row, column label) of each bad cell."""
        return {(cell.row, cell.column_label) for cell in self.errors}


def in_table_order(errors, table):
    """Return bad cells row by row, and within a row as the table's columns are ordered; unknown columns come last."""
    order = {column.label: at for at, column in enumerate(table.columns)}
    return tuple(sorted(errors, key=lambda cell: (cell.row, order.get(cell.column_label, len(order)))))
