"""What is odd about a reading: asked about once before it is stored, told again whenever it is shown."""

from datetime import timedelta

from calc.findings import Finding
from calc.quality import ReadingContext, ReadingValues, reading_findings
from calc.quality_day import anchor_moved
from calc.units import convert
from webapp.readings.service import oxygen_of, station_pressure_of, velocity_of
from webapp.readings.settling import stability_of, thresholds

__all__ = ["findings_on_new", "findings_on_stored", "thresholds", "to_ask"]

# The crew knows what the clock says: a reading of this moment is late or early, not mistyped.
THIS_MOMENT = timedelta(minutes=15)
OF_THE_RUN = {"early_for_parcel", "late_for_parcel", "snapshot_long"}
# What is told beside a reading and holds nothing back: nobody at the water can change it.
TOLD = {"diel", "position_poor"}


def findings_on_new(survey, settings, new, around, now, meters=()):
    """Return every finding on a reading that is not stored yet; meters are those of the survey."""
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
        position_radius_m=new.position_radius_m,
        ph=new.ph,
        stability=stability_of(new.series, settings),
    )
    context = _context(survey, around, station_pressure_of(new, survey.elevation_m), new.taken_at, now)
    findings = reading_findings(values, context, settings) + _since_the_anchor(do, around, settings)
    return findings + meter_findings(new.meter, meters)


def findings_on_stored(survey, settings, reading, around, now, *, source="standard", platform="", **known):
    """Return every finding on a reading as it stands, a FinalReading; its pressure is that of the station already.

    source is where the pressure came from; a value read at the water is held against the elevation again. platform is
    what the crew stood on, where its visit says so: limits of wading are for those who wade or may. known is
    what else calc's ReadingContext takes: bracket, air_temp_c, saturation_mg_l.
    """
    read_here = source in ("meter", "barometer")
    values = ReadingValues(
        do_mg_l=reading.do_mg_l,
        water_temp_c=reading.water_temp_c,
        depth_m=reading.depth_m,
        do_percent_meter=reading.do_percent,
        conductance_us_cm=reading.conductance_us_cm,
        pressure_mmhg=reading.pressure_mmhg if read_here else None,
        pressure_value=reading.pressure_mmhg if read_here else None,
        pressure_source=source if read_here else "none",
        sensor_depth_m=reading.sensor_depth_m,
        velocity_m_s=reading.velocity_m_s,
        position=reading.position,
        position_radius_m=reading.position_radius_m,
        platform=platform,
        ph=reading.ph,
        stability=stability_of(reading.series, settings),
    )
    context = _context(survey, around, reading.pressure_mmhg, reading.taken_at, now, **known)
    findings = reading_findings(values, context, settings)
    return findings + _since_the_anchor(reading.do_mg_l, around, settings)


def _since_the_anchor(do_mg_l, around, settings):
    return anchor_moved(around.anchor.do_mg_l, do_mg_l, settings) if around.anchor else ()


def meter_findings(name, meters):
    """Return a finding where a meter is none of the survey's, or is out of service."""
    if not name or not meters:
        return ()
    known = [one for one in meters if one.name.casefold() == name.casefold()]
    if known and not all(one.out_of_service for one in known):
        return ()
    cause = "Another meter is in use, or its name was written otherwise."
    if known:
        says, do = f"{name} is out of service.", "Take another meter, or have the lead or the office put it in service."
    else:
        says, do = f"{name} is no meter of this survey.", "Choose it from the list, or register it on the meters page."
    return (Finding("meter_out_of_service" if known else "meter_unknown", "meter", says, cause, do),)


def to_ask(findings, new, now, saved_at=None):
    """Return the findings to ask about: not the hazards, and not the pace of the day where the clock is right.

    saved_at is when it was saved on a phone without signal. Hours later nobody stands at the water to answer: what is
    odd is then told beside the reading, and holds nothing back.
    """
    saved_at = saved_at or now
    if now - saved_at > THIS_MOMENT:
        return []
    timely = abs(saved_at - new.taken_at) <= THIS_MOMENT
    leave = TOLD | OF_THE_RUN if timely else TOLD
    return [one for one in findings if not one.hazard and one.name not in leave]


def _context(survey, around, pressure_mmhg, taken_at, now, **known):
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
        **known,
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
