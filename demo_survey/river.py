"""The invented river of the demo: its plan's tables, and the river as it was on the days it was read."""

from dataclasses import replace

from webapp.plan.prediction import predict_plan

ELEVATION_M = 310.0
TRUE_FACTORS = {"ka20_per_day": 0.85, "kd20_per_day": 1.1, "velocity_m_s": 0.92}
TRUE_BOD = 1.2
READ_SD_MG_L = 0.06

RIVER = {
    "ks20_per_day": 0.10,
    "kd20_per_day": 1.0,
    "kn20_per_day": 0.35,
    "sod20_g_m2_per_day": 0.3,
    "ka_formula": "covar",
}
REACHES = [
    {"name": name, "from_km": start, "to_km": end, "depth_m": depth, "velocity_m_s": speed, "width_m": width,
     "slope": slope, **RIVER}
    for name, start, end, depth, speed, width, slope in (
        ("Above the works", -1.5, 0.0, 0.66, 0.34, 10.0, 0.0011),
        ("Osier meadows", 0.0, 8.0, 0.70, 0.35, 10.5, 0.0009),
        ("Long straight", 8.0, 21.0, 0.74, 0.34, 10.5, 0.0008),
        ("Gravel bends", 21.0, 27.0, 0.60, 0.40, 11.5, 0.0012),
        ("Lower willows", 27.0, 32.0, 0.72, 0.38, 11.0, 0.0008),
    )
]  # fmt: skip
WATERS = [
    {"kind": "upstream", "name": "Sallow Water", "flow_m3_s": 1.9, "do_mg_l": 8.3, "water_temp_c": 19.6,
     "bod5_mg_l": 2.0, "ammonia_mg_n_l": 0.2, "conductance_us_cm": 310},
    {"kind": "outfall", "name": "Osier works", "distance_km": 0.0, "flow_m3_s": 0.46, "do_mg_l": 4.5,
     "water_temp_c": 22.5, "bod5_mg_l": 62, "ammonia_mg_n_l": 3.0, "conductance_us_cm": 980},
    {"kind": "tributary", "name": "Teal beck", "distance_km": 23.4, "flow_m3_s": 0.30, "do_percent": 98,
     "water_temp_c": 18.4, "bod5_mg_l": 1.6, "ammonia_mg_n_l": 0.1, "conductance_us_cm": 240},
]  # fmt: skip
WEIRS = [{"name": "Willow weir", "distance_km": 27.0, "drop_m": 0.8, "quality": "slight", "shape": "vertical"}]
BASIS = [{"bod_bottle_rate_per_day": 0.23, "settling_ends_km": 8.0}]
ACCESS = [
    {"name": name, "distance_km": km, "drive_min": drive, "way": way, "hazards": hazards,
     "latitude": round(44.2 - km * 0.006, 4), "longitude": round(-33.1 + km * 0.008, 4)}
    for name, km, drive, way, hazards in (
        ("Alder bridge", -0.6, 0, "Steps on the left bank, upstream side", "Road without footway"),
        ("Works fence", 0.9, 6, "Path along the fence, then the gravel bar", "Sewage contact: gloves, cover cuts"),
        ("Meadow gate", 3.4, 9, "Through the gate, along the hedge", "Cattle; soft bed"),
        ("Cattle ford", 5.2, 7, "Farm track to the ford", "Soft bed"),
        ("Poplar footbridge", 6.9, 8, "From the footbridge, centre of the river", "Slippery planks"),
        ("Old pump house", 8.6, 10, "Concrete steps on the right bank", "Steep steps"),
        ("Long straight, marker 3", 10.3, 8, "Bank path, then the fishing stand", "Deep at the stand: do not wade"),
        ("Reed landing", 12.1, 9, "Boat landing, left bank", "Slippery boards"),
        ("Miller's lane", 13.6, 7, "End of the lane, gravel beach", ""),
        ("Heron pool", 15.3, 11, "Path from the lay-by", "Deep pool: read from the bank"),
        ("Stone barn", 17.1, 8, "Track past the barn, ladder at the wall", "Ladder; hold on with both hands"),
        ("Chapel stairs", 18.8, 9, "Stone stairs by the chapel", "Slippery stone"),
        ("Ferry house", 20.4, 8, "Old ferry ramp", "Boat traffic"),
        ("Gravel bar", 22.2, 10, "Across the gravel bar", "Fast water at the outer bank"),
        ("Teal bridge", 25.2, 12, "From the bridge, upstream rail", "Road bridge: high-visibility clothing"),
        ("Below Willow weir", 27.6, 9, "Right bank, 500 m below the weir", "Keep clear of the weir"),
        ("Sluice green", 28.9, 6, "Lawn on the left bank", ""),
        ("Lower bridge", 31.4, 8, "Steps beside the bridge", "Soft bed"),
    )
]  # fmt: skip
STATION_PLACES = (
    ("U1", "Alder bridge"), ("D1", "Works fence"), ("D2", "Meadow gate"), ("D3", "Poplar footbridge"),
    ("D4", "Long straight, marker 3"), ("D5", "Miller's lane"), ("D6", "Stone barn"), ("D7", "Ferry house"),
    ("D8", "Teal bridge"), ("D9", "Sluice green"),
)  # fmt: skip
WHERE = {row["name"]: row["distance_km"] for row in ACCESS}
STATIONS = [
    {"code": code, "distance_km": WHERE[place], "access": place, "state": "planned"} for code, place in STATION_PLACES
]
PLAN = {"reaches": REACHES, "waters": WATERS, "weirs": WEIRS, "access": ACCESS, "stations": STATIONS, "basis": BASIS}


def distance_km(code):
    """Return where a station lies. [km below the outfall]"""
    return WHERE[dict(STATION_PLACES)[code]]


def true_river():
    """Return the river as it was on the day: the plan's, with other rates, slower water and more BOD."""
    river = predict_plan(PLAN, ELEVATION_M).river
    reaches = tuple(
        replace(reach, **{name: getattr(reach, name) * factor for name, factor in TRUE_FACTORS.items()})
        for reach in river.reaches
    )
    inflows = tuple(replace(one, water=_stronger(one.water)) for one in river.inflows)
    return replace(river, head=_stronger(river.head), reaches=reaches, inflows=inflows)


def _stronger(water):
    return replace(water, cbod_mg_l=water.cbod_mg_l * TRUE_BOD)
