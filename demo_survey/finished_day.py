"""What the crew of the finished survey wrote down: meter checks, visits, and where, when and how it read.

Times are those of the survey's first day, with a plus those of its second.
"""

DRIFT_STARTS, DRIFT_ENDS = "05:40", "13:40"

ALDER, AT_D3, AT_D4, AT_D6 = ({"place": place} for place in (
    "Alder bridge", "Poplar footbridge", "Long straight, marker 3", "Stone barn"))  # fmt: skip
ZERO = {"standard": "zero_solution"}
THERMOMETER = {"parameter": "temperature", "standard": "reference_thermometer", **ALDER}
CONDUCTANCE = {"parameter": "conductance", "standard": "conductance_standard", "lot": "C-447-26",
               "expires_on": "2026-11-30", **ALDER}  # fmt: skip


def air(water_temp_c, pressure, value, **more):
    """Return what the form takes of a check in air-saturated water; the pressure is a hand barometer's. [°C, hPa]"""
    return {"standard": "air_saturated_water", "water_temp_c": water_temp_c, "pressure": pressure,
            "pressure_unit": "hPa", "pressure_source": "barometer", "value": value, **more}  # fmt: skip


# meter, kind, time, what else the form asks
CHECKS = (
    ("Meter A", "as_found", "05:08", {"value": "19.7", "compared": "19.6", **THERMOMETER}),
    ("Meter B", "as_found", "05:10", {"value": "19.6", "compared": "19.6", **THERMOMETER}),
    ("Meter A", "as_found", "05:13", {"value": "452", "compared": "447", **CONDUCTANCE}),
    ("Meter B", "as_found", "05:15", {"value": "445", "compared": "447", **CONDUCTANCE}),
    ("Meter A", "as_found", "05:20", air("22.9", "977.8", "8.05", **ALDER)),
    ("Meter B", "as_found", "05:24", air("22.9", "977.8", "8.25", **ALDER)),
    ("Meter A", "adjusted", "05:30", air("22.9", "977.8", "8.29", action="adjusted", **ALDER)),
    ("Meter B", "zero", "05:34", {"value": "0.02", **ZERO, **ALDER}),
    ("Meter A", "read_back", DRIFT_STARTS, air("23.0", "977.8", "8.26", **ALDER)),
    ("Meter A", "zero", "05:46", {"value": "0.03", **ZERO, **ALDER}),
    ("Meter A", "end_of_day", DRIFT_ENDS, air("23.0", "976.7", "7.80", **AT_D3)),
    ("Meter A", "zero", "13:46", {"value": "0.05", **ZERO, **AT_D3}),
    ("Meter A", "after_cleaning", "13:58", air("23.0", "976.7", "7.83", action="withdrawn", **AT_D3,
        note="Cleaned, and still low: it drifted, it was not fouled. Meter B from here on.")),
    ("Meter B", "field", "14:20", air("23.1", "976.5", "8.27", **AT_D4)),
    ("Meter B", "field", "20:48", {"standard": "winkler", "compared": "3.62", "value": "3.58", **AT_D6,
        "note": "Mean of two titrations, 3.60 and 3.64 mg/L."}),
    ("Meter B", "end_of_day", "+07:10", air("21.5", "977.0", "8.56", **ALDER)),
    ("Meter B", "zero", "+07:16", {"value": "0.04", **ZERO, **ALDER}),
    ("Meter B", "after_cleaning", "+07:24", air("21.5", "977.0", "8.52", **ALDER)),
)  # fmt: skip

# station, arrival, leaving, what the crew entered about the visit
VISITS = (
    ("U1", "05:00", "06:20", {"platform": "bridge", "stage_m": "0.58", "width_m": "9.8", "air_temp_c": "15",
                              "cloud_oktas": "1", "rain_mm": "0"}),
    ("D1", "07:02", "07:34", {"platform": "bank", "width_m": "10.2", "water_look": "grey along the right bank"}),
    ("D2", "09:00", "09:44", {"platform": "bank", "float_distance": "20", "float_times": "53.1 52.4 53.6",
                              "flow_m3_s": "2.2", "flow_method": "section", "flow_uncertainty_percent": "6"}),
    ("D3", "12:55", "14:02", {"platform": "bridge", "air_temp_c": "23", "cloud_oktas": "2",
                              "note": "A flat tyre on the way: late for the parcel. Meter A is low, see its check."}),
    ("D4", "14:15", "15:12", {"platform": "bank", "note": "Deep at the stand: read at two depths."}),
    ("D5", "17:10", "18:02", {"platform": "bank", "width_m": "10.3", "air_temp_c": "24", "cloud_oktas": "3"}),
    ("D6", "20:08", "21:00", {"platform": "bank"}),
    ("D7", "22:50", "23:28", {"platform": "bank", "air_temp_c": "18", "water_look": "dark, a little foam"}),
    ("D8", "+02:22", "+02:50", {"platform": "bridge", "status": "partial",
                                "partial_reason": "Lorries on the bridge at night: read at one point, and left."}),
    ("D9", "+04:50", "+05:22", {"platform": "bank", "air_temp_c": "14"}),
    ("U1", "+06:24", "+07:30", {"platform": "bridge", "stage_m": "0.57", "air_temp_c": "15", "cloud_oktas": "2"}),
)  # fmt: skip

SETTLED = (0.10, 0.04, 0.0, -0.02, 0.0)
MOVING = (0.40, 0.24, 0.02, -0.10, -0.22)
A, B = "Meter A", "Meter B"

# station, hours late for the parcel of the plan, meter, position, depth of the water, what else the crew noted
READ = (
    ("U1", None, A, "centre", 0.66, {"after_h": -0.4, "conductance_us_cm": 311, "ph": 7.6, "pressure": 977.6}),
    ("D1", 0.05, A, "left", 0.52, {"conductance_us_cm": 379, "shift": 0.25}),
    ("D1", 0.12, A, "centre", 0.70, {"conductance_us_cm": 437}),
    ("D1", 0.19, A, "right", 0.58, {"conductance_us_cm": 515, "shift": -0.35, "note": "smells of the works"}),
    ("D2", -0.05, A, "left", 0.55, {"conductance_us_cm": 429, "shift": 0.06}),
    ("D2", 0.05, A, "centre", 0.71, {"conductance_us_cm": 441, "comma": True}),
    ("D2", 0.15, A, "centre", 0.71, {"conductance_us_cm": 442, "replicate": True}),
    ("D2", 0.25, A, "right", 0.60, {"conductance_us_cm": 453, "shift": -0.06}),
    ("D3", 1.15, A, "centre", 0.70, {"conductance_us_cm": 441, "steps": SETTLED, "pressure": 977.0}),
    ("D4", 0.10, B, "centre", 1.10, {"down": 0.2, "shift": 0.05, "pressure": 976.5}),
    ("D4", 0.20, B, "centre", 1.10, {"down": 0.8, "shift": -0.05}),
    ("D5", 0.00, B, "left", 0.60, {"conductance_us_cm": 438}),
    ("D5", 0.12, B, "centre", 0.74, {"conductance_us_cm": 441, "steps": SETTLED, "ph": 7.3, "pressure": 976.4}),
    ("D5", 0.24, B, "centre", 0.74, {"conductance_us_cm": 441, "replicate": True}),
    ("D5", 0.36, B, "right", 0.62, {"conductance_us_cm": 444}),
    ("D6", 0.08, B, "centre", 0.73, {"steps": SETTLED}),
    ("D6", 0.20, B, "centre", 0.73, {"replicate": True, "shift": -0.33}),
    ("D7", 0.10, B, "centre", 1.25, {"down": 0.2, "steps": MOVING, "pressure": 976.8,
        "why": "The current kept lifting the probe; the fifth value is the last before we moved on."}),
    ("D7", 0.20, B, "centre", 1.25, {"down": 0.8}),
    ("D8", 0.10, B, "centre", 0.61, {"steps": SETTLED, "note": "from the upstream rail"}),
    ("D9", 0.05, B, "centre", 0.72, {"pressure": 977.1}),
    ("D9", 0.18, B, "centre", 0.72, {"replicate": True}),
    ("U1", None, B, "centre", 0.65, {"after_h": 24.1, "conductance_us_cm": 309, "pressure": 977.0}),
)  # fmt: skip

# code on the label, station, filled, on ice, what else the form asks
BOTTLES = (
    ("SW-01", "U1", "06:10", "06:14", {"position": "centre"}),
    ("SW-02", "D5", "17:34", "17:42", {"position": "centre"}),
    ("SW-03", "D5", "17:36", "17:42", {"position": "centre", "kind": "replicate", "replicate_of": "SW-02"}),
    ("SW-04", "D5", "17:50", "17:53", {"kind": "blank", "note": "Dilution water, filled at the river."}),
    ("SW-05", "U1", "+06:40", "+06:45", {"position": "centre"}),
)
HAND_OVERS = (
    {"bottles": "bottle 1; bottle 2; bottle 3; bottle 4; bottle 5", "gave": "Cleo Banks", "took": "Vera Lund",
     "at": "+09:35", "place": "Door of the laboratory", "temperature_c": "3.8", "seal": "unbroken"},
)  # fmt: skip
# bottle, result as the laboratory wrote it, what else it told; all were set up at 07:00 of the day after they arrived
SET_UP, DONE = "2026-07-24T07:00", "2026-07-29T07:30"
RUN = {"blank_mg_l": "0.12", "gga_mg_l": "191", "incubation_c": "20.1"}
RESULTS = (
    (1, "2.4", {"depletion_mg_l": "2.3", "residual_mg_l": "5.9", "note": "Set up late."}),
    (2, "9.4", {"depletion_mg_l": "3.9", "residual_mg_l": "3.7"}),
    (3, "9.9", {"depletion_mg_l": "4.1", "residual_mg_l": "3.5"}),
    (4, "<2", {}),
    (5, "2.2", {"depletion_mg_l": "2.2", "residual_mg_l": "6.0"}),
)
