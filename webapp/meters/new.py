"""A meter and a check on their way in, before they are stored."""

from dataclasses import dataclass, field, replace
from datetime import datetime


@dataclass(frozen=True)
class NewMeter:
    """What is told of a meter; dates as ISO texts, empty where not known. id is made by the form."""

    id: str
    name: str
    method: str = ""
    maker: str = ""
    model: str = ""
    serial: str = ""
    cap_changed_on: str = ""
    serviced_on: str = ""
    resolution_mg_l: float | None = None
    percent_basis: str = "local"
    out_of_service: bool = False
    note: str = ""


@dataclass(frozen=True)
class Standard:
    """What a meter is checked against, in SI: as much of a check as tells what the meter should show."""

    standard: str
    water_temp_c: float | None = None
    pressure_mmhg: float | None = None
    pressure_source: str = "standard"
    conductance_us_cm: float | None = None
    compared: float | None = None


@dataclass(frozen=True)
class NewCheck:
    """What was checked and shown, in SI. id is made by whoever recorded it, so that the same check sent twice is one.

    pressure_mmhg is the air pressure as read, converted but not un-reduced. entered holds {"text", "unit"} of each
    number as it was typed, kept {"name", "says"} of each question that was asked and answered with "keep it".
    """

    id: str
    meter_id: str
    checked_at: datetime
    kind: str
    standard: str
    value: float
    parameter: str = "do"
    compared: float | None = None
    water_temp_c: float | None = None
    pressure_mmhg: float | None = None
    pressure_source: str = "standard"
    conductance_us_cm: float | None = None
    place: str = ""
    lot: str = ""
    expires_on: str = ""
    action: str = "none"
    note: str = ""
    entered: dict = field(default_factory=dict)
    kept: tuple = ()

    def __post_init__(self):
        if self.pressure_mmhg is None:  # a pressure that nobody read has no source
            object.__setattr__(self, "pressure_source", "standard")

    def keeping(self, findings):
        """Return the check with the questions that were asked, in the words that were read."""
        return replace(self, kept=tuple({"name": one.name, "says": one.says} for one in findings))


def find_meter(meters, wanted):
    """Return the meter of that id or name among meters, None where there is none."""
    by_id = next((one for one in meters if one.id == wanted), None)
    return by_id or next((one for one in meters if one.name.casefold() == wanted.casefold()), None)
