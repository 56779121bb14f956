"""Storing readings, each once, with the station pressure and oxygen that follow from what was read."""

from dataclasses import asdict

from sqlalchemy.exc import IntegrityError

from calc.errors import OutOfRangeError
from calc.oxygen import concentration_mg_l, salinity_psu, standard_pressure_mmhg, station_pressure_mmhg
from calc.travel import mean_velocity_from_float_m_s
from webapp.errors import Conflict
from webapp.models import Reading
from webapp.readings import queries
from webapp.readings.new import NewReading
from webapp.readings.settling import settle, thresholds
from webapp.surveys.queries import current_settings
from webapp.surveys.service import remember

__all__ = ["NewReading", "add_reading", "oxygen_of", "put_reading", "station_pressure_of", "velocity_of"]

# What a repeat must share with the stored reading; what is converted on the way is compared as it was typed.
_CONTENT = (
    "taken_at",
    "water_temp_c",
    "depth_m",
    "do_percent",
    "percent_basis",
    "conductance_us_cm",
    "pressure_source",
    "position",
    "sensor_depth_m",
    "velocity_method",
    "meter",
    "replicate",
    "note",
    "latitude",
    "longitude",
    "position_radius_m",
    "ph",
    "unstable_reason",
    "distance_left_m",
)
_AS_TYPED = ("do_mg_l", "values", "pressure", "velocity_m_s", "float_distance", "float_time_s")


def add_reading(db, survey, new, by_id, plan_version, received_at):
    """Store the reading once, however often it is sent, and return the stored one.

    Raises NotFound for a station the survey never had, Conflict where the id is that of another reading.
    """
    reading = put_reading(db, survey, new, by_id, plan_version, received_at)
    try:
        db.commit()
    except IntegrityError:  # two processes took the same reading at once
        db.rollback()
        reading = _the_same(queries.find_reading(db, new.id), survey, new)
    return reading


def put_reading(db, survey, new, by_id, plan_version, received_at):
    """Do what add_reading does, without the commit: for a caller that stores many or none."""
    if (stored := queries.find_reading(db, new.id)) is not None:
        return _the_same(stored, survey, new)
    station = queries.get_station(db, survey.id, new.station_code)
    if new.series:
        new = settle(new, thresholds(current_settings(db, survey.id)))
    values = asdict(new)
    del values["station_code"], values["surface_velocity_m_s"]
    values["kept_findings"], values["series"] = list(new.kept_findings), list(new.series)
    values["pressure_mmhg"] = station_pressure_of(new, survey.elevation_m)
    values["do_mg_l"] = oxygen_of(new, survey.elevation_m)
    values["velocity_m_s"] = velocity_of(new)
    reading = Reading(
        survey_id=survey.id,
        station_id=station.id,
        plan_version_id=plan_version.id,
        author_id=by_id,
        received_at=received_at,
        events=[],
        **values,
    )
    reading.station = station
    remember(db, survey.id, by_id, "reading saved", "reading", new.id)
    db.add(reading)
    return reading


def station_pressure_of(new, elevation_m):
    """Return the air pressure at the station. [mmHg]

    A weather report's is un-reduced from sea level; where none was read, that of the standard atmosphere. A value that
    can't be un-reduced is no sea-level pressure: it is used as it is, and the checks ask about it.
    """
    if new.pressure_mmhg is None:
        return float(standard_pressure_mmhg(elevation_m))
    if new.pressure_source != "weather":
        return new.pressure_mmhg
    try:
        return float(station_pressure_mmhg(new.pressure_mmhg, elevation_m))
    except OutOfRangeError:
        return new.pressure_mmhg


def oxygen_of(new, elevation_m):
    """Return oxygen as read, or from the meter's percent where only that was; None where it can't be told. [mg/L]"""
    if new.do_mg_l is not None or new.do_percent is None or new.water_temp_c is None:
        return new.do_mg_l
    pressure = 760.0 if new.percent_basis == "760" else station_pressure_of(new, elevation_m)
    try:
        salinity = 0.0 if new.conductance_us_cm is None else float(salinity_psu(new.conductance_us_cm))
        return float(concentration_mg_l(new.do_percent, new.water_temp_c, pressure, salinity))
    except OutOfRangeError:
        return None


def velocity_of(new):
    """Return the mean velocity: as measured, or 0.85 of a surface float's. [m/s]"""
    if new.surface_velocity_m_s is None:
        return new.velocity_m_s
    return float(mean_velocity_from_float_m_s(new.surface_velocity_m_s))


def _the_same(stored, survey, new):
    """Return the stored reading if the new one repeats it. Raises Conflict."""
    if stored.survey_id != survey.id:
        raise Conflict("Another survey holds a reading with this form's id. Open the form again.")
    if stored.station.code != new.station_code or _content(stored) != _content(new):
        raise Conflict(
            f"This form's reading at {stored.station.code} is stored already, with other values. "
            "It was not changed. To record another reading, open the form again; to correct the stored one, "
            "ask the lead or the office."
        )
    return stored


def _content(reading):
    typed = [(reading.entered.get(name) or {}).get("text") for name in _AS_TYPED]
    return [getattr(reading, name) for name in _CONTENT] + typed
