"""A plan that predicts, in SI as it is stored, and put_plan() to store it. The river and its places are invented."""

from webapp.models import PlanVersion, Station

PLAN = {
    "reaches": [
        {"name": "Above the works", "from_km": -1.0, "to_km": 0.0, "depth_m": 0.9, "velocity_m_s": 0.24,
         "width_m": 12.0, "slope": 0.0006},
        {"name": "Willow glides", "from_km": 0.0, "to_km": 7.2, "depth_m": 1.1, "velocity_m_s": 0.26, "width_m": 13.0,
         "slope": 0.0005, "kd20_per_day": 0.75, "ks20_per_day": 0.1, "kn20_per_day": 0.25, "sod20_g_m2_per_day": 0.9},
        {"name": "Osier flats", "from_km": 7.2, "to_km": 19.0, "depth_m": 1.1, "width_m": 12.0,
         "slope": 0.0004, "kd20_per_day": 0.8, "ks20_per_day": 0.1, "kn20_per_day": 0.25,
         "ka_formula": "oconnor_dobbins", "respiration_mg_l_per_day": 0.6,
         "photosynthesis_mg_l_per_day": 0.3},
        {"name": "Gravel run", "from_km": 19.0, "to_km": 30.0, "depth_m": 0.8, "velocity_m_s": 0.42, "width_m": 15.0,
         "slope": 0.0011, "kn20_per_day": 0.3, "ka20_per_day": 4.2},
    ],
    "waters": [
        {"kind": "upstream", "name": "Alder Brook above the works", "flow_m3_s": 1.8, "do_mg_l": 8.3,
         "water_temp_c": 19.5, "bod5_mg_l": 1.6, "ammonia_mg_n_l": 0.1, "conductance_us_cm": 310.0},
        {"kind": "outfall", "name": "Sallow Ford works", "flow_m3_s": 0.35, "do_percent": 48.0, "water_temp_c": 22.0,
         "bod5_mg_l": 66.0, "tkn_mg_n_l": 9.0, "conductance_us_cm": 890.0},
        {"kind": "tributary", "name": "Rush Beck", "distance_km": 7.2, "flow_m3_s": 0.15, "do_mg_l": 8.9,
         "water_temp_c": 17.0, "cbod_ultimate_mg_l": 2.2, "conductance_us_cm": 240.0},
        {"kind": "withdrawal", "name": "Meadow intake", "distance_km": 15.5, "flow_m3_s": 0.08},
    ],
    "weirs": [{"name": "Old mill weir", "distance_km": 22.0, "drop_m": 0.8, "quality": "slight", "shape": "vertical"}],
    "access": [
        {"name": "Cattle bridge", "distance_km": -0.6, "way": "Steps on the left bank", "drive_min": 0.0},
        {"name": "Works fence", "distance_km": 0.3, "way": "Gate beside the fence", "hazards": "Sewage",
         "drive_min": 5.0},
        {"name": "Willow lane", "distance_km": 1.8, "drive_min": 6.0},
        {"name": "Long meadow", "distance_km": 3.4, "way": "Track to the gauge", "drive_min": 7.0},
        {"name": "Footbridge", "distance_km": 5.0, "drive_min": 5.0},
        {"name": "Beck mouth", "distance_km": 6.9, "hazards": "Soft mud", "drive_min": 8.0},
        {"name": "Osier bed", "distance_km": 8.6, "drive_min": 6.0},
        {"name": "Ferry steps", "distance_km": 10.5, "way": "Stone steps, slippery", "drive_min": 9.0},
        {"name": "Hay barn", "distance_km": 12.4, "drive_min": 7.0},
        {"name": "Twin poplars", "distance_km": 14.8, "drive_min": 8.0},
        {"name": "Road bridge", "distance_km": 17.5, "hazards": "Traffic", "drive_min": 9.0},
        {"name": "Gravel bar", "distance_km": 20.6, "drive_min": 10.0},
        {"name": "Below the weir", "distance_km": 22.5, "hazards": "Undertow below the weir", "drive_min": 8.0},
        {"name": "Lower ford", "distance_km": 27.0, "drive_min": 12.0, "contact": "Ring the farm first"},
    ],
    "stations": [
        {"code": "U1", "distance_km": -0.6, "access": "Cattle bridge", "state": "planned"},
        {"code": "D1", "distance_km": 1.8, "access": "Willow lane", "state": "planned"},
        {"code": "D2", "distance_km": 3.4, "access": "Long meadow", "state": "planned"},
        {"code": "D3", "distance_km": 6.9, "access": "Beck mouth", "state": "planned"},
        {"code": "D4", "distance_km": 10.5, "access": "Ferry steps", "state": "planned"},
        {"code": "D5", "distance_km": 12.4, "access": "Hay barn", "state": "planned"},
        {"code": "D6", "distance_km": 17.5, "access": "Road bridge", "state": "planned"},
        {"code": "D7", "distance_km": 20.6, "access": "Gravel bar", "state": "planned"},
        {"code": "D8", "distance_km": 27.0, "access": "Lower ford", "state": "planned"},
    ],
    "basis": [{}],
}  # fmt: skip


def put_plan(db, survey, person, tables=PLAN, number=1):
    """Store a plan version with its stations in a writing session, commit, and return the version."""
    version = PlanVersion(survey_id=survey.id, number=number, tables=tables, reason="First plan", made_by_id=person.id)
    db.add(version)
    known = {one.code for one in db.query(Station).filter_by(survey_id=survey.id)}
    for row in tables.get("stations", []):
        if row["code"] not in known:
            db.add(Station(survey_id=survey.id, code=row["code"]))
    db.commit()
    return version
