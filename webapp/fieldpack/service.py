"""The field pack: what a phone carries of one survey, so that the on-site check works without signal."""

from calc.units import FOOT_M
from webapp.display import Show
from webapp.fieldpack.tables import pressure_tables, saturation_tables
from webapp.fieldsheet.service import sheet_of
from webapp.readings.asking import thresholds
from webapp.readings.columns import PRESSURE_UNITS
from webapp.readings.expected import prediction_or_reasons
from webapp.sag.estimate import estimate_of

# Bumped when an older page could not read the pack.
PACK_VERSION = 1
SAG = ("km", "travel_h", "do", "low", "high", "deficit")
TODAY = ("km", "do", "low", "high")


def pack_of(survey, plan, settings_version, readings, made_at):
    """Return the field pack as plain lists and numbers, SI, times in the survey's zone as a form takes them.

    sag holds columns by distance: travel time, the oxygen predicted with its 90 % band, the deficit; today the same
    of today's sag where readings gave one. Both are None without a prediction.
    """
    show, settings = Show.of(survey), thresholds(settings_version)
    prediction, missing = prediction_or_reasons(survey, plan)
    stops = sheet_of(survey, plan, readings).stops
    sag = _sag(prediction, [stop.distance_km for stop in stops]) if prediction else None
    return {
        "v": PACK_VERSION,
        "survey": survey.id,
        "name": survey.name,
        "plan": plan.number if plan else 0,
        "made_at": round(made_at.timestamp() * 1000),
        "missing": " ".join(missing),
        "release_at": show.typed_time(survey.release_at) if survey.sampling == "same_parcel" else "",
        "parcel_h": settings.parcel_h,
        "parcel_share": settings.parcel_percent / 100,
        "criterion": survey.do_criterion_mg_l,
        "stable_values": max(1, round(settings.stable_values)),
        "wading": _wading(settings),
        "stations": [{"code": stop.code, "km": stop.distance_km, "place": stop.place} for stop in stops],
        "sag": sag,
        "today": _today(survey, plan, settings, readings, sag) if sag else None,
        "typed": {units: _typed(Show(unit_system=units)) for units in ("si", "us")},
        **pressure_tables(survey.elevation_m),
        **saturation_tables(),
    }


def _sag(prediction, stations_km):
    """Return the predicted sag by distance, with every station an entry of its own: there nothing is interpolated."""
    river = prediction.river
    inside = [km for km in stations_km if river.from_km <= km <= river.to_km]
    found = prediction.along(sorted({*prediction.grid_km.tolist(), *inside}))
    rows = [
        (one.distance_km, one.travel_time_h, one.do_mg_l, one.low_mg_l, one.high_mg_l, one.deficit_mg_l)
        for one in found
    ]
    return _columns(SAG, rows, digits=(6, 4, 3, 3, 3, 3))


def _today(survey, plan, settings, readings, sag):
    """Return today's sag at the places of the predicted one, from its first to the last it holds for."""
    today = estimate_of(survey, plan, settings, readings)
    if not today.ready or not today.enough:
        return None
    found = [(km, today.at(km)) for km in sag["km"]]
    rows = [(km, one.do_mg_l, one.low_mg_l, one.high_mg_l) for km, one in found if one]
    return _columns(TODAY, rows, digits=(6, 3, 3, 3))


def _columns(names, rows, digits):
    columns = zip(*rows, strict=True)
    return {
        name: [round(value, places) for value in values]
        for name, values, places in zip(names, columns, digits, strict=True)
    }


def _typed(show):
    """Return how a number typed in these units becomes SI: value times scale, plus shift."""
    lines = {
        "water_temp_c": _line(lambda value: show.to_si("temperature", value)),
        "conductance_us_cm": _line(lambda value: show.to_si("conductance", value)),
        "wading_depth_m": _line(lambda value: show.to_si("depth", value)),
        "wading_velocity_m_s": _line(lambda value: show.to_si("velocity", value)),
    }
    return lines | {
        unit: _line(lambda value, unit=unit: show.to_si("pressure", value, unit)) for unit in PRESSURE_UNITS
    }


def _wading(settings):
    """Return the limits of depth times velocity and of depth, and how many ft²/s a m²/s is. [m²/s, m]"""
    return {
        "stop": settings.wading_stop_m2_s,
        "caution": settings.wading_caution_m2_s,
        "depth": settings.wading_depth_m,
        "ft2": round(1 / FOOT_M**2, 6),
    }


def _line(to_si):
    shift = to_si(0.0)
    return {"shift": shift, "scale": (to_si(100.0) - shift) / 100}
