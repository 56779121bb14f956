"""Which points of the section are still to be read at a station, and why; what is known there beforehand."""

from dataclasses import dataclass

from calc.findings import Finding
from calc.quality_section import depths_wanted
from calc.quality_visit import wading
from webapp.readings.occasions import vertical_of
from webapp.readings.surroundings import NEIGHBOURLY

BOAT = "boat"
ACROSS = ("left", "centre", "right")
# A section at the first stations below whatever joins the river, and again at every so many once it is mixed.
FIRST_BELOW = 2
EVERY = 5
# How far from a wanted depth a sensor may hang: a tenth of the depth of the water, within these. [m]
_NEAR_M, _FAR_M, _NEAR_SHARE = 0.1, 0.2, 0.1


@dataclass(frozen=True)
class Point:
    """A point of the section to read next; sensor_depth_m is None where the depth there is not known yet."""

    position: str
    distance_left_m: float | None = None
    sensor_depth_m: float | None = None


@dataclass(frozen=True)
class Before:
    """What is known of a station before it is read, in SI: depth where one was read or is planned, hazards of wading.

    measured says whether the depth was read here; depths_m are those to hang the sensor at.
    """

    depth_m: float | None
    measured: bool
    depths_m: tuple[float, ...]
    hazards: tuple[Finding, ...]


def section_reason(plan_version, prediction, occasions, code):
    """Return why left, centre and right are wanted at a station, as a sentence; empty where one point will do.

    occasions are all of the survey.
    """
    tables = plan_version.tables if plan_version else {}
    below = _stations_below(tables)
    here = next((km for km, one in below if one == code), None)
    if here is None:
        return ""
    inflow_km, inflow = max((one for one in _inflows(tables) if one[0] <= here), key=lambda one: one[0])
    since = [one for km, one in below if inflow_km <= km]
    place = since.index(code)
    if place < FIRST_BELOW:
        return f"This is one of the first {FIRST_BELOW} stations below {inflow}."
    if prediction is not None and _nearest(below, prediction.critical.distance_km) == code:
        return "The low point is predicted nearest to here."
    mixed = [at for at, one in enumerate(since[:place]) if _shown_mixed(occasions, one)]
    if not mixed:
        return f"No station between {inflow} and here was shown to be mixed yet."
    return f"Every {EVERY}th station is checked across." if (place - mixed[0]) % EVERY == 0 else ""


def points_left(reading, occasion, across, settings, boat=False):
    """Return the Points still to read on the occasion of a reading, those of its own vertical first.

    across says whether left, centre and right are wanted. A vertical that nobody told counts as the only one. From a
    boat, and where top and bottom differ, deep water is read as a profile.
    """
    used = [one for one in occasion.readings if not one.set_aside]
    own = [one for one in used if vertical_of(one) == vertical_of(reading)]
    wanted = depths_wanted(reading.depth_m, settings, still=boat or bool(occasion.layers.stratified))
    deep = wanted if len(wanted) > 1 else ()
    left = [
        Point(reading.position, reading.distance_left_m, depth)
        for depth in deep
        if not any(_at_depth(one, depth, reading.depth_m) for one in own)
    ]
    if across:
        read = {one.position for one in used}
        left += [Point(position) for position in ACROSS if position not in read]
    return tuple(left)


def before_reading(plan_version, prediction, occasions, settings, code, now):
    """Return the Before of a station; occasions are those there."""
    row = next((one for one in (plan_version.tables["stations"] if plan_version else ()) if one["code"] == code), None)
    expected = prediction.at(row["distance_km"]) if prediction and row else None
    recent = [one for visited in occasions for one in visited.readings if now - one.taken_at <= NEIGHBOURLY]
    read = next((one for one in reversed(recent) if one.depth_m is not None), None)
    depth = read.depth_m if read else getattr(expected, "depth_m", None)
    hazards = [one for known in _waded(recent, occasions) for one in wading(*known, settings)][:1]
    if not hazards and expected is not None:
        planned = wading(expected.depth_m, _planned_velocity(prediction, row["distance_km"]), settings)
        hazards = [one for one in planned if one.name == "do_not_wade"]
    visits = [one.visit for one in occasions if one.visit is not None]
    boat = bool(visits) and visits[-1].facts.get("platform") == BOAT
    return Before(depth, read is not None, depths_wanted(depth, settings, still=boat), tuple(hazards))


def _waded(recent, occasions):
    """Return the (depth, velocity) pairs that somebody measured here, the latest first."""
    known = [(one.depth_m, one.velocity_m_s) for one in reversed(recent)]
    facts = [one.visit.facts for one in reversed(occasions) if one.visit is not None]
    known = [(one.get("wading_depth_m"), one.get("wading_velocity_m_s")) for one in facts] + known
    return [pair for pair in known if None not in pair][:1]


def _planned_velocity(prediction, distance_km):
    for reach in prediction.river.reaches:
        if reach.from_km <= distance_km <= reach.to_km:
            return reach.velocity_m_s
    return None


def _stations_below(tables):
    rows = [one for one in tables.get("stations", ()) if one["distance_km"] >= 0 and one.get("state") != "dropped"]
    return sorted((one["distance_km"], one["code"]) for one in rows)


def _inflows(tables):
    """Return (distance, name) of the outfall and of whatever else joins the river below it. [km]"""
    joins = [one for one in tables.get("waters", ()) if one.get("kind") in ("outfall", "tributary")]
    named = [(one.get("distance_km") or 0.0, one.get("name") or "an inflow") for one in joins]
    return [(0.0, "the outfall"), *(one for one in named if one[0] > 0)]


def _nearest(stations, distance_km):
    return min(stations, key=lambda one: abs(one[0] - distance_km))[1]


def _shown_mixed(occasions, code):
    verdicts = [one.section.mixed for one in occasions if one.station_code == code and one.section.mixed is not None]
    return bool(verdicts) and verdicts[-1]


def _at_depth(reading, wanted_m, depth_m):
    if reading.sensor_depth_m is None:
        return False
    return abs(reading.sensor_depth_m - wanted_m) <= min(max(_NEAR_M, _NEAR_SHARE * depth_m), _FAR_M)
