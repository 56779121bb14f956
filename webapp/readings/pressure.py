"""The air pressure as the forms of a reading and of a meter check ask for it."""

from webapp.readings.columns import PRESSURE_SOURCES, PRESSURE_UNITS, READINGS


def pressure_of(fields):
    """Return the pressure as read, in mmHg and not un-reduced, and its source, as the fields of a new row."""
    source = fields.choice("pressure_source", "source of the air pressure", PRESSURE_SOURCES, "standard")
    unit = fields.choice("pressure_unit", "unit of the air pressure", PRESSURE_UNITS, "mm[Hg]")
    column = READINGS.column("pressure")
    value = fields.number("pressure", "air pressure", column.low, column.high, "pressure", False, unit or "mm[Hg]")
    if value is not None and source == "standard":
        fields.refuse("pressure_source", "Say where the air pressure comes from: a weather report's is converted.")
    return {"pressure_mmhg": value, "pressure_source": source or "standard"}
