"""The survey of three weeks earlier: a day and a night of it, two meters, one of which drifted. Nobody reviewed it yet.

Meter A was read back at 05:40 and found 0.46 mg/L low in air-saturated water 8 h later; what it showed in between is
the river's oxygen less that drift, which grows in a straight line. Meter B reads right.
"""

from datetime import datetime, timedelta

import numpy as np

from calc.oxygen import percent_saturation, saturation_mg_l
from calc.sag import predict
from calc.units import convert
from demo_survey import today
from demo_survey.finished_day import (
    BOTTLES,
    CHECKS,
    DONE,
    DRIFT_ENDS,
    DRIFT_STARTS,
    HAND_OVERS,
    READ,
    RESULTS,
    RUN,
    SET_UP,
    VISITS,
)
from demo_survey.river import ELEVATION_M, PLAN, READ_SD_MG_L, distance_km, true_river
from demo_survey.rows import numbered, typed, visits
from webapp.plan.prediction import predict_plan

ZONE = today.ZONE
RELEASE = datetime(2026, 7, 22, 6, 30, tzinfo=ZONE)
SURVEY = {**today.SURVEY, "name": "Sallow Water, July low flow", "release_at": RELEASE.strftime("%Y-%m-%dT%H:%M")}
METERS = today.METERS
VALUES_AFTER_S = (70, 105, 140, 175, 210)
VALUE_SD_MG_L = 0.03
SLIPS = (
    "Meter A: drifts by 0.46 mg/L over 8 h",
    "D1: conductance differs from left to right: the river is not mixed there yet",
    "D3: read 1 h 9 min late for the parcel",
    "D6: the replicate lies 0.34 mg/L below the reading that it repeats",
    "D7: the five values of the upper reading had not settled",
    "D8: the visit is partial",
)


def drift_scale(at):
    """Return what a reading of Meter A is to be multiplied with to be right."""
    end = next(more for meter, kind, _, more in CHECKS if (meter, kind) == ("Meter A", "end_of_day"))
    pressure = float(convert(float(end["pressure"]), "hPa", "mm[Hg]"))
    expected = float(saturation_mg_l(float(end["water_temp_c"]), pressure))
    starts, ends = (when(text) for text in (DRIFT_STARTS, DRIFT_ENDS))
    return 1 + (at - starts) / (ends - starts) * (expected / float(end["value"]) - 1)


def when(text):
    """Return the instant of a time of the survey's two days: "05:40", or "+07:10" of the second."""
    day = RELEASE.date() + timedelta(days=text.startswith("+"))
    return datetime.fromisoformat(f"{day}T{text.lstrip('+')}").replace(tzinfo=ZONE)


def readings():
    """Return the readings in the order they were taken: what the meters showed, as it was typed."""
    plan = predict_plan(PLAN, ELEVATION_M)
    river, rng = true_river(), np.random.default_rng(20260722)
    return [_reading(plan, river, rng, *one) for one in READ]


def _reading(plan, river, rng, code, late_h, meter, point, depth_m, sheet):
    km = distance_km(code)
    truth = predict(river, km)
    after_h = sheet["after_h"] if late_h is None else plan.at(km).travel_time_h + late_h
    taken_at = (RELEASE + timedelta(hours=after_h)).replace(second=0, microsecond=0)
    right = float(truth.do_mg_l + rng.normal(0, READ_SD_MG_L)) + sheet.get("shift", 0.0)
    shown = round(right / drift_scale(taken_at) if meter == "Meter A" else right, 2)
    temp = round(float(truth.water_temp_c + rng.normal(0, 0.08)), 1)
    row = {
        "station": code, "taken_at": taken_at, "do_mg_l": shown, "water_temp_c": temp, "depth_m": depth_m,
        "sensor_depth_m": round(depth_m * sheet.get("down", 0.6), 2), "position": point, "meter": meter,
        "do_percent": round(float(percent_saturation(shown, temp, river.pressure_mmhg))), "percent_basis": "local",
        **{name: sheet[name] for name in ("conductance_us_cm", "ph", "replicate", "note") if name in sheet},
    }  # fmt: skip
    if "pressure" in sheet:
        row |= {"pressure": sheet["pressure"], "pressure_unit": "hPa", "pressure_source": "barometer"}
    if "steps" in sheet:
        row |= _timed(rng, shown, temp, sheet)
    texts = typed(row)
    return texts | {"do_mg_l": texts["do_mg_l"].replace(".", ",")} if sheet.get("comma") else texts


def _timed(rng, shown, temp, sheet):
    """Return the five values of a timed reading, whose median stands for it, and why they had not settled."""
    values = [f"{shown + step + float(rng.normal(0, VALUE_SD_MG_L)):.2f}" for step in sheet["steps"]]
    text = " ".join(f"{value}@{after}/{temp}" for value, after in zip(values, VALUES_AFTER_S, strict=True))
    return {"do_mg_l": None, "values": text, "soak_s": VALUES_AFTER_S[-1], "unstable_reason": sheet.get("why")}


def rows():
    """Return the rows of the survey's forms, by the file each kind stands in."""
    checks = [
        {"meter": meter, "taken_at": when(at).strftime("%Y-%m-%dT%H:%M"), "kind": kind, **more}
        for meter, kind, at, more in CHECKS
    ]
    return {
        "meters": numbered("meter", METERS),
        "checks": numbered("check", checks),
        "visits": visits((code, when(arrived), when(left), more) for code, arrived, left, more in VISITS),
        "readings": numbered("reading", readings()),
        **_laboratory(),
    }


def _laboratory():
    """Return the rows about bottles, their way to the laboratory and what it found."""
    bottles = [
        {"station": code, "code": label, "analysis": "bod5", "collected_at": when(filled), "on_ice_at": when(on_ice),
         "volume_ml": "1000", "full": "yes", **more}
        for label, code, filled, on_ice, more in BOTTLES
    ]  # fmt: skip
    results = [
        {"bottle_id": f"bottle {number}", "laboratory": "Sedge laboratory", "lab_number": f"26-07-{410 + number}",
         "method": "5-day dilution", "arrived_at": when("+09:50"), "arrival_temp_c": "4.6", "started_at": SET_UP,
         "finished_at": DONE, "result": result, "limit_value": "2", **RUN, **more}
        for number, result, more in RESULTS
    ]  # fmt: skip
    return {
        "bottles": numbered("bottle", [typed(row) for row in bottles]),
        "hand_overs": numbered("hand-over", [typed({**row, "at": when(row["at"])}) for row in HAND_OVERS]),
        "results": numbered("result", [typed(row) for row in results]),
    }
