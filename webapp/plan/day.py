"""What the day showed, applied to the plan: the sag, velocities and travel times under the conditions of the day.

The plan as planned stays as it is (plan.prediction.prediction_of). Here a measured flow rescales velocity, depth and
width of every reach by the rating exponents, on the ratio of today's flow in that reach to the planned one, so that an
outfall that runs stronger counts too; tributaries and withdrawals stay as planned. What was measured in a reach stands
before what follows from the flow. A reach whose temperature the plan gives is shifted by as much as the water that
comes into it: above the outfall the river's, below it the mixture's.
"""

from dataclasses import dataclass, field, replace
from functools import lru_cache

from calc.errors import CalcError
from calc.travel import KM_PER_HOUR, depth_at_flow_m, velocity_at_flow_m_s, width_at_flow_m
from webapp.plan.build import build
from webapp.plan.notes import Note, NotReady
from webapp.plan.prediction import Unready, predict_plan, prediction_of
from webapp.plan.waters import SAME_PLACE_KM

# What the form calls a measured value, and the column of the water that it replaces, with what that makes void.
_OF_RIVER = {"river_flow_m3_s": "flow_m3_s", "river_temp_c": "water_temp_c"}
_OF_OUTFALL = {
    "outfall_flow_m3_s": "flow_m3_s",
    "outfall_bod5_mg_l": "bod5_mg_l",
    "outfall_do_mg_l": "do_mg_l",
    "outfall_temp_c": "water_temp_c",
}
_MAKES_VOID = {"bod5_mg_l": "cbod_ultimate_mg_l", "do_mg_l": "do_percent"}
_MEASURED = (*_OF_RIVER, *_OF_OUTFALL)
_REACH_MEASURED = ("velocity_m_s", "travel_time_h", "depth_m", "water_temp_c")
UNUSED = "measured reach is gone"
_COLDEST_C, _WARMEST_C = 0.0, 40.0


@dataclass(frozen=True)
class _Key:
    """A plan version never changes, so its id and the elevation stand for its tables."""

    version_id: str
    elevation_m: float
    tables: dict = field(compare=False)


def day_of(tables):
    """Return the row of what the day showed; an empty one where nothing was entered."""
    return ((tables or {}).get("day") or [{}])[0]


def day_reach(tables, from_km):
    """Return what the day showed in the reach that begins there; an empty row where nothing was entered."""
    rows = (tables or {}).get("day_reaches") or []
    return next((row for row in rows if abs(row["from_km"] - from_km) <= SAME_PLACE_KM), {})


def day_changes(tables):
    """Return whether something was measured on the day that changes the prediction."""
    rows = (tables or {}).get("day_reaches") or []
    return any(day_of(tables).get(key) is not None for key in _MEASURED) or any(
        row.get(key) is not None for row in rows for key in _REACH_MEASURED
    )


def today_of(survey, plan_version):
    """Return the Prediction under the conditions of the day, or Unready; that of the plan where none were entered."""
    planned = prediction_of(survey, plan_version)
    if not planned.ready or not day_changes(plan_version.tables):
        return planned
    return _kept(_Key(plan_version.id, survey.elevation_m, plan_version.tables))


@lru_cache(maxsize=64)
def _kept(key):
    return predict_today(key.tables, key.elevation_m)


def predict_today(tables, elevation_m):
    """Return the Prediction for the tables of a plan under the conditions of the day, or Unready."""
    if not day_changes(tables):
        return predict_plan(tables, elevation_m)
    try:
        changed = today_tables(tables, elevation_m)
    except NotReady as error:
        return Unready(error.missing)
    except CalcError:
        return Unready(("What the day showed does not fit the plan: check the flows for a slip in units.",))
    prediction = predict_plan(changed, elevation_m)
    if not prediction.ready:
        return prediction
    rates = tuple(replace(one, velocity_why=_why(tables, one.from_km)) for one in prediction.reach_rates)
    return replace(prediction, reach_rates=rates, warnings=(*prediction.warnings, *_unused(tables)))


def _unused(tables):
    """Return a Note for each measured reach that the plan no longer has."""
    heads = [row["from_km"] for row in tables["reaches"]]
    return tuple(
        Note(
            UNUSED,
            "What the day showed in reach {} is not used: no reach begins there any more.",
            (("", row["reach"]),),
        )
        for row in tables.get("day_reaches") or []
        if all(abs(row["from_km"] - head) > SAME_PLACE_KM for head in heads)
    )


def today_tables(tables, elevation_m):
    """Return the plan's tables with the conditions of the day in place of what was planned. Raises NotReady."""
    planned = build(tables, elevation_m).reach_rates
    reaches = sorted(tables["reaches"], key=lambda row: (row["from_km"], row["to_km"]))
    waters = [_water(row, day_of(tables)) for row in tables["waters"]]
    # The flows of today need no velocities; the planned ones keep a reach without a velocity from asking for one.
    still = [row | {"velocity_m_s": rates.velocity_m_s} for row, rates in zip(reaches, planned, strict=True)]
    today = build({**tables, "waters": waters, "reaches": still}, elevation_m).reach_rates
    warmer = _warmer(tables["waters"]), _warmer(waters)
    shifts = {above: warmer[1][above] - warmer[0][above] for above in (True, False)}
    changed = [
        _reach(row, before, now.flow_m3_s, shifts[row["to_km"] <= 0], day_reach(tables, row["from_km"]))
        for row, before, now in zip(reaches, planned, today, strict=True)
    ]
    return {**tables, "waters": waters, "reaches": changed}


def _water(row, day):
    """Return a water with what the day showed of it."""
    names = {"upstream": _OF_RIVER, "outfall": _OF_OUTFALL}.get(row.get("kind"), {})
    measured = {column: day[name] for name, column in names.items() if day.get(name) is not None}
    void = {_MAKES_VOID[column] for column in measured if column in _MAKES_VOID}
    return {key: value for key, value in row.items() if key not in void} | measured


def _warmer(waters):
    """Return the temperature of the water above the outfall (True) and of the mixture below it (False). [°C]"""
    river, outfall = (next(row for row in waters if row.get("kind") == kind) for kind in ("upstream", "outfall"))
    flow = river["flow_m3_s"] + outfall["flow_m3_s"]
    heat = sum(row["flow_m3_s"] * row["water_temp_c"] for row in (river, outfall))
    return {True: river["water_temp_c"], False: heat / flow if flow else river["water_temp_c"]}


def _reach(row, planned, flow_m3_s, warmer_c, measured):
    """Return a reach under today's flow, and with what was measured in it."""
    changed = row | {"velocity_m_s": planned.velocity_m_s}
    if flow_m3_s > 0 and planned.flow_m3_s > 0 and flow_m3_s != planned.flow_m3_s:
        flows = planned.flow_m3_s, flow_m3_s
        changed["velocity_m_s"] = float(velocity_at_flow_m_s(planned.velocity_m_s, *flows))
        changed["depth_m"] = float(depth_at_flow_m(row["depth_m"], *flows))
        if row.get("width_m") is not None:
            changed["width_m"] = float(width_at_flow_m(row["width_m"], *flows))
    if row.get("water_temp_c") is not None:
        changed["water_temp_c"] = min(max(row["water_temp_c"] + warmer_c, _COLDEST_C), _WARMEST_C)
    measurable = ("velocity_m_s", "depth_m", "water_temp_c")
    changed |= {key: measured[key] for key in measurable if measured.get(key) is not None}
    if measured.get("travel_time_h"):
        changed["velocity_m_s"] = (row["to_km"] - row["from_km"]) / (KM_PER_HOUR * measured["travel_time_h"])
    return changed


def _why(tables, from_km):
    measured = day_reach(tables, from_km)
    if measured.get("travel_time_h"):
        return "today's dye"
    return "measured today" if measured.get("velocity_m_s") else "planned, at today's flow"
