"""A bottle, a hand-over and a laboratory result on their way in, before they are stored. Ids are made by the form."""

from dataclasses import dataclass, field, replace
from datetime import datetime


@dataclass(frozen=True)
class NewBottle:
    """A bottle as its label and its filling tell; numbers in SI, entered as they were typed.

    kept holds what was asked about it on site and answered with "keep it", as it was read.
    """

    id: str
    station_code: str
    code: str
    analysis: str
    collected_at: datetime
    kind: str = "sample"
    replicate_of: str = ""
    sample_depth_m: float | None = None
    position: str = ""
    volume_ml: float | None = None
    preservative: str = ""
    full: bool | None = None
    filtered: bool = False
    on_ice_at: datetime | None = None
    note: str = ""
    entered: dict = field(default_factory=dict)
    kept: tuple = ()

    def keeping(self, findings):
        """Return the bottle with the findings that the crew was asked about."""
        return replace(self, kept=tuple(one.says for one in findings))


@dataclass(frozen=True)
class NewHandOver:
    """Bottles, by their ids, that passed from one keeper to the next."""

    id: str
    bottles: tuple
    gave: str
    took: str
    at: datetime
    place: str = ""
    temperature_c: float | None = None
    seal: str = ""
    note: str = ""


@dataclass(frozen=True)
class NewResult:
    """What a laboratory tells of one bottle; censor, value, limit_value and quality as models.LabResult holds them."""

    id: str
    bottle_id: str
    laboratory: str = ""
    lab_number: str = ""
    method: str = ""
    arrived_at: datetime | None = None
    arrival_temp_c: float | None = None
    started_at: datetime | None = None
    finished_at: datetime | None = None
    censor: str = "none"
    value: float | None = None
    limit_value: float | None = None
    quality: dict = field(default_factory=dict)
    analyst: str = ""
    note: str = ""
    entered: dict = field(default_factory=dict)
