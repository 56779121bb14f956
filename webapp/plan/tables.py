"""The tables of a plan, column by column; webapp.columns says what a column is."""

from webapp.columns import Column, Table

KA_FORMULAS = {
    "covar": "Covar's choice by depth and velocity",
    "oconnor_dobbins": "O'Connor & Dobbins 1958",
    "churchill": "Churchill, Elmore & Buckingham 1962",
    "owens_gibbs": "Owens, Edwards & Gibbs 1964",
    "tsivoglou_neal": "Tsivoglou & Neal 1976",
    "melching_flores_pool_riffle": "Melching & Flores 1999, pool and riffle",
    "melching_flores_channel_control": "Melching & Flores 1999, channel control",
}
KINDS = {
    "upstream": "The river above the outfall",
    "outfall": "The outfall",
    "tributary": "A tributary or another discharge",
    "withdrawal": "A withdrawal",
}
WEIR_QUALITIES = {
    "clean": "clean",
    "slight": "slightly polluted",
    "moderate": "moderately polluted",
    "gross": "grossly polluted",
}
WEIR_SHAPES = {
    "flat": "flat broad crest",
    "slope": "sharp crest, straight slope face",
    "vertical": "sharp crest, vertical face",
    "gate": "submerged gate",
}
STATION_STATES = {"planned": "planned", "added": "added on site", "dropped": "dropped"}


PLACE_NAMES = ("distance", "location", "at", "km", "mi", "miles", "river mile", "river km", "rm", "rkm")


def _place(key, label, also=PLACE_NAMES, required=True, help=""):
    return Column(key, label, "place", required, -500, 2000, also, help=help)


REACHES = Table(
    "reaches",
    "Reaches",
    "reach",
    "Lengths of river that are much alike, from the top down, without gaps. The first begins above the outfall.",
    (
        Column("name", "Name", longest=60, also=("reach", "reach name")),
        _place("from_km", "From", ("start", "begin", "begins at", "upstream end")),
        _place("to_km", "To", ("end", "ends at", "downstream end")),
        Column("depth_m", "Mean depth", "depth", True, 0.02, 60, ("depth", "h")),
        Column("velocity_m_s", "Mean velocity", "velocity", False, 0.002, 6, ("velocity", "u", "speed"),
               help="Leave empty to take flow divided by width and depth."),
        Column("width_m", "Width", "depth", False, 0.2, 5000, ("width", "w")),
        Column("slope", "Slope", "plain", False, 0, 0.5, ("s", "bed slope", "gradient"),
               help="Drop per length, for example 0.0008."),
        Column("water_temp_c", "Water temperature", "temperature", False, 0, 40, ("temperature", "temp", "t"),
               help="Leave empty to carry the mixed temperature down."),
        Column("kd20_per_day", "kd at 20 °C", "rate", False, 0.001, 10, ("kd", "kd20", "deoxygenation"),
               help="Leave empty for the depth formula (Hydroscience 1971)."),
        Column("ks20_per_day", "Settling rate ks at 20 °C", "rate", False, 0, 10, ("ks", "ks20", "settling")),
        Column("ka20_per_day", "Measured ka at 20 °C", "rate", False, 0.001, 200, ("ka", "ka20", "k2", "reaeration"),
               help="A measured value beats a formula; leave empty to use one."),
        Column("ka_formula", "Formula for ka", "choice", choices=KA_FORMULAS, also=("formula", "ka method"),
               help="Empty takes Covar's choice."),
        Column("kn20_per_day", "Nitrification rate kn at 20 °C", "rate", False, 0, 10, ("kn", "kn20", "nitrification")),
        Column("sod20_g_m2_per_day", "Sediment oxygen demand at 20 °C", "areal", False, 0, 50, ("sod", "sod20")),
        Column("respiration_mg_l_per_day", "Respiration of plants", "volumetric", False, 0, 100, ("respiration", "r")),
        Column("photosynthesis_mg_l_per_day", "Photosynthesis", "volumetric", False, 0, 100, ("photosynthesis", "p")),
    ),
    "name",
    "from_km",
)  # fmt: skip

WATERS = Table(
    "waters",
    "Waters that meet",
    "water",
    "The river as it comes down, the outfall, and everything that joins or is taken out.",
    (
        Column("kind", "What it is", "choice", True, choices=KINDS, also=("type",)),
        Column("name", "Name", longest=80),
        _place("distance_km", "Where", required=False,
               help="Leave empty for the river itself (top of the first reach) and for the outfall (zero)."),
        Column("flow_m3_s", "Flow", "flow", True, 0, 100000, ("flow", "q", "discharge")),
        Column("do_mg_l", "Oxygen", "oxygen", False, 0, 30, ("do", "dissolved oxygen", "oxygen")),
        Column("do_percent", "Oxygen saturation", "percent", False, 0, 400,
               ("or oxygen saturation", "do saturation", "percent saturation", "% saturation", "saturation", "do"),
               help="Instead of oxygen as a concentration."),
        Column("water_temp_c", "Temperature", "temperature", False, 0, 40, ("temperature", "temp", "t")),
        Column("bod5_mg_l", "BOD5", "demand", False, 0, 50000, ("bod5", "bod", "cbod5")),
        Column("cbod_ultimate_mg_l", "Ultimate carbonaceous BOD", "demand", False, 0, 100000,
               ("ultimate", "l0", "cbodu", "ultimate bod"), help="Instead of BOD5, where it is known."),
        Column("ammonia_mg_n_l", "Ammonia nitrogen", "demand", False, 0, 5000, ("ammonia", "nh3", "nh4", "nh3-n")),
        Column("tkn_mg_n_l", "Total Kjeldahl nitrogen", "demand", False, 0, 5000, ("tkn", "kjeldahl"),
               help="Instead of ammonia: it holds the organic nitrogen too."),
        Column("conductance_us_cm", "Specific conductance", "conductance", False, 0, 100000,
               ("conductance", "sc", "conductivity")),
    ),
    "name",
    "distance_km",
)  # fmt: skip

WEIRS = Table(
    "weirs",
    "Weirs",
    "weir",
    "Weirs and dams on the river: water falling over them takes up oxygen.",
    (
        Column("name", "Name", required=True, longest=60),
        _place("distance_km", "Where"),
        Column("drop_m", "Drop", "depth", True, 0.05, 4.5, ("drop", "height", "fall")),
        Column("quality", "Water quality", "choice", choices=WEIR_QUALITIES, also=("water", "quality"),
               help="Empty takes moderately polluted."),
        Column("shape", "Shape", "choice", choices=WEIR_SHAPES, also=("weir shape", "crest"),
               help="Empty takes a sharp crest with a vertical face."),
    ),
    "name",
    "distance_km",
)  # fmt: skip

ACCESS = Table(
    "access",
    "Access points",
    "access point",
    "Places where a crew can reach the water.",
    (
        Column("name", "Name", required=True, longest=80, also=("access point", "place")),
        _place("distance_km", "Where"),
        Column("way", "How to reach the water", longest=400, also=("how", "directions", "access")),
        Column("hazards", "Hazards", longest=400, also=("hazard", "danger")),
        Column("drive_min", "Minutes to drive from the one before", "plain", False, 0, 600,
               ("drive", "drive time", "minutes")),
        Column("latitude", "Latitude", "plain", False, -90, 90, ("lat",)),
        Column("longitude", "Longitude", "plain", False, -180, 180, ("lon", "long")),
        Column("contact", "Owner's contact", longest=200, also=("owner", "phone"), private=True,
               help="For the crew only; it stays out of every dataset."),
    ),
    "name",
    "distance_km",
)  # fmt: skip

STATIONS = Table(
    "stations",
    "Stations",
    "station",
    "Where the crew reads. A code, once given, is never given to another place.",
    (
        Column("code", "Code", required=True, longest=12, also=("station", "station code", "id")),
        _place("distance_km", "Where"),
        Column("access", "Access point", longest=80, also=("access point", "place")),
        Column("state", "State", "choice", choices=STATION_STATES, also=("status",)),
        Column("reason", "Reason", longest=200, also=("why",),
               help="Needed when a station is added on site or dropped."),
        Column("crew", "For whom", longest=100, also=("crew", "assigned to", "who"),
               help="The name of the person who goes there, as they sign in here; empty: whoever comes by."),
    ),
    "code",
    "distance_km",
)  # fmt: skip

BASIS = Table(
    "basis",
    "Rates and doubts",
    "basis",
    "What holds for the whole river, and how far each guess may be off (one standard deviation).",
    (
        Column("bod_bottle_rate_per_day", "Rate k of the BOD bottle at 20 °C", "rate", False, 0.01, 3,
               help="Turns BOD5 into ultimate BOD; empty takes 0.23 per day (common practice for treated sewage)."),
        _place("settling_ends_km", "Settling ends at", required=False, help="Empty: it never ends within the plan."),
        Column("sd_kd", "Doubt about kd, as a fraction", "plain", False, 0, 2, help="Empty takes 0.35."),
        Column("sd_ka", "Doubt about ka, as a fraction", "plain", False, 0, 2, help="Empty takes 0.40."),
        Column("sd_velocity", "Doubt about velocity, as a fraction", "plain", False, 0, 2, help="Empty takes 0.15."),
        Column("sd_cbod", "Doubt about mixed BOD, as a fraction", "plain", False, 0, 2, help="Empty takes 0.20."),
        Column("sd_nbod", "Doubt about nitrogenous demand, as a fraction", "plain", False, 0, 2,
               help="Empty takes 0.30."),
        Column("sd_deficit_mg_l", "Doubt about the deficit after mixing", "oxygen", False, 0, 5,
               help="Empty takes 0.3 mg/L."),
    ),
    "bod_bottle_rate_per_day",
    "bod_bottle_rate_per_day",
)  # fmt: skip

DAY = Table(
    "day",
    "What the day showed",
    "day",
    "What was measured on the day, against what was planned; and how long the crew may stay.",
    (
        Column("river_flow_m3_s", "River flow above the outfall", "flow", False, 0.0001, 100000),
        Column("river_temp_c", "River temperature above the outfall", "temperature", False, 0, 40),
        Column("outfall_flow_m3_s", "Flow of the outfall", "flow", False, 0, 100000),
        Column("outfall_bod5_mg_l", "BOD5 of the outfall", "demand", False, 0, 50000),
        Column("outfall_do_mg_l", "Oxygen in the outfall", "oxygen", False, 0, 30),
        Column("outfall_temp_c", "Temperature of the outfall", "temperature", False, 0, 40),
        Column("crew_until", "The crew works until", "time"),
        Column("bottles_until", "Bottles must be at the laboratory by", "time"),
        Column("drive_to_lab_min", "Minutes to drive to the laboratory", "plain", False, 0, 2880),
        Column("lab_margin_min", "Minutes to hand over bottles there", "plain", False, 0, 600, help="Empty takes 30."),
        Column("off_water_before_sunset_min", "Minutes off the water before sunset", "plain", False, 0, 600,
               help="Empty takes 30."),
        Column("closeout_min", "Minutes to close out", "plain", False, 0, 600,
               help="Meter checks, bottles, gear, people. Empty takes 45."),
        Column("latitude", "Latitude", "plain", False, -90, 90, help="For the sunset, where no access point has it."),
        Column("longitude", "Longitude", "plain", False, -180, 180, help="East positive, west with a minus."),
        Column("reachable_anywhere", "The crew has a boat", "yes_no",
               help="Then every place on the river can be a station."),
    ),
    "river_flow_m3_s",
    "river_flow_m3_s",
)  # fmt: skip

DAY_REACHES = Table(
    "day_reaches",
    "What the day showed, reach by reach",
    "reach",
    "What was measured in a reach on the day; it stands before what the plan or the flow says.",
    (
        Column("reach", "Reach", longest=80),
        _place("from_km", "From"),
        Column("velocity_m_s", "Mean velocity", "velocity", False, 0.002, 6),
        Column("travel_time_h", "Dye time through the reach, in hours", "plain", False, 0.01, 2000,
               help="From the dye's peak at its head to the peak at its end; it stands before a velocity."),
        Column("depth_m", "Mean depth", "depth", False, 0.02, 60),
        Column("water_temp_c", "Water temperature", "temperature", False, 0, 40),
    ),
    "reach",
    "from_km",
)  # fmt: skip

PLAN_TABLES = {table.key: table for table in (REACHES, WATERS, WEIRS, ACCESS, STATIONS, BASIS)}
DAY_TABLES = {table.key: table for table in (DAY, DAY_REACHES)}
# Every table that a plan version may hold: those made at the desk, and what the day showed.
ALL_TABLES = PLAN_TABLES | DAY_TABLES
LISTS = ("reaches", "waters", "weirs", "access", "stations")
EMPTY_PLAN = {"reaches": [], "waters": [], "weirs": [], "access": [], "stations": [], "basis": [{}]}
