"""The survey that is going on: the morning's meter checks, the visits and readings so far, and no end check yet."""

from datetime import datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np

from calc.oxygen import percent_saturation
from calc.sag import predict
from demo_survey.river import ELEVATION_M, PLAN, READ_SD_MG_L, distance_km, true_river
from demo_survey.rows import numbered, typed, visits
from webapp.plan.prediction import predict_plan

ZONE = ZoneInfo("Atlantic/Azores")
RELEASE = datetime(2026, 8, 12, 4, 30, tzinfo=ZONE)
SLIPS = (
    "D2: 760 mmHg written as the barometer's, at 310 m: the sea-level value of a weather report",
    "D2: read 1 h 25 min late for the parcel",
    "D3: the meter's percent saturation read from a wrong line, 12 points too high",
    "D1, right: conductance and oxygen differ across the river, which is not mixed yet",
    "Meter A: no check since the morning; without one at the end of the day its readings stay questionable",
)

SURVEY = {
    "name": "Sallow Water, August low flow",
    "river": "Sallow Water",
    "purpose": "Does oxygen below Osier works stay above 4.5 mg/L at low flow, and where is it lowest?",
    "time_zone": "Atlantic/Azores",
    "unit_system": "si",
    "distance_rule": "downstream",
    "outfall_mark": "",
    "elevation_m": "310",
    "do_criterion_mg_l": "4.5",
    "criterion_basis": "daily minimum, invented for the demo",
    "sampling": "same_parcel",
    "release_at": RELEASE.strftime("%Y-%m-%dT%H:%M"),
    "safety_note": "Demo: your emergency number and plan holder stand here. Keep clear of the outfall and Willow weir.",
}
METERS = [
    {"name": "Meter A", "method": "optical", "serial": "A-0417", "cap_changed_on": "2025-11-03",
     "serviced_on": "2026-03-18", "resolution_mg_l": "0.01"},
    {"name": "Meter B", "method": "optical", "serial": "B-1182", "cap_changed_on": "2026-05-20",
     "serviced_on": "2026-03-18", "resolution_mg_l": "0.01", "note": "The spare."},
]  # fmt: skip

# kind, time, what the meter shows, what else the form asks; the water of the bucket would hold 8.61 mg/L
BUCKET = {"standard": "air_saturated_water", "water_temp_c": "20.9", "pressure": "733", "pressure_source": "barometer"}
CHECKS = (
    ("as_found", "03:12", "8.48", BUCKET),
    ("adjusted", "03:18", "8.61", {**BUCKET, "action": "adjusted"}),
    ("read_back", "03:26", "8.60", BUCKET),
    ("zero", "03:33", "0.04", {"standard": "zero_solution"}),
)

# station, arrival, leaving, what the crew entered about the visit
VISITS = (
    ("U1", "03:42", "04:04", {"platform": "bridge", "stage_m": "0.62", "width_m": "10.1", "air_temp_c": "16.5",
                              "cloud_oktas": "2", "rain_mm": "0"}),
    ("D1", "05:08", "05:36", {"platform": "bank", "width_m": "10.4"}),
    ("D2", "08:22", "08:54", {"platform": "bank", "note": "Late: cattle on the track."}),
    ("D3", "10:05", "10:30", {"platform": "bridge", "air_temp_c": "19"}),
    ("U1", "11:12", "11:18", {"platform": "bridge", "stage_m": "0.61", "note": "The gauge only."}),
    ("D4", "12:44", "13:22", {"platform": "bank", "width_m": "10.6", "float_distance": "20",
                              "float_times": "54.6 53.9 54.9", "cloud_oktas": "4"}),
)  # fmt: skip

# station, hours late for the parcel of the plan, position, replicate, further values written on the sheet
READ = (
    ("U1", None, "centre", False, {"pressure": 733, "pressure_source": "barometer"}),
    ("D1", 0.10, "left", False, {"conductance_us_cm": 378, "shift": 0.25}),
    ("D1", 0.15, "centre", False, {"conductance_us_cm": 436}),
    ("D1", 0.20, "right", False, {"conductance_us_cm": 517, "shift": -0.35}),
    ("D2", 1.42, "centre", False, {"pressure": 760, "pressure_source": "barometer"}),
    ("D2", 1.50, "centre", True, {"pressure": 733, "pressure_source": "barometer"}),
    ("D3", 0.30, "centre", False, {"percent_off": 12}),
    ("D4", 0.25, "centre", False, {"pressure": 732, "pressure_source": "meter"}),
)


def readings():
    """Return the readings written down so far, in the order they were taken."""
    plan = predict_plan(PLAN, ELEVATION_M)
    river, rng = true_river(), np.random.default_rng(20260812)
    return [_reading(plan, river, rng, *one) for one in READ]


def _reading(plan, river, rng, code, late_h, position, replicate, sheet):
    km = distance_km(code)
    truth = predict(river, km)
    after_h = -0.6 if late_h is None else plan.at(km).travel_time_h + late_h
    oxygen = round(float(truth.do_mg_l + rng.normal(0, READ_SD_MG_L)) + sheet.get("shift", 0.0), 2)
    temp = round(float(truth.water_temp_c + rng.normal(0, 0.08)), 1)
    percent = float(percent_saturation(oxygen, temp, river.pressure_mmhg)) + sheet.get("percent_off", 0)
    taken_at = (RELEASE + timedelta(hours=after_h)).replace(second=0, microsecond=0)
    kept = ("conductance_us_cm", "pressure", "pressure_source")
    return {
        "station": code, "taken_at": taken_at, "do_mg_l": oxygen, "water_temp_c": temp,
        "depth_m": round(0.62 + float(rng.uniform(0, 0.2)), 2), "do_percent": round(percent), "percent_basis": "local",
        "position": position, "meter": "Meter A", "replicate": replicate,
        **{key: sheet[key] for key in kept if key in sheet},
    }  # fmt: skip


def rows():
    """Return the rows of the survey's forms, by the file each kind stands in."""
    day = RELEASE.date().isoformat()
    checks = [
        {"meter": "Meter A", "taken_at": f"{day}T{at}", "kind": kind, "value": value, "place": "Alder bridge", **more}
        for kind, at, value, more in CHECKS
    ]
    return {
        "meters": numbered("meter", METERS),
        "checks": numbered("check", checks),
        "visits": visits((code, f"{day}T{arrived}", f"{day}T{left}", more) for code, arrived, left, more in VISITS),
        "readings": numbered("reading", [typed(row) for row in readings()]),
    }
