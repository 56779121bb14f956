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
    "ph",
    "distance_left_m",
)
EVENTS = ("corrected", "set_aside", "restored", "kept", "asked", "answered", "drift", "drift_undone")
# What a reviewer did last; "open" where nobody but the author has looked since the number last changed.
OPEN, KEPT, ASKED, ANSWERED = "open", "kept", "asked", "answered"


@dataclass(frozen=True)
class FinalReading:
    """A reading's numbers after corrections and drift, in SI.

    raw holds each as it was recorded, corrections the events; drift is the event whose line do_mg_l was moved along, or
    None, and before_drift_mg_l oxygen before that. review is OPEN, KEPT, ASKED or ANSWERED, reviewer_id who decided.
    series holds the several raw values, stable what was said of them when it was recorded; decisions counts the events.
    """

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
    ph: float | None = None
    distance_left_m: float | None = None
    drift: object = None
    before_drift_mg_l: float | None = None
    review: str = OPEN
    reviewer_id: str = ""
    stable: bool | None = None
    series: tuple = ()
    decisions: int = 0

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
    """Return the reading with every decision applied in the order it was made; a FinalReading as it is.

    Events may come in any order. A drift correction is a line over whatever the number was corrected to, so that it
    holds for corrections made before and after it.
    """
    if isinstance(reading, FinalReading):
        return reading
    raw = {name: getattr(reading, name) for name in NUMBERS}
    numbers, set_aside, reason, drift = dict(raw), False, "", None
    events = sorted(reading.events, key=lambda event: (event.made_at, event.id))
    for event in events:
        if event.kind == "corrected" and event.field in numbers:
            numbers[event.field] = event.new_value
        elif event.kind in ("set_aside", "restored"):
            set_aside = event.kind == "set_aside"
            reason = event.reason if set_aside else ""
        elif event.kind in ("drift", "drift_undone"):
            drift = event if event.kind == "drift" else None
    before_drift = numbers["do_mg_l"]
    numbers["do_mg_l"] = _moved(before_drift, drift)
    review, reviewer_id = _review(reading, events)
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
        corrections=tuple(event for event in events if event.kind == "corrected"),
        drift=drift,
        before_drift_mg_l=before_drift,
        review=review,
        reviewer_id=reviewer_id,
        stable=reading.stable,
        series=tuple(reading.series or ()),
        decisions=len(events),
        **numbers,
    )


def _moved(do_mg_l, drift):
    """Return oxygen moved along the line of a drift event."""
    if drift is None or do_mg_l is None:
        return do_mg_l
    return float(drift.particulars["scale"]) * do_mg_l + float(drift.particulars["shift"])


def _review(reading, events):
    """Return (state of the review, who decided): what the author decides about their own reading opens it again."""
    state, by = OPEN, ""
    for event in events:
        if event.kind in (KEPT, ASKED, ANSWERED):
            state, by = event.kind, event.made_by_id
        elif event.kind in ("corrected", "set_aside", "restored"):
            own = event.made_by_id == reading.author_id
            state, by = (OPEN, "") if own else (KEPT, event.made_by_id)
    return state, by


def placed(readings, stations):
    """Return the readings that have oxygen and a place, as PlacedReading; stations are the rows of a plan."""
    distances = {row["code"]: row["distance_km"] for row in stations}
    finals = (final(reading) for reading in readings)
    return [
        PlacedReading(one.id, distances[one.station_code], one.do_mg_l, one.state, one.station_code)
        for one in finals
        if one.do_mg_l is not None and one.station_code in distances
    ]
