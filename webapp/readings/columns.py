"""The readings table, as a form asks for it, an import from a paper sheet takes it and the dataset gives it."""

from webapp.columns import Column, Table

PRESSURE_SOURCES = {
    "meter": "The meter, at the water",
    "barometer": "A hand barometer, at the water",
    "weather": "A weather report or phone (reduced to sea level)",
    "standard": "Not measured",
}
PRESSURE_UNITS = {"mm[Hg]": "mmHg", "hPa": "hPa or mbar", "[in_i'Hg]": "inHg", "kPa": "kPa"}
POSITIONS = {
    "": "Not noted",
    "left": "Left, looking downstream",
    "centre": "Centre",
    "right": "Right, looking downstream",
}
POSITIONS_SHORT = {"left": "Left", "centre": "Centre", "right": "Right"}
PERCENT_BASES = {"local": "the air pressure here", "760": "760 mmHg"}
VELOCITY_METHODS = {"": "Not noted", "meter": "current meter", "float": "surface float"}

READINGS = Table(
    "readings",
    "Readings",
    "reading",
    "One line for each reading of the water, as on the paper sheet.",
    (
        Column("station", "Station", required=True, longest=12, also=("code", "station code")),
        Column("taken_at", "Time at the water", "time", True, also=("time", "date", "date time", "observed at")),
        Column("do_mg_l", "Oxygen", "oxygen", False, -0.5, 30, ("do", "dissolved oxygen", "oxygen")),
        Column("values", "Several values", longest=2000, also=("raw values", "oxygen values"),
               help="With blanks between them, for example 6.1 6.3 6.2: their median is the oxygen."),
        Column("unstable_reason", "Why they had not settled", longest=300, also=("unstable reason",)),
        Column("water_temp_c", "Water temperature", "temperature", False, -1, 45, ("temperature", "temp", "t")),
        Column("depth_m", "Depth of the water", "depth", False, 0, 100, ("depth", "total depth")),
        Column("do_percent", "Saturation the meter shows", "percent", False, -5, 400,
               ("percent", "% sat", "saturation")),
        Column("percent_basis", "The meter's percent refers to", "choice", choices=PERCENT_BASES),
        Column("conductance_us_cm", "Specific conductance", "conductance", False, 0, 100000,
               ("conductance", "sc", "conductivity")),
        Column("ph", "pH", "plain", False, 0, 14, ("ph value",)),
        Column("pressure", "Air pressure", "pressure", False, 0, 1200, ("pressure", "barometer"),
               help="As read; see its unit and source."),
        Column("pressure_unit", "Unit of the air pressure", "choice", choices=PRESSURE_UNITS),
        Column("pressure_source", "Where the air pressure comes from", "choice", choices=PRESSURE_SOURCES),
        Column("position", "Position across the river", "choice", choices=POSITIONS),
        Column("distance_left_m", "Distance from the left edge", "depth", False, 0, 2000, ("from left",),
               help="Of a vertical, looking downstream."),
        Column("sensor_depth_m", "Depth of the sensor", "depth", False, 0, 100, ("sensor depth",)),
        Column("velocity_m_s", "Velocity of the water", "velocity", False, -0.5, 6, ("velocity", "speed")),
        Column("velocity_method", "Velocity measured with", "choice", choices=VELOCITY_METHODS),
        Column("meter", "Meter", longest=60, also=("meter id", "instrument")),
        Column("replicate", "Replicate", "yes_no", also=("repeat", "duplicate")),
        Column("note", "Note", longest=2000, also=("notes", "remark", "remarks", "comment")),
        Column("latitude", "Latitude", "plain", False, -90, 90, ("lat",)),
        Column("longitude", "Longitude", "plain", False, -180, 180, ("lon", "long")),
        Column("position_radius_m", "Radius of the position", "depth", False, 0, 100000, ("accuracy", "radius")),
    ),
    "station",
    "taken_at",
)  # fmt: skip
