"""What is expected at each station under the conditions of the day, kept beside the prediction: every reading asks."""

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
