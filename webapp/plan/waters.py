"""The waters of a plan, as a river needs them: what comes down from above, and what joins or is taken out."""

from math import nan

from calc.demand import STANDARD_BOTTLE_DAYS, nbod_mg_l, ultimate_mg_l
from calc.errors import CalcError
from calc.oxygen import concentration_mg_l, salinity_psu
from calc.river import Inflow, Water
from webapp.plan.notes import Note, refused, row_name
from webapp.plan.tables import KINDS, WATERS

BOTTLE_RATE_PER_DAY = 0.23
# A metre: what rounding of a typed place may leave between two places that are meant to be one.
SAME_PLACE_KM = 1e-3
_ALSO = {"cbod_mg_l": "BOD", "nbod_mg_l": "nitrogen", "bod_mg_l": "BOD5", "percent": "oxygen saturation"}


def read_waters(rows, basis, pressure_mmhg, missing, notes):
    """Return (head water, inflows) of a plan's rows, or (None, ()); add sentences to missing, and Notes to notes."""
    named = [(row, _name(row, number)) for number, row in enumerate(rows, 1)]
    by_kind = {kind: [pair for pair in named if pair[0].get("kind") == kind] for kind in KINDS}
    _one_of_each(by_kind, missing)
    rate = _or(basis.get("bod_bottle_rate_per_day"), BOTTLE_RATE_PER_DAY)
    head, inflows = None, []
    for row, name in named:
        kind = row.get("kind")
        if kind not in KINDS:
            missing.append(f"{name}: choose what it is.")
            continue
        water = _withdrawn(row, name, missing) if kind == "withdrawal" else None
        if kind != "withdrawal":
            water = _water(row, name, rate, pressure_mmhg, missing, notes)
        if kind == "upstream":
            head = water
        elif (place := _place(row, kind, name, missing)) is not None and water is not None:
            inflows.append(Inflow(place, water, row.get("name") or KINDS[kind], kind))
    return head, tuple(sorted(inflows, key=lambda inflow: inflow.distance_km))


def _name(row, number):
    if row.get("name") or row.get("kind") not in KINDS:
        return row_name(WATERS, row, number)
    return f"{WATERS.title}, {KINDS[row['kind']][0].lower()}{KINDS[row['kind']][1:]}"


def _one_of_each(by_kind, missing):
    if not by_kind["upstream"]:
        missing.append(f"Add the river above the outfall under {WATERS.title}: its flow, oxygen and temperature.")
    if not by_kind["outfall"]:
        missing.append(f"Add the outfall under {WATERS.title}.")
    if len(by_kind["upstream"]) > 1:
        missing.append(f"{WATERS.title}: keep one row for the river above the outfall.")
    if len(by_kind["outfall"]) > 1:
        missing.append(
            f"{WATERS.title}: keep one row as the outfall; enter further discharges as what joins the river."
        )


def _place(row, kind, name, missing):
    """Return where a water joins, None where that is missing. [km]"""
    place = row.get("distance_km")
    if kind == "outfall":
        if place is not None and abs(place) > SAME_PLACE_KM:
            missing.append(f"{name}: distances count from the outfall, so leave its place empty.")
        return 0.0
    if place is None:
        missing.append(f"{name}: enter where it meets the river.")
    return place


def _withdrawn(row, name, missing):
    """Return the Water of a withdrawal, of which only the flow counts."""
    if row.get("flow_m3_s") is None:
        missing.append(f"{name}: enter the flow that is taken out.")
        return None
    return Water(row["flow_m3_s"], 0.0, 10.0)


def _water(row, name, bottle_rate_per_day, pressure_mmhg, missing, notes):
    """Return the Water of a row, or None after saying what it lacks."""
    lacks = [
        words
        for words, there in (
            ("its flow", row.get("flow_m3_s") is not None),
            ("its temperature", row.get("water_temp_c") is not None),
            ("its oxygen, as a concentration or as saturation", _oxygen_there(row)),
            ("its BOD5 or ultimate BOD", _demand_there(row) or row["kind"] != "outfall"),
        )
        if not there
    ]
    missing.extend(f"{name}: enter {words}." for words in lacks)
    if lacks:
        return None
    if not _demand_there(row):
        notes.append(Note("no BOD entered", "{}: no BOD is entered; it is taken as none.", (("", name),)))
    try:
        return Water(
            flow_m3_s=row["flow_m3_s"],
            do_mg_l=_oxygen(row, pressure_mmhg),
            water_temp_c=row["water_temp_c"],
            cbod_mg_l=_cbod(row, bottle_rate_per_day),
            nbod_mg_l=float(nbod_mg_l(_or(row.get("tkn_mg_n_l"), _or(row.get("ammonia_mg_n_l"), 0.0)))),
            conductance_us_cm=_or(row.get("conductance_us_cm"), nan),
        )
    except CalcError as error:
        missing.append(refused(WATERS, name, error, _ALSO))
        return None


def _oxygen_there(row):
    return row.get("do_mg_l") is not None or row.get("do_percent") is not None


def _demand_there(row):
    return row.get("bod5_mg_l") is not None or row.get("cbod_ultimate_mg_l") is not None


def _oxygen(row, pressure_mmhg):
    """Return oxygen as entered, or from percent of saturation at the water's own temperature. [mg/L]"""
    if row.get("do_mg_l") is not None:
        return row["do_mg_l"]
    salinity = salinity_psu(_or(row.get("conductance_us_cm"), 0.0))
    return float(concentration_mg_l(row["do_percent"], row["water_temp_c"], pressure_mmhg, salinity))


def _cbod(row, bottle_rate_per_day):
    """Return the ultimate demand: as entered, or from BOD5. A bottle stands at 20 °C, so its rate is not scaled."""
    if row.get("cbod_ultimate_mg_l") is not None:
        return row["cbod_ultimate_mg_l"]
    return float(ultimate_mg_l(_or(row.get("bod5_mg_l"), 0.0), STANDARD_BOTTLE_DAYS, bottle_rate_per_day))


def _or(value, default):
    return default if value is None else value
