"""What is odd about a reading: asked about once before it is stored, told again whenever it is shown."""

from datetime import timedelta

from calc.quality import ReadingContext, ReadingValues, reading_findings
from calc.settings import Settings
from calc.units import convert
from webapp.readings.service import oxygen_of, station_pressure_of, velocity_of

# The crew knows what the clock says: a reading of this moment is late or early, not mistyped.
THIS_MOMENT = timedelta(minutes=15)
OF_THE_RUN = {"early_for_parcel", "late_for_parcel", "snapshot_long"}


def thresholds(settings_version):
    """Return the survey's Settings; the trade's defaults where a survey has none."""
    return Settings.from_dict(settings_version.thresholds) if settings_version else Settings()


def findings_on_new(survey, settings, new, around, now):
    """Return every finding on a reading that is not stored yet."""
    do, velocity = oxygen_of(new, survey.elevation_m), velocity_of(new)
    unit = (new.entered.get("pressure") or {}).get("unit", "mm[Hg]")
    values = ReadingValues(
        do_mg_l=do,
        water_temp_c=new.water_temp_c,
        depth_m=new.depth_m,
        # a percent that the oxygen came from can't disagree with it
        do_percent_meter=new.do_percent if new.do_mg_l is not None else None,
        conductance_us_cm=new.conductance_us_cm,
        pressure_mmhg=new.pressure_mmhg,
        pressure_value=None if new.pressure_mmhg is None else float(convert(new.pressure_mmhg, "mm[Hg]", unit)),
        pressure_unit=unit,
        pressure_source="none" if new.pressure_source == "standard" else new.pressure_source,
        sensor_depth_m=new.sensor_depth_m,
        velocity_m_s=velocity,
        position=new.position,
    )
    context = _context(survey, around, station_pressure_of(new, survey.elevation_m), new.taken_at, now)
    return reading_findings(values, context, settings)


def findings_on_stored(survey, settings, reading, around, now):
    """Return every finding on a reading as it stands, a FinalReading; its pressure is that of the station already."""
    values = ReadingValues(
        do_mg_l=reading.do_mg_l,
        water_temp_c=reading.water_temp_c,
        depth_m=reading.depth_m,
        do_percent_meter=reading.do_percent,
        conductance_us_cm=reading.conductance_us_cm,
        sensor_depth_m=reading.sensor_depth_m,
        velocity_m_s=reading.velocity_m_s,
    )
    return reading_findings(values, _context(survey, around, reading.pressure_mmhg, reading.taken_at, now), settings)


def to_ask(findings, new, now, saved_at=None):
    """Return the findings to ask about: not the hazards, and not the pace of the day where the clock is right.

    saved_at is when it was saved on a phone without signal. Hours later nobody stands at the water to answer: what is
    odd is then told beside the reading, and holds nothing back.
    """
    saved_at = saved_at or now
    if now - saved_at > THIS_MOMENT:
        return []
    timely = abs(saved_at - new.taken_at) <= THIS_MOMENT
    return [one for one in findings if not one.hazard and not (timely and one.name in OF_THE_RUN)]


def _context(survey, around, pressure_mmhg, taken_at, now):
    expected = around.expected
    return ReadingContext(
        elevation_m=survey.elevation_m,
        station_pressure_mmhg=pressure_mmhg,
        predicted_do_mg_l=getattr(expected, "do_mg_l", None),
        band_low_mg_l=getattr(expected, "low_mg_l", None),
        band_high_mg_l=getattr(expected, "high_mg_l", None),
        predicted_temp_c=getattr(expected, "water_temp_c", None),
        planned_depth_m=getattr(expected, "depth_m", None),
        **_beside("upstream", around.upstream),
        **_beside("downstream", around.downstream),
        hours_late=around.hours_late,
        travel_time_h=around.travel_time_h,
        replicate_do_mg_l=getattr(around.repeats, "do_mg_l", None),
        replicate_temp_c=getattr(around.repeats, "water_temp_c", None),
        replicate_conductance_us_cm=getattr(around.repeats, "conductance_us_cm", None),
        recent_do_mg_l=around.recent_do_mg_l,
        snapshot_span_h=around.run_span_h,
        hours_after_now=_hours(taken_at - now),
        hours_before_survey=_hours(survey.release_at - taken_at) if survey.release_at else None,
    )


def _beside(side, neighbour):
    if neighbour is None:
        return {}
    return {
        f"{side}_do_mg_l": neighbour.reading.do_mg_l,
        f"{side}_predicted_do_mg_l": getattr(neighbour.expected, "do_mg_l", None),
        f"{side}_temp_c": neighbour.reading.water_temp_c,
        f"{side}_conductance_us_cm": neighbour.reading.conductance_us_cm,
    }


def _hours(span):
    return span.total_seconds() / 3600
