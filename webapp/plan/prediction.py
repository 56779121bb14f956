"""The sag a plan predicts, with its band and its critical point: computed on read, and kept while the plan stands."""

from dataclasses import dataclass, field, replace
from functools import lru_cache

import numpy as np

from calc.critical import MIXING_POINT, STILL_FALLING
from calc.errors import CalcError
from calc.mixing import MixingDistance, complete_mix_km, mix_waters
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.reaeration import at_temperature
from calc.river import River, Water
from calc.sag import CriticalPoint, critical_point, predict
from calc.spread import PlanSpread, band, critical_interval
from webapp.plan.build import ReachRates, build
from webapp.plan.notes import Note, NotReady, refused
from webapp.plan.tables import BASIS

GRID_POINTS = 161
# How far above a weir or inflow the grid holds the water before it, so that a jump is drawn as one.
_JUST_ABOVE_KM = 1e-6
_QUANTITIES = {"velocity_m_s": ("velocity", "velocity"), "depth_m": ("depth", "depth"), "flow_m3_s": ("flow", "flow")}
_SAID = {
    "supersaturated above a weir": "Above a weir the water is predicted to be supersaturated; what is known of weirs "
    "does not apply there, and oxygen is carried over it as it is."
}
DOUBTS = {
    "sd_kd": "log_kd",
    "sd_ka": "log_ka",
    "sd_velocity": "log_velocity",
    "sd_cbod": "log_cbod",
    "sd_nbod": "log_nbod",
    "sd_deficit_mg_l": "initial_deficit_mg_l",
}


@dataclass(frozen=True)
class Unready:
    """No prediction yet: missing says what the plan needs, in sentences."""

    missing: tuple[str, ...]
    ready = False


@dataclass(frozen=True)
class StationPrediction:
    """What the plan predicts at one place, with its 90 % band."""

    distance_km: float
    travel_time_h: float
    do_mg_l: float
    low_mg_l: float
    high_mg_l: float
    deficit_mg_l: float
    saturation_mg_l: float
    water_temp_c: float
    depth_m: float


@dataclass(frozen=True)
class MixedWater:
    """The water just below the outfall, fully mixed."""

    flow_m3_s: float
    do_mg_l: float
    water_temp_c: float
    cbod_mg_l: float
    nbod_mg_l: float
    conductance_us_cm: float
    saturation_mg_l: float
    deficit_mg_l: float


@dataclass(frozen=True)
class Interval:
    """A 90 % interval of the critical point; open_below where high_km is only the end of the plan."""

    low_km: float
    high_km: float
    low_h: float
    high_h: float
    low_mg_l: float
    high_mg_l: float
    open_below: bool = False


@dataclass(frozen=True)
class Prediction:
    """A predicted sag: arrays along grid_km, SI, distances km below the outfall, times in hours of travel from it.

    low and high bound the plan's 90 % band. critical is calc's CriticalPoint, critical_interval an Interval, mixing the
    water just below the outfall, mix_km the distance to complete mixing from a bank, or None where width or slope are
    missing. warnings are Notes for whoever reads it: warning.said(show) is a sentence.
    """

    river: River
    grid_km: np.ndarray
    travel_time_h: np.ndarray
    do_mg_l: np.ndarray
    low_mg_l: np.ndarray
    high_mg_l: np.ndarray
    deficit_mg_l: np.ndarray
    saturation_mg_l: np.ndarray
    critical: CriticalPoint
    critical_interval: Interval
    mixing: MixedWater
    reach_rates: tuple[ReachRates, ...]
    mix_km: MixingDistance | None
    warnings: tuple[Note, ...]
    ready = True

    @property
    def still_falling(self):
        """Whether oxygen still falls at the end of the last reach: the true lowest point lies below the plan."""
        return self.critical.kind == STILL_FALLING

    @property
    def never_sags(self):
        """Whether oxygen is lowest where the outfall mixes, and only rises from there."""
        return self.critical.kind == MIXING_POINT

    def at(self, distance_km):
        """Return the StationPrediction of one place, or None outside the river."""
        return self.along([distance_km])[0]

    def along(self, distances_km):
        """Return a list with the StationPrediction of each place, None for those outside the river."""
        inside = [km for km in distances_km if km is not None and self.river.from_km <= km <= self.river.to_km]
        if not inside:
            return [None] * len(distances_km)
        state = predict(self.river, inside)
        columns = {
            "distance_km": state.distance_km,
            "travel_time_h": state.travel_time_h,
            "do_mg_l": state.do_mg_l,
            "low_mg_l": np.interp(inside, self.grid_km, self.low_mg_l),
            "high_mg_l": np.interp(inside, self.grid_km, self.high_mg_l),
            "deficit_mg_l": state.deficit_mg_l,
            "saturation_mg_l": state.saturation_mg_l,
            "water_temp_c": state.water_temp_c,
        }
        rows = zip(*(values.tolist() for values in columns.values()), strict=True)
        found = {
            row[0]: StationPrediction(**dict(zip(columns, row, strict=True)), depth_m=self._depth_m(row[0]))
            for row in rows
        }
        return [found.get(km) for km in distances_km]

    def _depth_m(self, distance_km):
        return next(reach.depth_m for reach in reversed(self.river.reaches) if reach.from_km <= distance_km)


@dataclass(frozen=True)
class _Key:
    """What a prediction depends on: a plan version never changes, so its id stands for its tables."""

    version_id: str
    elevation_m: float
    tables: dict = field(compare=False)


def prediction_of(survey, plan_version):
    """Return the Prediction of a stored plan version, or Unready; kept, so that it is computed once."""
    if plan_version is None:
        return Unready(("Make a plan first.",))
    return _kept(_Key(plan_version.id, survey.elevation_m, plan_version.tables))


@lru_cache(maxsize=64)
def _kept(key):
    return predict_plan(key.tables, key.elevation_m)


def predict_plan(tables, elevation_m):
    """Return the Prediction for the tables of a plan, or Unready with what they still need."""
    try:
        built = build(tables, elevation_m)
        return _predict(built, basis_of(tables))
    except NotReady as error:
        return Unready(error.missing)
    except CalcError:
        return Unready(
            ("The plan's numbers do not fit together: check flows, temperatures and rates for a slip in units.",)
        )


def _predict(built, basis):
    river = built.river
    grid_km = _grid(river)
    state = predict(river, grid_km)
    spread = spread_of(basis)
    around = band(river, grid_km, spread)
    critical = critical_point(river)
    along = {
        "grid_km": grid_km,
        "travel_time_h": state.travel_time_h,
        "do_mg_l": state.do_mg_l,
        "low_mg_l": np.minimum(around.low_mg_l, state.do_mg_l),
        "high_mg_l": np.maximum(around.high_mg_l, state.do_mg_l),
        "deficit_mg_l": state.deficit_mg_l,
        "saturation_mg_l": state.saturation_mg_l,
    }
    for values in along.values():
        values.flags.writeable = False
    return Prediction(
        river=river,
        **along,
        critical=critical,
        critical_interval=_interval(river, spread),
        mixing=_mixing(river),
        reach_rates=_warm_rates(built),
        mix_km=_mix_km(built),
        warnings=(*built.notes, *_outside_ranges(built), *_cautions(state.warnings)),
    )


def basis_of(tables):
    """Return the row of rates and doubts that hold for the whole river."""
    return (tables.get("basis") or [{}])[0]


def spread_of(basis):
    """Return the PlanSpread of the plan's own doubts, calc's where one is empty. Raises NotReady."""
    given = {name: basis[key] for key, name in DOUBTS.items() if basis.get(key) is not None}
    try:
        return PlanSpread(**given)
    except CalcError as error:
        also = {name: BASIS.column(key).label for key, name in DOUBTS.items()}
        raise NotReady([refused(BASIS, BASIS.title, error, also)]) from error


def _interval(river, spread):
    """Return the Interval of the critical point."""
    found = critical_interval(river, spread)
    place, time_h, oxygen = found.distance_km, found.travel_time_h, found.do_mg_l
    # More rivers than the upper twentieth still fall where the plan ends: nothing bounds the place from below.
    open_below = found.still_falling > 0.05
    return Interval(place.low, place.high, time_h.low, time_h.high, oxygen.low, oxygen.high, open_below)


def _grid(river):
    """Return even places and every place where something changes, with one just above it. [km]"""
    features = [one.distance_km for one in (*river.inflows, *river.weirs)]
    changes = np.array([*(reach.from_km for reach in river.reaches[1:]), *features])
    just_above = np.clip(changes - _JUST_ABOVE_KM, river.from_km, river.to_km)
    return np.unique(np.concatenate([np.linspace(river.from_km, river.to_km, GRID_POINTS), changes, just_above]))


def _mixing(river):
    """Return the MixedWater at the outfall."""
    outfall = next(inflow for inflow in river.inflows if inflow.kind == "outfall")
    above = river.head
    if outfall.distance_km > river.from_km:
        state = predict(river, max(outfall.distance_km - _JUST_ABOVE_KM, river.from_km))
        names = ("flow_m3_s", "do_mg_l", "water_temp_c", "cbod_mg_l", "nbod_mg_l", "conductance_us_cm")
        above = Water(**{name: float(getattr(state, name)) for name in names})
    water = mix_waters((above, outfall.water))
    salinity = salinity_psu(0.0 if np.isnan(water.conductance_us_cm) else water.conductance_us_cm)
    saturation = float(saturation_mg_l(water.water_temp_c, river.pressure_mmhg, salinity))
    return MixedWater(**vars(water), saturation_mg_l=saturation, deficit_mg_l=saturation - water.do_mg_l)


def _warm_rates(built):
    """Return the ReachRates with their rates at the temperature of the water at their head."""
    thetas = built.river.thetas
    heads = [rates.from_km for rates in built.reach_rates]
    return tuple(
        replace(
            rates,
            water_temp_c=float(celsius),
            kd_per_day=float(at_temperature(rates.kd20_per_day, celsius, thetas.kd)),
            ka_per_day=float(at_temperature(rates.ka20_per_day, celsius, thetas.ka)),
        )
        for rates, celsius in zip(built.reach_rates, predict(built.river, heads).water_temp_c, strict=True)
    )


def _mix_km(built):
    """Return the complete-mix distance below the outfall. Outfalls mostly lie at a bank, and the plan doesn't say."""
    at_outfall = [rates for rates in built.reach_rates if rates.from_km <= 0 < rates.to_km]
    if not at_outfall or at_outfall[0].width_m is None or at_outfall[0].slope is None:
        return None
    reach = at_outfall[0]
    return complete_mix_km(reach.velocity_m_s, reach.depth_m, reach.width_m, reach.slope, at_bank=True)


def _outside_ranges(built):
    """Return a Note for each range that the formula in use for ka was not published for."""
    return tuple(
        Note(
            "formula outside its range",
            "Reach {}: {} was published for another range of " + _QUANTITIES[warning.argument][0] + " than {}.",
            (("", rates.name), ("", rates.ka_why), (_QUANTITIES[warning.argument][1], warning.value)),
        )
        for rates in built.reach_rates
        for warning in rates.ka_warnings
    )


def _cautions(cautions):
    """Return calc's cautions as Notes; those known here are said again, without the place in km."""
    return tuple(Note(caution.name, _SAID.get(caution.name, "{}"), (("", caution.message),)) for caution in cautions)
