"""Today's sag: calc's estimate from the readings that count, kept while neither plan nor readings change."""

from dataclasses import dataclass, field
from functools import cached_property, lru_cache

import numpy as np

from calc.beliefs import FitSettings
from calc.errors import CalcError
from calc.fit import Estimate, refine
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.sag import predict
from webapp.plan.day import today_of
from webapp.plan.prediction import Prediction, Unready, basis_of, spread_of
from webapp.sag.evidence import Counted, counted

FEWEST_STATIONS = 2


@dataclass(frozen=True)
class SagPoint:
    """Oxygen of today's sag at one place: the middle value, and the ends of its 90 % interval."""

    do_mg_l: float
    low_mg_l: float
    high_mg_l: float


@dataclass(frozen=True)
class Today:
    """Today's sag: what counted, calc's Estimate, and the Prediction of the day that it started from."""

    prediction: Prediction
    counted: tuple[Counted, ...]
    estimate: Estimate
    ready = True

    @property
    def stations_read(self):
        """Return how many stations below the outfall count."""
        return len(self.estimate.stations_km)

    @cached_property
    def bands(self):
        """Return the low end, the middle and the high end of today's sag along the estimate's grid_km. [mg/L]"""
        found = self.estimate.do_at(self.estimate.grid_km)
        return found.low, found.median, found.high

    @property
    def enough(self):
        """Return whether there is enough to draw today's sag beside the plan's."""
        return self.stations_read >= FEWEST_STATIONS

    @property
    def interval_is_open_below(self):
        """Return whether nothing bounds the low point from below: it may lie where the plan ends, or beyond."""
        return self.estimate.critical_km.high >= self.estimate.plan.to_km - 0.01

    def at(self, distance_km, water_temp_c=None):
        """Return the SagPoint of one place, or None outside the plan's river.

        With the temperature that the water had there, oxygen is that of the same deficit in water so warm.
        """
        river = self.estimate.plan
        if distance_km is None or not max(river.from_km, self.estimate.grid_km[0]) <= distance_km <= river.to_km:
            return None
        low, median, high = (float(np.interp(distance_km, self.estimate.grid_km, band)) for band in self.bands)
        shift = self._warmth_mg_l(distance_km, water_temp_c)
        return SagPoint(*(max(0.0, value + shift) for value in (median, low, high)))

    def _warmth_mg_l(self, distance_km, water_temp_c):
        """Return by how much more oxygen water of a temperature holds than the estimate's water there."""
        if water_temp_c is None or not 0 <= water_temp_c <= 40:
            return 0.0
        river = self.estimate.plan
        here = predict(river, distance_km)
        salinity = salinity_psu(np.nan_to_num(here.conductance_us_cm))
        return float(saturation_mg_l(water_temp_c, river.pressure_mmhg, salinity) - here.saturation_mg_l)


@dataclass(frozen=True)
class _Key:
    """What an estimate depends on: plan version and elevation stand for the prediction."""

    version_id: str
    elevation_m: float
    counted: tuple
    settings: FitSettings
    prediction: object = field(compare=False)
    basis: dict = field(compare=False)


def fit_settings(settings):
    """Return calc's FitSettings with the thresholds of a survey."""
    return FitSettings(
        noise_mg_l=settings.estimate_error_mg_l,
        bias_mg_l=settings.estimate_bias_mg_l,
        fewest_stations=round(settings.leave_stations),
        between=settings.leave_between_percent / 100,
        do_half_mg_l=settings.leave_oxygen_mg_l,
        place_half=settings.leave_place_percent / 100,
        regret_mg_l=settings.leave_regret_mg_l,
    )


def estimate_of(survey, plan_version, settings, readings):
    """Return Today, or Unready with why there is none; settings are calc's Settings, readings all of the survey."""
    prediction = today_of(survey, plan_version)
    if not prediction.ready:
        return prediction
    found = counted(readings, plan_version)
    key = _Key(
        plan_version.id,
        survey.elevation_m,
        found,
        fit_settings(settings),
        prediction,
        basis_of(plan_version.tables),
    )
    return _kept(key)


@lru_cache(maxsize=32)
def _kept(key):
    rows = key.counted
    try:
        estimate = refine(
            key.prediction.river,
            [one.distance_km for one in rows],
            [one.do_mg_l for one in rows],
            water_temp_c=np.array([one.water_temp_c for one in rows], dtype=float),
            meters=[one.meter for one in rows],
            visits=[one.visit for one in rows],
            spread=spread_of(key.basis),
            settings=key.settings,
        )
    except CalcError:
        return Unready(("Today's sag can't be worked out from this plan: check its numbers.",))
    return Today(key.prediction, rows, estimate)
