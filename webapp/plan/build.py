"""From the tables of a plan to the River that calc predicts for, and the rates of each reach with their origin."""

from dataclasses import dataclass
from itertools import pairwise
from math import inf

from calc.demand import hydroscience_kd_per_day
from calc.errors import CalcError
from calc.oxygen import saturation_mg_l, standard_pressure_mmhg
from calc.reaeration import FORMULAS, WEIR_QUALITY, WEIR_SHAPE, FormulaResult, all_formulas, ka20, range_warnings
from calc.river import Reach, River, Weir
from calc.travel import velocity_from_flow_m_s
from webapp.plan.notes import Note, NotReady, refused, row_name
from webapp.plan.tables import KA_FORMULAS, REACHES, WATERS, WEIRS
from webapp.plan.waters import SAME_PLACE_KM, read_waters

# The words of a plan's choices, and the coefficient of calc.reaeration that each stands for.
QUALITY_OF = {
    "clean": WEIR_QUALITY["clean"],
    "slight": WEIR_QUALITY["slightly polluted"],
    "moderate": WEIR_QUALITY["moderately polluted"],
    "gross": WEIR_QUALITY["grossly polluted"],
}
SHAPE_OF = {
    "flat": WEIR_SHAPE["flat broad crest, vertical face"],
    "slope": WEIR_SHAPE["sharp crest, straight slope"],
    "vertical": WEIR_SHAPE["sharp crest, vertical face"],
    "gate": WEIR_SHAPE["submerged gate"],
}
_NEEDED = {"from_km": "where it begins", "to_km": "where it ends", "depth_m": "its mean depth"}
_ARGUMENT_WORDS = {"slope": "a slope above zero", "width_m": "a width", "flow_m3_s": "a flow above zero"}
_ALSO = {"ka20_per_day": "ka", "kd20_per_day": "kd", "velocity_m_s": "velocity"}
# A change of flow within a reach that its one velocity should not hide.
_FLOW_CHANGE = 0.1
_FLOW_CHANGES = "{}: the flow changes within it; velocity is that at its head. Split it there, or enter a velocity."


@dataclass(frozen=True)
class ReachRates:
    """The numbers a reach is predicted with, at 20 °C, and where each comes from.

    formulas holds a FormulaResult for every equation whose arguments the plan has; ka_key names the one in use, or is
    "measured"; ka_warnings are the RangeWarnings of the one in use. kd_per_day and ka_per_day are at the temperature of
    the water, once that is predicted.
    """

    name: str
    from_km: float
    to_km: float
    depth_m: float
    width_m: float | None
    slope: float | None
    flow_m3_s: float
    velocity_m_s: float
    velocity_why: str
    kd20_per_day: float
    kd_why: str
    ka20_per_day: float
    ka_key: str
    ka_why: str
    ka_warnings: tuple
    formulas: tuple[FormulaResult, ...]
    water_temp_c: float | None = None
    kd_per_day: float | None = None
    ka_per_day: float | None = None


@dataclass(frozen=True)
class Built:
    """A River, the ReachRates of its reaches, and the Notes for whoever reads the prediction."""

    river: River
    reach_rates: tuple[ReachRates, ...]
    notes: tuple[Note, ...]


def build(tables, elevation_m):
    """Return what the tables of a plan describe, as Built. Raises NotReady with a sentence for each thing to do."""
    missing, notes = [], []
    basis = (tables.get("basis") or [{}])[0]
    pressure = _pressure(elevation_m)
    rows = _reach_rows(tables.get("reaches") or [], missing)
    head, inflows = read_waters(tables.get("waters") or [], basis, pressure, missing, notes)
    weirs = _weirs(tables.get("weirs") or [], missing)
    if rows and not missing:
        _all_within(rows, inflows, weirs, missing)
    if missing:
        raise NotReady(missing)
    flows = _flows(rows, head, inflows, missing, notes)
    pairs = [_reach(row, name, flow, missing) for (row, name), flow in zip(rows, flows, strict=True)]
    if missing:
        raise NotReady(missing)
    reaches, rates = zip(*pairs, strict=True)
    ends_km = basis.get("settling_ends_km")
    river = River(head, reaches, inflows, weirs, pressure, inf if ends_km is None else ends_km)
    return Built(river, rates, tuple(notes))


def _pressure(elevation_m):
    """Return the standard air pressure at the survey's elevation. [mmHg] Raises NotReady where no equation goes."""
    try:
        pressure = float(standard_pressure_mmhg(elevation_m))
        saturation_mg_l(20.0, pressure)
    except CalcError as error:
        sentence = (
            "The survey's elevation is beyond what the equations for oxygen hold for; check it under About this survey."
        )
        raise NotReady([sentence]) from error
    return pressure


def _reach_rows(rows, missing):
    """Return (row, its name in a sentence) from the top down, each beginning exactly where the one above ends."""
    named = [(row, row_name(REACHES, row, number)) for number, row in enumerate(rows, 1)]
    if not named:
        missing.append("Add the reaches of the river, from above the outfall down.")
    lacking = [
        f"{name}: enter {words}." for row, name in named for key, words in _NEEDED.items() if row.get(key) is None
    ]
    missing.extend(lacking)
    if lacking or not named:
        return []
    named.sort(key=lambda pair: (pair[0]["from_km"], pair[0]["to_km"]))
    missing.extend(
        f"{name}: it must end below where it begins." for row, name in named if row["to_km"] <= row["from_km"]
    )
    joined = [named[0]]
    for (above, above_name), (row, name) in pairwise(named):
        gap = row["from_km"] - above["to_km"]
        if abs(gap) > SAME_PLACE_KM:
            other = above_name.removeprefix(f"{REACHES.title}, ")
            how = "leaves a gap below" if gap > 0 else "overlaps with"
            missing.append(f"{name}: it {how} {other}; let it begin where {other} ends.")
        joined.append(({**row, "from_km": above["to_km"]}, name))
    return joined


def _weirs(rows, missing):
    weirs = []
    for number, row in enumerate(rows, 1):
        name = row_name(WEIRS, row, number)
        if row.get("distance_km") is None or row.get("drop_m") is None:
            missing.append(f"{name}: enter where it is and its drop.")
            continue
        quality = QUALITY_OF[row.get("quality") or "moderate"]
        shape = SHAPE_OF[row.get("shape") or "vertical"]
        try:
            weirs.append(Weir(row["distance_km"], row["drop_m"], quality, shape, row.get("name") or ""))
        except CalcError as error:
            missing.append(refused(WEIRS, name, error))
    return tuple(weirs)


def _all_within(rows, inflows, weirs, missing):
    """Say what lies outside the reaches."""
    top, end = rows[0][0]["from_km"], rows[-1][0]["to_km"]
    if end <= 0:
        missing.append("Add a reach below the outfall: that is where oxygen sags.")
        return
    for table, features in ((WATERS, inflows), (WEIRS, weirs)):
        for feature in features:
            if not top <= feature.distance_km <= end:
                where = "above the first reach" if feature.distance_km < top else "below the last reach"
                missing.append(
                    f"{table.title}, {feature.name or table.one}: it lies {where}; correct its place or add a reach."
                )


def _flows(rows, head, inflows, missing, notes):
    """Return the flow in each reach: that at its head, with what joins there; say where more is taken than there is."""
    flow, flows, waiting = head.flow_m3_s, [], list(inflows)
    for row, name in rows:
        joined = flow
        while waiting and waiting[0].distance_km < row["to_km"]:
            inflow = waiting.pop(0)
            flow = _after(flow, inflow, missing)
            if inflow.distance_km <= row["from_km"]:
                joined = flow
        if joined and abs(flow / joined - 1) > _FLOW_CHANGE and row.get("velocity_m_s") is None:
            notes.append(Note("flow changes within a reach", _FLOW_CHANGES, (("", name),)))
        flows.append(joined)
    for inflow in waiting:
        flow = _after(flow, inflow, missing)
    return flows


def _after(flow_m3_s, inflow, missing):
    """Return the flow below an inflow or withdrawal; say where nothing flows, or more is taken than there is."""
    if inflow.kind != "withdrawal":
        if flow_m3_s + inflow.water.flow_m3_s == 0:
            missing.append(f"{WATERS.title}, {inflow.name}: no water flows here; check the flows.")
        return flow_m3_s + inflow.water.flow_m3_s
    if inflow.water.flow_m3_s > flow_m3_s:
        missing.append(f"{WATERS.title}, {inflow.name}: more is taken out than the river carries; check the flows.")
    return max(flow_m3_s - inflow.water.flow_m3_s, 0.0)


def _reach(row, name, flow_m3_s, missing):
    """Return (Reach, ReachRates), or None after saying what is wrong."""
    velocity, velocity_why = _velocity(row, name, flow_m3_s, missing)
    if velocity is None:
        return None
    sizes = {
        "velocity_m_s": velocity,
        "depth_m": row["depth_m"],
        "slope": row.get("slope") or None,
        "flow_m3_s": flow_m3_s or None,
        "width_m": row.get("width_m"),
    }
    key = "measured" if row.get("ka20_per_day") is not None else row.get("ka_formula") or "covar"
    lacks = [] if key == "measured" else [word for word in FORMULAS[key].arguments if sizes[word] is None]
    if lacks:
        words = " and ".join(_ARGUMENT_WORDS[word] for word in lacks)
        missing.append(f"{name}: {KA_FORMULAS[key]} needs {words}; enter it or choose another formula.")
        return None
    try:
        ka = row["ka20_per_day"] if key == "measured" else float(ka20(key, **sizes))
        kd = row.get("kd20_per_day")
        rates = ReachRates(
            **{**sizes, "flow_m3_s": flow_m3_s},
            name=row.get("name") or name.removeprefix(f"{REACHES.title}, "),
            from_km=row["from_km"],
            to_km=row["to_km"],
            velocity_why=velocity_why,
            kd20_per_day=float(hydroscience_kd_per_day(row["depth_m"])) if kd is None else kd,
            kd_why="by depth (Hydroscience 1971)" if kd is None else "entered",
            ka20_per_day=ka,
            ka_key=key,
            ka_why="measured" if key == "measured" else KA_FORMULAS[key],
            ka_warnings=() if key == "measured" else range_warnings(key, **sizes),
            formulas=all_formulas(**sizes),
        )
        return _calc_reach(row, rates), rates
    except CalcError as error:
        missing.append(refused(REACHES, name, error, _ALSO))
        return None


def _velocity(row, name, flow_m3_s, missing):
    """Return the velocity and where it comes from, or (None, "") after saying what to enter. [m/s]"""
    if row.get("velocity_m_s") is not None:
        return row["velocity_m_s"], "entered"
    if row.get("width_m") is None:
        missing.append(f"{name}: enter its velocity, or its width so that velocity follows from the flow.")
        return None, ""
    if not flow_m3_s:
        missing.append(f"{name}: no water flows here; check the flows.")
        return None, ""
    try:
        return float(velocity_from_flow_m_s(flow_m3_s, row["width_m"], row["depth_m"])), "flow over width and depth"
    except CalcError as error:
        missing.append(refused(REACHES, name, error, _ALSO))
        return None, ""


def _calc_reach(row, rates):
    optional = ("ks20_per_day", "kn20_per_day", "sod20_g_m2_per_day")
    optional += ("respiration_mg_l_per_day", "photosynthesis_mg_l_per_day")
    return Reach(
        from_km=rates.from_km,
        to_km=rates.to_km,
        velocity_m_s=rates.velocity_m_s,
        depth_m=rates.depth_m,
        kd20_per_day=rates.kd20_per_day,
        ka20_per_day=rates.ka20_per_day,
        **{key: row.get(key) or 0.0 for key in optional},
        water_temp_c=row.get("water_temp_c"),
        name=rates.name,
    )
