"""A river as the predicted sag needs it: reaches, what joins it, and the weirs on it.

Distances are km downstream of the outfall, negative above it. Fields marked (n) may be an array of shape (n,), one
value for each of n plausible rivers; then a prediction has a first axis of n. Distances are always plain floats.
"""

from dataclasses import dataclass, field
from itertools import pairwise
from math import inf, nan

import numpy as np

from calc.checks import require_range
from calc.errors import OutOfRangeError

# Every number of a river with the range it may have; a rate or size that must be above 0 starts at a value so small
# that no river has it. Anything here may be NaN, when it is not known.
_RANGES = {
    "flow_m3_s": (0, 1e6, "m³/s"),
    "do_mg_l": (0, 60, "mg/L"),
    "water_temp_c": (0, 40, "°C"),
    "cbod_mg_l": (0, 1e6, "mg/L"),
    "nbod_mg_l": (0, 1e6, "mg/L"),
    "conductance_us_cm": (0, 59000, "µS/cm"),
    "drop_m": (0, 4.5, "m"),
    "velocity_m_s": (1e-6, 30, "m/s"),
    "depth_m": (1e-3, 1000, "m"),
    "kd20_per_day": (1e-9, 1e4, "per day"),
    "ka20_per_day": (1e-9, 1e4, "per day"),
    "ks20_per_day": (0, 1e4, "per day"),
    "kn20_per_day": (0, 1e4, "per day"),
    "sod20_g_m2_per_day": (-1e4, 1e4, "g/m² per day"),
    "respiration_mg_l_per_day": (-1e6, 1e6, "mg/L per day"),
    "photosynthesis_mg_l_per_day": (-1e6, 1e6, "mg/L per day"),
    "pressure_mmhg": (380, 836, "mmHg"),
    "initial_deficit_shift_mg_l": (-100, 100, "mg/L"),
}


def _check_numbers(part):
    """Turn sequences into arrays and refuse what leaves its range; plain numbers are checked without numpy: faster."""
    for name, value in vars(part).items():
        if name not in _RANGES or value is None:
            continue
        low, high, unit = _RANGES[name]
        if type(value) in (float, int) and low <= value <= high:
            continue
        values = require_range(name, value, low, high, unit)
        object.__setattr__(part, name, values if values.ndim else float(values))


@dataclass(frozen=True)
class Water:
    """A body of water: the river at its head, an outfall, a tributary.

    flow_m3_s (n) [m³/s]; do_mg_l (n) [mg/L]; water_temp_c (n) [°C]; cbod_mg_l (n) ultimate carbonaceous demand
    [mg/L]; nbod_mg_l (n) ultimate nitrogenous demand, as oxygen [mg/L]; conductance_us_cm (n) at 25 °C [µS/cm], NaN
    when not known (then taken as fresh).
    """

    flow_m3_s: float
    do_mg_l: float
    water_temp_c: float
    cbod_mg_l: float = 0.0
    nbod_mg_l: float = 0.0
    conductance_us_cm: float = nan

    def __post_init__(self):
        _check_numbers(self)


INFLOW_KINDS = ("outfall", "tributary", "withdrawal")


@dataclass(frozen=True)
class Inflow:
    """Water that joins at distance_km. kind is "outfall", "tributary" or "withdrawal".

    A withdrawal takes water.flow_m3_s out (written positive) at the river's own quality; its other values are unused.
    """

    distance_km: float
    water: Water
    name: str = ""
    kind: str = "tributary"


@dataclass(frozen=True)
class Weir:
    """A weir or dam: drop_m (n) [m], up to about 4.5; quality and shape are the a and b of calc.reaeration."""

    distance_km: float
    drop_m: float
    quality: float = 1.0
    shape: float = 0.8
    name: str = ""

    def __post_init__(self):
        _check_numbers(self)


@dataclass(frozen=True)
class Reach:
    """A uniform length of river. Rates are base e, per day, at 20 °C.

    from_km, to_km [km]; velocity_m_s (n) > 0 [m/s]; depth_m (n) > 0 [m]; kd20_per_day, ka20_per_day (n) > 0;
    ks20_per_day, kn20_per_day (n) >= 0; sod20_g_m2_per_day (n) [g O2/m²/d]; respiration_mg_l_per_day and
    photosynthesis_mg_l_per_day (n) [mg/L/d], as they are at the water's temperature; water_temp_c (n) [°C]: where it
    is None the mixed temperature is carried down from above, else it is the water's temperature in the whole reach.
    """

    from_km: float
    to_km: float
    velocity_m_s: float
    depth_m: float
    kd20_per_day: float
    ka20_per_day: float
    ks20_per_day: float = 0.0
    kn20_per_day: float = 0.0
    sod20_g_m2_per_day: float = 0.0
    respiration_mg_l_per_day: float = 0.0
    photosynthesis_mg_l_per_day: float = 0.0
    water_temp_c: float | None = None
    name: str = ""

    def __post_init__(self):
        _check_numbers(self)


@dataclass(frozen=True)
class Thetas:
    """Temperature factors of the rates (methods: 1.047 CBOD, 1.024 reaeration and settling, 1.085, 1.065)."""

    kd: float = 1.047
    ka: float = 1.024
    ks: float = 1.024
    kn: float = 1.085
    sod: float = 1.065


def _check_reaches(reaches):
    if not reaches:
        raise OutOfRangeError("reaches must hold at least one reach, got none")
    for reach in reaches:
        if not reach.to_km > reach.from_km:
            raise OutOfRangeError(f"to_km must be above from_km {reach.from_km:g} km, got {reach.to_km:g} km")
    for above, below in pairwise(reaches):
        if abs(above.to_km - below.from_km) > 1e-9:
            raise OutOfRangeError(f"from_km must be {above.to_km:g} km, the end above, got {below.from_km:g} km")


@dataclass(frozen=True)
class River:
    """What a sag is predicted for.

    head is the water entering the first reach; reaches follow each other without gap or overlap, upstream first;
    inflows and weirs lie within them. Settling ends at settling_ends_km (n) [km]. Air pressure (n) [mmHg] and
    conductance set the saturation. initial_deficit_shift_mg_l (n) is added to the deficit where the outfall has mixed,
    or at the head of a river without one, as far as oxygen allows [mg/L]: for plausible rivers around a plan.

    Raises
    ------
    OutOfRangeError
        If reaches are missing, not in order, or leave a gap, or an inflow or weir lies outside them; if an inflow's
        kind is unknown; here and in the parts, if a number leaves its range.
    """

    head: Water
    reaches: tuple[Reach, ...]
    inflows: tuple[Inflow, ...] = ()
    weirs: tuple[Weir, ...] = ()
    pressure_mmhg: float = 760.0
    settling_ends_km: float = inf
    thetas: Thetas = field(default_factory=Thetas)
    initial_deficit_shift_mg_l: float = 0.0

    def __post_init__(self):
        _check_numbers(self)
        if isinstance(self.settling_ends_km, (list, tuple)):
            object.__setattr__(self, "settling_ends_km", np.asarray(self.settling_ends_km, dtype=float))
        _check_reaches(self.reaches)
        for feature in (*self.inflows, *self.weirs):
            place_km, low, high = feature.distance_km, self.from_km, self.to_km
            if not low <= place_km <= high:
                raise OutOfRangeError(f"distance_km must be between {low:g} and {high:g} km, got {place_km:g} km")
        for inflow in self.inflows:
            if inflow.kind not in INFLOW_KINDS:
                raise OutOfRangeError(f"kind must be one of {', '.join(INFLOW_KINDS)}, got {inflow.kind}")

    @property
    def from_km(self):
        """Where the first reach begins. [km]"""
        return self.reaches[0].from_km

    @property
    def to_km(self):
        """Where the last reach ends. [km]"""
        return self.reaches[-1].to_km

    @property
    def outfall_km(self):
        """Where the outfall is: the first at or below 0 km, else the first of all; None without one. [km]"""
        places = sorted(inflow.distance_km for inflow in self.inflows if inflow.kind == "outfall")
        return next((place for place in places if place >= 0), places[0] if places else None)
