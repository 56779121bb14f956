"""The numbers of a reading that may be corrected, each with its column: label, unit and the limits of the form."""

from dataclasses import replace

from webapp.readings.columns import READINGS

# The name of a number where it was typed, where that differs from the stored one.
TYPED_AS = {"pressure_mmhg": "pressure"}


def _column(name):
    column = READINGS.column(TYPED_AS.get(name, name))
    if name != "pressure_mmhg":
        return column
    return replace(column, key=name, label="Air pressure at the station", help="Not reduced to sea level.")


CORRECTABLE = {
    name: _column(name)
    for name in (
        "do_mg_l",
        "water_temp_c",
        "depth_m",
        "do_percent",
        "conductance_us_cm",
        "pressure_mmhg",
        "sensor_depth_m",
        "velocity_m_s",
    )
}


def as_typed(reading, name):
    """Return (text, unit code) of a number as somebody typed it; two empty texts where it was not typed."""
    typed = (reading.entered or {}).get(TYPED_AS.get(name, name)) or {}
    return str(typed.get("text") or ""), str(typed.get("unit") or "")
