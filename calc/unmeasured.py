"""A plan whose tributaries were not all measured, completed with ordinary values; the estimate takes these as rough."""

from dataclasses import replace

import numpy as np

from calc.errors import OutOfRangeError
from calc.oxygen import saturation_mg_l
from calc.sag import predict
from calc.stretches import members_of

# The middle of the sizes and qualities that unrecorded tributaries mostly have (planning defaults).
_FLOW_SHARE, _SATURATION_SHARE, _CBOD_MG_L = 0.13, 0.9, 3.0


def completed(plan):
    """Return the plan with a value for whatever a tributary lacks: NaN stands for not measured.

    Raises
    ------
    OutOfRangeError
        If the plan holds arrays, or lacks a number that its prediction needs.
    """
    if members_of(plan) is not None:
        raise OutOfRangeError("plan must be a single river, got arrays in it")
    plan = replace(plan, inflows=tuple(_completed(inflow, plan) for inflow in plan.inflows))
    if not np.isfinite(predict(plan, [plan.from_km, plan.to_km]).do_mg_l).all():
        raise OutOfRangeError("plan must hold every number its prediction needs, got one that is not known (NaN)")
    return plan


def _completed(inflow, plan):
    water = inflow.water
    if inflow.kind != "tributary":
        return inflow
    flow = plan.head.flow_m3_s + sum(other.water.flow_m3_s for other in plan.inflows if other.kind == "outfall")
    celsius = plan.head.water_temp_c if np.isnan(water.water_temp_c) else water.water_temp_c
    usual = {
        "flow_m3_s": _FLOW_SHARE * flow,
        "water_temp_c": celsius,
        "do_mg_l": _SATURATION_SHARE * float(saturation_mg_l(celsius, plan.pressure_mmhg)),
        "cbod_mg_l": _CBOD_MG_L,
        "nbod_mg_l": 0.0,
    }
    lacking = {name: value for name, value in usual.items() if np.isnan(getattr(water, name))}
    return replace(inflow, water=replace(water, **lacking)) if lacking else inflow
