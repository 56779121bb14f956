"""The on-site check: what a stored reading says, computed anew whenever it is shown."""

import math
from dataclasses import dataclass

from calc.errors import OutOfRangeError
from calc.findings import Finding
from calc.oxygen import salinity_psu, saturation_mg_l
from webapp.readings.asking import OF_THE_RUN, findings_on_stored
from webapp.readings.layers import FinalReading, final
from webapp.readings.meaning import ABOVE, FALLING, LOWEST, RISING, Facts, afterwards, sentence
from webapp.readings.repeats import Repeat, repeat_of
from webapp.readings.settling import spread_of
from webapp.readings.surroundings import Surroundings, distances_of, look_around

# A sag is flat: as near to its lowest as a meter can tell.
FLAT_MG_L = 0.2
PRESSURE_FROM = {
    "meter": "read on the meter",
    "barometer": "read on a barometer",
    "weather": "from a weather report, converted to this elevation",
    "standard": "not read: standard for the elevation",
}


@dataclass(frozen=True)
class OnSiteCheck:
    """What the check shows, in SI, None where it can't be told; what is predicted is at the measured temperature.

    kept holds {"name", "says"} of the findings that the crew was asked about; findings are those of today's settings,
    hazards the ones about people. spread is calc's Stability of the several raw values, repeat what a replicate shows.
    """

    reading: FinalReading
    around: Surroundings
    pressure_mmhg: float | None
    pressure_from: str
    salinity_psu: float | None
    salinity_from: str
    saturation_mg_l: float | None
    percent: float | None
    deficit_mg_l: float | None
    oxygen_from_percent: bool
    predicted_mg_l: float | None
    low_mg_l: float | None
    high_mg_l: float | None
    difference_mg_l: float | None
    timing: str
    sentence: str
    afterwards: tuple[str, ...]
    findings: tuple[Finding, ...]
    hazards: tuple[Finding, ...]
    kept: tuple[dict, ...]
    repeat: Repeat | None = None
    spread: object = None

    @property
    def unasked(self):
        """Return the findings that nobody was asked about: of an import, or of what was read since."""
        asked = {one["name"] for one in self.kept} | OF_THE_RUN
        return tuple(one for one in self.findings if one.name not in asked)


def on_site_check(survey, plan_version, settings, reading, readings, platform=""):
    """Return the OnSiteCheck of a stored reading; settings are calc's, readings all of the survey, itself included.

    platform is what the crew stood on, where its visit says so.
    """
    now = final(reading)
    around = look_around(
        survey, plan_version, now.station_code, now.taken_at, readings, now.id, replicate=reading.replicate
    )
    salinity, salinity_from = _salinity(now.conductance_us_cm)
    saturation = saturation_of(now.water_temp_c, now.pressure_mmhg, salinity)
    both = saturation is not None and now.do_mg_l is not None
    percent = 100 * now.do_mg_l / saturation if both else None
    predicted, low, high = at_measured_temperature(around.expected, saturation)
    facts = _facts(survey, settings, now, around, percent, (predicted, low, high))
    facts = facts and _with_lowest(facts, now, plan_version, readings)
    findings = findings_on_stored(survey, settings, now, around, reading.received_at, platform=platform)
    return OnSiteCheck(
        reading=now,
        around=around,
        pressure_mmhg=now.pressure_mmhg,
        pressure_from=_pressure_from(reading, now),
        salinity_psu=salinity,
        salinity_from=salinity_from,
        saturation_mg_l=saturation,
        percent=percent,
        deficit_mg_l=saturation - now.do_mg_l if both else None,
        oxygen_from_percent="do_mg_l" not in reading.entered and "do_percent" in reading.entered,
        predicted_mg_l=predicted,
        low_mg_l=low,
        high_mg_l=high,
        difference_mg_l=facts.difference if facts else None,
        timing=_timing(around, settings),
        sentence=sentence(facts) if facts else "No oxygen was read here.",
        afterwards=afterwards(facts) if facts else (),
        findings=tuple(one for one in findings if not one.hazard),
        hazards=tuple(one for one in findings if one.hazard and _worth_telling(one, now, settings)),
        kept=tuple(reading.kept_findings),
        repeat=repeat_of(now, around.repeats, settings),
        spread=spread_of(now.series, settings),
    )


def saturation_of(water_temp_c, pressure_mmhg, salinity):
    """Return saturation, None where a value is missing or outside the equation's range. [mg/L]"""
    if None in (water_temp_c, pressure_mmhg, salinity):
        return None
    try:
        return float(saturation_mg_l(water_temp_c, pressure_mmhg, salinity))
    except OutOfRangeError:
        return None


def _salinity(conductance_us_cm):
    if conductance_us_cm is None:
        return 0.0, "fresh water assumed"
    try:
        return float(salinity_psu(conductance_us_cm)), "from conductance"
    except OutOfRangeError:
        return None, "the conductance is beyond its equation"


def _pressure_from(reading, now):
    corrected = now.pressure_mmhg != now.raw["pressure_mmhg"]
    return "corrected afterwards" if corrected else PRESSURE_FROM.get(reading.pressure_source, "")


def at_measured_temperature(expected, saturation):
    """Return prediction and band at the measured temperature: saturation there less the predicted deficit. [mg/L]

    Oxygen never runs below zero, so where the plan has none in warmer water it has none in colder water either.
    """
    if expected is None or saturation is None or not math.isfinite(expected.do_mg_l):
        return None, None, None
    shift = saturation - expected.deficit_mg_l - expected.do_mg_l
    return tuple(max(0.0, value + shift) for value in (expected.do_mg_l, expected.low_mg_l, expected.high_mg_l))


def _facts(survey, settings, now, around, percent, band):
    if now.do_mg_l is None:
        return None
    upstream, downstream = around.upstream, around.downstream
    return Facts(
        code=now.station_code,
        do_mg_l=now.do_mg_l,
        percent=percent,
        predicted_mg_l=band[0],
        low_mg_l=band[1],
        high_mg_l=band[2],
        limb=_limb(around),
        missing=around.missing[0] if around.missing else "",
        upstream_code=upstream.code if upstream else "",
        upstream_do_mg_l=upstream.reading.do_mg_l if upstream else None,
        upstream_difference=_difference(upstream),
        downstream_code=downstream.code if downstream else "",
        downstream_difference=_difference(downstream),
        criterion_mg_l=survey.do_criterion_mg_l,
        nothing_below_mg_l=settings.oxygen_low_mg_l,
    )


def _limb(around):
    if around.above_outfall:
        return ABOVE
    if around.expected is None:
        return None
    critical = around.prediction.critical
    if around.expected.do_mg_l <= critical.do_mg_l + FLAT_MG_L:
        return LOWEST
    return FALLING if around.distance_km < critical.distance_km else RISING


def _difference(neighbour):
    """Return read less predicted at a neighbour. [mg/L]"""
    if neighbour is None or neighbour.expected is None or neighbour.reading.do_mg_l is None:
        return None
    return neighbour.reading.do_mg_l - neighbour.expected.do_mg_l


def _with_lowest(facts, now, plan_version, readings):
    """Return the facts, saying so where this is the lowest used reading and none lies beyond it."""
    distances = distances_of(plan_version)
    here = distances.get(now.station_code)
    others = [
        (distances[one.station_code], one.do_mg_l)
        for one in map(final, readings)
        if one.id != now.id and not one.set_aside and one.do_mg_l is not None
        if one.station_code != now.station_code and distances.get(one.station_code, -1) >= 0
    ]
    if now.set_aside or here is None or here < 0 or not others or min(do for _, do in others) <= now.do_mg_l:
        return facts
    if here > max(place for place, _ in others):
        return _replaced(facts, "last")
    return _replaced(facts, "first") if here < min(place for place, _ in others) else facts


def _replaced(facts, lowest_at):
    return Facts(**{**vars(facts), "lowest_at": lowest_at})


def _timing(around, settings):
    """Return how the reading sits to the parcel of water that is followed: "early", "late", "on time" or nothing."""
    if around.hours_late is None:
        return ""
    tolerance = max(settings.parcel_h, settings.parcel_percent / 100 * around.travel_time_h)
    if abs(around.hours_late) <= tolerance:
        return "on time"
    return "late" if around.hours_late > 0 else "early"


def _worth_telling(hazard, now, settings):
    """Return whether a hazard is to be told with each reading: cold water is, where it needs clothing for immersion."""
    return hazard.name != "cold_water" or now.water_temp_c < settings.very_cold_water_c
