"""A reading on its way in, from the form or a paper sheet, before it is stored."""

from dataclasses import dataclass, field, replace
from datetime import datetime


@dataclass(frozen=True)
class NewReading:
    """What was read, in SI; None where nothing was.

    id is made by whoever recorded it, so that the same reading sent twice is one. pressure_mmhg is the air pressure as
    read, converted but not un-reduced; surface_velocity_m_s that of a float, from which the mean velocity follows.
    entered holds {"text", "unit"} of each number as it was typed, kept_findings {"name", "says"} of each check that
    asked and whose reading was kept. series holds the several raw values as models.Reading does.
    """

    id: str
    station_code: str
    taken_at: datetime
    do_mg_l: float | None = None
    water_temp_c: float | None = None
    depth_m: float | None = None
    do_percent: float | None = None
    percent_basis: str = "local"
    conductance_us_cm: float | None = None
    pressure_mmhg: float | None = None
    pressure_source: str = "standard"
    position: str = ""
    sensor_depth_m: float | None = None
    velocity_m_s: float | None = None
    surface_velocity_m_s: float | None = None
    velocity_method: str = ""
    meter: str = ""
    replicate: bool = False
    note: str = ""
    latitude: float | None = None
    longitude: float | None = None
    position_radius_m: float | None = None
    ph: float | None = None
    series: tuple = ()
    soak_s: float | None = None
    stable: bool | None = None
    unstable_reason: str = ""
    distance_left_m: float | None = None
    entered: dict = field(default_factory=dict)
    kept_findings: tuple = ()

    def __post_init__(self):
        if self.pressure_mmhg is None:  # a pressure that nobody read has no source
            object.__setattr__(self, "pressure_source", "standard")

    def keeping(self, findings):
        """Return the reading with the findings that the crew was asked about, in the words it read."""
        return replace(self, kept_findings=tuple({"name": one.name, "says": one.says} for one in findings))
