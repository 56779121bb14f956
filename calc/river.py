"""A river as the predicted sag needs it: reaches, what joins it, and the weirs on it.

Distances are km downstream of the outfall, negative above it. Fields marked (n) may be an array of shape (n,), one
value for each of n plausible rivers; then a prediction has a first axis of n. Distances are always plain floats.
"""

from dataclasses import dataclass, field
from math import inf, nan

from calc.errors import OutOfRangeError


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


@dataclass(frozen=True)
class Thetas:
    """Temperature factors of the rates (methods: 1.047 CBOD, 1.024 reaeration and settling, 1.085, 1.065)."""

    kd: float = 1.047
    ka: float = 1.024
    ks: float = 1.024
    kn: float = 1.085
    sod: float = 1.065


@dataclass(frozen=True)
class River:
    """What a sag is predicted for.

    head is the water entering the first reach; reaches follow each other without gap or overlap, upstream first;
    inflows and weirs lie within them. Settling ends at settling_ends_km (n) [km]. Air pressure [mmHg] and
    conductance set the saturation.

    Raises
    ------
    OutOfRangeError
        If reaches are missing, not in order, or leave a gap, or an inflow or weir lies outside them.
    """

    head: Water
    reaches: tuple[Reach, ...]
    inflows: tuple[Inflow, ...] = ()
    weirs: tuple[Weir, ...] = ()
    pressure_mmhg: float = 760.0
    settling_ends_km: float = inf
    thetas: Thetas = field(default_factory=Thetas)

    def __post_init__(self):
        if not self.reaches:
            raise OutOfRangeError("reaches must hold at least one reach, got none")
        for reach in self.reaches:
            if not reach.to_km > reach.from_km:
                raise OutOfRangeError(f"to_km must be above from_km {reach.from_km:g} km, got {reach.to_km:g} km")
        for above, below in zip(self.reaches, self.reaches[1:], strict=False):
            if abs(above.to_km - below.from_km) > 1e-9:
                raise OutOfRangeError(f"from_km must be {above.to_km:g} km, the end above, got {below.from_km:g} km")
        for feature in (*self.inflows, *self.weirs):
            if not self.from_km <= feature.distance_km <= self.to_km:
                raise OutOfRangeError(
                    f"distance_km must be between {self.from_km:g} and {self.to_km:g} km, got {feature.distance_km:g} km"
                )

    @property
    def from_km(self):
        """Where the first reach begins. [km]"""
        return self.reaches[0].from_km

    @property
    def to_km(self):
        """Where the last reach ends. [km]"""
        return self.reaches[-1].to_km
