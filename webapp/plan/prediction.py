"""The sag a plan predicts, with its band and its critical point: computed on read, and kept while the plan stands."""

from dataclasses import dataclass, field, replace
from functools import lru_cache

import numpy as np

from calc.errors import CalcError
from calc.mixing import MixingDistance, complete_mix_km, mix_waters
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.reaeration import at_temperature
from calc.river import River, Water
from calc.sag import CriticalPoint, critical_point, predict
from webapp.plan.build import ReachRates, build
from webapp.plan.notes import Note, NotReady

GRID_POINTS = 161
# How far above a weir or inflow the grid holds the water before it, so that a jump is drawn as one.
_JUST_ABOVE_KM = 1e-6
_QUANTITIES = {"velocity_m_s": ("velocity", "velocity"), "depth_m": ("depth", "depth"), "flow_m3_s": ("flow", "flow")}
_SAID = {
    "supersaturated above a weir": "Above a weir the water is predicted to be supersaturated; what is known of weirs "
    "does not apply there, and oxygen is carried over it as it is."
}
DOUBTS = {"sd_kd": 0.35, "sd_ka": 0.40, "sd_velocity": 0.15, "sd_cbod": 0.20, "sd_nbod": 0.30, "sd_deficit_mg_l": 0.3}


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
    """A 90 % interval of the critical point under the plan's doubts; either end may be the river's own."""

    low_km: float
    high_km: float
    low_h: float
    high_h: float
    low_mg_l: float
    high_mg_l: float


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

    def at(self, distance_km):
        """Return the StationPrediction of one place, or None outside the river."""
        if distance_km is None or not self.river.from_km <= distance_km <= self.river.to_km:
            return None
        state = predict(self.river, distance_km)
        reach = next(reach for reach in reversed(self.river.reaches) if reach.from_km <= distance_km)
        return StationPrediction(
            distance_km=distance_km,
            travel_time_h=float(state.travel_time_h),
            do_mg_l=float(state.do_mg_l),
            low_mg_l=float(np.interp(distance_km, self.grid_km, self.low_mg_l)),
            high_mg_l=float(np.interp(distance_km, self.grid_km, self.high_mg_l)),
            deficit_mg_l=float(state.deficit_mg_l),
            saturation_mg_l=float(state.saturation_mg_l),
            water_temp_c=float(state.water_temp_c),
            depth_m=reach.depth_m,
        )


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
        return _predict(built, (tables.get("basis") or [{}])[0])
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
    low, high, interval = _spread(river, basis, grid_km)
    critical = critical_point(river)
    along = {
        "grid_km": grid_km,
        "travel_time_h": state.travel_time_h,
        "do_mg_l": state.do_mg_l,
        "low_mg_l": np.minimum(low, state.do_mg_l),
        "high_mg_l": np.maximum(high, state.do_mg_l),
        "deficit_mg_l": state.deficit_mg_l,
        "saturation_mg_l": state.saturation_mg_l,
    }
    for values in along.values():
        values.flags.writeable = False
    return Prediction(
        river=river,
        **along,
        critical=critical,
        critical_interval=interval,
        mixing=_mixing(river),
        reach_rates=_warm_rates(built),
        mix_km=_mix_km(built),
        warnings=(*built.notes, *_outside_ranges(built), *_cautions(state.warnings)),
    )


def _spread(river, basis, grid_km):
    """Return the low and high of the 90 % band along the grid, and the Interval of the critical point."""
    doubts = {name: basis.get(name) if basis.get(name) is not None else default for name, default in DOUBTS.items()}
    rivers = _plausible(river, doubts)
    low, high = np.quantile(predict(rivers, grid_km).do_mg_l, (0.05, 0.95), axis=0)
    lowest = critical_point(rivers)
    ends = [np.quantile(values, (0.05, 0.95)) for values in (lowest.distance_km, lowest.travel_time_h, lowest.do_mg_l)]
    return low, high, Interval(*(float(end) for pair in ends for end in pair))


def _plausible(river, doubts):
    draws = np.random.default_rng(1).standard_normal((6, 200))
    kd, ka, velocity, cbod, nbod = (
        np.exp(doubts[f"sd_{name}"] * draw)
        for name, draw in zip(("kd", "ka", "velocity", "cbod", "nbod"), draws, strict=False)
    )
    reaches = tuple(
        replace(
            reach,
            kd20_per_day=reach.kd20_per_day * kd,
            ka20_per_day=reach.ka20_per_day * ka,
            velocity_m_s=reach.velocity_m_s * velocity,
        )
        for reach in river.reaches
    )

    def scaled(water):
        return replace(water, cbod_mg_l=water.cbod_mg_l * cbod, nbod_mg_l=water.nbod_mg_l * nbod)

    inflows = tuple(replace(inflow, water=scaled(inflow.water)) for inflow in river.inflows)
    shift = doubts["sd_deficit_mg_l"] * draws[5]
    return replace(river, head=scaled(river.head), reaches=reaches, inflows=inflows, initial_deficit_shift_mg_l=shift)


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
