"""Today's rates from weighted plausible rivers, beside those planned."""

from dataclasses import dataclass

import numpy as np

from calc.mixing import mixed
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.weighted import quantiles

_LEVEL = (0.05, 0.5, 0.95)


@dataclass(frozen=True)
class RateEstimate:
    """One rate as planned and as the readings have it, in the first reach below the outfall: a 90 % interval."""

    key: str
    label: str
    unit: str
    planned: float
    median: float
    low: float
    high: float


def rate_estimates(plan, latents, found, outfall_km):
    """Return the RateEstimates of weighted draws: rates at 20 °C, base e."""
    spread = latents.spread
    reach = next(reach for reach in plan.reaches if reach.to_km > outfall_km)
    cbod, nbod, deficit = _below_outfall(plan, outfall_km)
    net_sd = spread.net_demand_mg_l_per_day + spread.net_demand_g_m2_per_day / reach.depth_m
    net = reach.sod20_g_m2_per_day / reach.depth_m + reach.respiration_mg_l_per_day - reach.photosynthesis_mg_l_per_day
    rows = (
        ("kd", "Decay of carbonaceous demand at 20 °C", "1/d", reach.kd20_per_day, "kd", spread.log_kd),
        ("ka", "Reaeration at 20 °C", "1/d", reach.ka20_per_day, "ka", spread.log_ka),
        ("velocity", "Velocity", "m/s", reach.velocity_m_s, "velocity", spread.log_velocity),
        ("cbod", "Carbonaceous demand after mixing, ultimate", "mg/L", cbod, "cbod", spread.log_cbod),
        ("nbod", "Nitrogenous demand after mixing", "mg/L", nbod, "nbod", spread.log_nbod),
    )
    found_rates = []
    for key, label, unit, planned, name, deviation in rows:
        if name in latents.column:
            values = planned * np.exp(deviation * found.z[:, latents.column[name]])
            found_rates.append(_rate(key, label, unit, planned, values, found.weight))
    for key, label, unit, planned, name, deviation in (
        ("deficit", "Deficit after mixing", "mg/L", deficit, "deficit", spread.initial_deficit_mg_l),
        ("net", "Background demand at 20 °C", "mg/L per day", net, "net", net_sd),
    ):
        values = planned + deviation * found.z[:, latents.column[name]]
        found_rates.append(_rate(key, label, unit, planned, values, found.weight))
    return tuple(found_rates)


def _rate(key, label, unit, planned, values, weight):
    low, median, high = (float(value) for value in quantiles(values, weight, _LEVEL))
    return RateEstimate(key, label, unit, float(planned), median, low, high)


def _below_outfall(plan, outfall_km):
    """Return both demands and the deficit where the outfall has mixed, as planned."""
    waters = [plan.head] + [inflow.water for inflow in plan.inflows if inflow.distance_km == outfall_km]
    flows = [water.flow_m3_s for water in waters]
    cbod, nbod, do, celsius = (
        float(mixed(flows, [getattr(water, name) for water in waters]))
        for name in ("cbod_mg_l", "nbod_mg_l", "do_mg_l", "water_temp_c")
    )
    conductance = float(mixed(flows, np.nan_to_num([water.conductance_us_cm for water in waters])))
    return cbod, nbod, float(saturation_mg_l(celsius, plan.pressure_mmhg, salinity_psu(conductance))) - do
