"""A reading as it stands after every decision about it. The reading itself is never changed."""

from dataclasses import dataclass

NUMBERS = (
    "do_mg_l",
    "water_temp_c",
    "depth_m",
    "do_percent",
    "conductance_us_cm",
    "pressure_mmhg",
    "sensor_depth_m",
    "velocity_m_s",
    "latitude",
    "longitude",
    "position_radius_m",
)


@dataclass(frozen=True)
class FinalReading:
    """A reading's numbers after corrections, in SI; raw holds each as it was recorded, corrections the events."""

    id: str
    station_code: str
    taken_at: object
    position: str
    meter: str
    replicate: bool
    do_mg_l: float | None
    water_temp_c: float | None
    depth_m: float | None
    do_percent: float | None
    conductance_us_cm: float | None
    pressure_mmhg: float | None
    sensor_depth_m: float | None
    velocity_m_s: float | None
    latitude: float | None
    longitude: float | None
    position_radius_m: float | None
    raw: dict
    set_aside: bool
    reason: str
    corrections: tuple

    @property
    def state(self):
        """Return whether it counts, in words: "used" or "set aside"."""
        return "set aside" if self.set_aside else "used"


@dataclass(frozen=True)
class PlacedReading:
    """A reading where a chart draws it."""

    id: str
    distance_km: float
    do_mg_l: float
    state: str
    label: str


def final(reading):
    """Return the reading with every correction applied in the order it was made; a FinalReading as it is."""
    if isinstance(reading, FinalReading):
        return reading
    raw = {name: getattr(reading, name) for name in NUMBERS}
    numbers, set_aside, reason = dict(raw), False, ""
    for event in reading.events:
        if event.kind == "corrected" and event.field in numbers:
            numbers[event.field] = event.new_value
        elif event.kind in ("set_aside", "restored"):
            set_aside = event.kind == "set_aside"
            reason = event.reason if set_aside else ""
    return FinalReading(
        id=reading.id,
        station_code=reading.station.code,
        taken_at=reading.taken_at,
        position=reading.position,
        meter=reading.meter,
        replicate=reading.replicate,
        raw=raw,
        set_aside=set_aside,
        reason=reason,
        corrections=tuple(event for event in reading.events if event.kind == "corrected"),
        **numbers,
    )


def placed(readings, stations):
    """Return the readings that have oxygen and a place, as PlacedReading; stations are the rows of a plan."""
    distances = {row["code"]: row["distance_km"] for row in stations}
    finals = (final(reading) for reading in readings)
    return [
        PlacedReading(one.id, distances[one.station_code], one.do_mg_l, one.state, one.station_code)
        for one in finals
        if one.do_mg_l is not None and one.station_code in distances
    ]
