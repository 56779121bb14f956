"""What is expected at each station under the conditions of the day, kept beside the prediction: every reading asks."""

import math
from dataclasses import dataclass, field
from functools import lru_cache

from webapp.plan.day import today_of


@dataclass(frozen=True)
class _Key:
    """A plan version never changes, so its id and the elevation stand for what is expected."""

    version_id: str
    elevation_m: float
    prediction: object = field(compare=False)
    stations: list = field(compare=False)


@lru_cache(maxsize=64)
def _kept(key):
    return {row["code"]: key.prediction.at(row["distance_km"]) for row in key.stations}


def prediction_or_reasons(survey, plan_version):
    """Return (Prediction, ()), or (None, why there is none) in sentences."""
    if plan_version is None:
        return None, ("There is no plan yet.",)
    prediction = today_of(survey, plan_version)
    return (prediction, ()) if prediction.ready else (None, prediction.missing)


def expected_at_stations(survey, plan_version):
    """Return the StationPrediction of each station by code; nothing without a prediction, None outside the river."""
    prediction, _ = prediction_or_reasons(survey, plan_version)
    if prediction is None:
        return {}
    return _kept(_Key(plan_version.id, survey.elevation_m, prediction, plan_version.tables["stations"]))


def mixed_conductance(survey, plan_version):
    """Return the conductance that the mass balance gives below the outfall, by station code. [µS/cm]

    Only for stations above the next inflow, and where the plan knows the conductance of both waters.
    """
    prediction, _ = prediction_or_reasons(survey, plan_version)
    mixed = prediction.mixing if prediction is not None else None
    if mixed is None or not math.isfinite(mixed.conductance_us_cm):
        return {}
    further = min((one.distance_km for one in prediction.river.inflows if one.distance_km > 0), default=math.inf)
    stations = plan_version.tables["stations"]
    return {row["code"]: mixed.conductance_us_cm for row in stations if 0 <= row["distance_km"] < further}
