"""What stays out of every dataset wherever it stands, and why."""

from webapp.plan.tables import ACCESS, ALL_TABLES

# The keys are those of plan columns, survey facts and history particulars.
LEFT_OUT = (
    (ACCESS.key, "contact", "Owners' contacts are for the crew only."),
    ("survey", "safety_note", "It holds telephone numbers and names for emergencies."),
    ("people", "sign_in", "Names stand beside what people did; how they sign in is nobody's business."),
)
_PRIVATE = frozenset(key for _, key, _ in LEFT_OUT) | {
    column.key for table in ALL_TABLES.values() for column in table.columns if column.private
}


def public(value):
    """Return an object or a list without what stays out of a dataset."""
    if isinstance(value, dict):
        return {key: public(one) for key, one in value.items() if key not in _PRIVATE}
    return [public(one) for one in value] if isinstance(value, list) else value


def public_rows(rows):
    """Return {table: rows} of a survey without what stays out of a dataset, so that the two can be compared."""
    return {
        name: [{key: public(value) for key, value in row.items() if key not in _PRIVATE} for row in some]
        for name, some in rows.items()
    }
