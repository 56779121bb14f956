"""What visits say about the day: the water rising or falling, rain, thunder, and wading that nobody should do."""

from dataclasses import dataclass
from datetime import timedelta

from calc.findings import Finding
from calc.quality_day import flow_changed, rained, stage_changed
from calc.quality_visit import wading
from calc.units import FOOT_M

# What was seen longer ago than this says little about the water now.
A_DAY = timedelta(hours=24)


@dataclass(frozen=True)
class Change:
    """How a number of a visit differs from that of an earlier visit to the same station."""

    name: str
    since: object
    difference: float


@dataclass(frozen=True)
class Seen:
    """What is worth knowing of one visit: findings, the hazards first, and how stage and flow changed since when."""

    findings: tuple
    changes: tuple[Change, ...]


@dataclass(frozen=True)
class Wading:
    """What is to be said to whoever would wade: findings, else a sentence, which is empty where nothing is known."""

    findings: tuple
    says: str = ""


def judged_wading(depth_m, velocity_m_s, settings):
    """Return the Wading of a depth and a velocity, either of which may be None."""
    findings = wading(depth_m, velocity_m_s, settings)
    if findings or depth_m is None or velocity_m_s is None:
        return Wading(findings)
    return Wading(
        (),
        f"Depth times velocity is {_both(depth_m * abs(velocity_m_s))}. That is below the limits, which is no "
        "permission: bed, cold, debris and experience decide.",
    )


def wading_limits(settings):
    """Return the limits of wading in a sentence, before anybody is in the water."""
    return (
        f"Depth times velocity of {_both(settings.wading_stop_m2_s, 0)} or more: do not wade. The project's own limits "
        f"are {_both(settings.wading_caution_m2_s)}, and {settings.wading_depth_m:.2f} m of depth."
    )


def _both(product_m2_s, digits=1):
    return f"{product_m2_s:.2f} m²/s ({product_m2_s / FOOT_M**2:.{digits}f} ft²/s)"


def seen_at(visit, visits, settings):
    """Return what is Seen of a FinalVisit, in the light of the earlier ones to its station."""
    facts = visit.facts
    findings = list(_of_the_crew(facts, settings))
    changes = []
    for name, judge in (("stage_m", stage_changed), ("flow_m3_s", flow_changed)):
        earlier = _earlier(visit, visits, name)
        if facts.get(name) is None or not earlier:
            continue
        first, last = earlier[0], earlier[-1]
        for since in (first,) if first is last else (last, first):
            changes.append(Change(name, since, facts[name] - since.facts[name]))
        found = [judge(since.facts[name], facts[name], settings) for since in (first, last)]
        findings.extend(next((one for one in found if one), ()))
    findings.extend(rained(facts.get("rain_mm"), settings))
    return Seen(tuple(findings), tuple(changes))


def _of_the_crew(facts, settings):
    """Return the findings about people: they come before those about the water."""
    yield from judged_wading(facts.get("wading_depth_m"), facts.get("wading_velocity_m_s"), settings).findings
    if facts.get("weather") == "thunder":
        yield Finding(
            "thunder",
            "weather",
            "Thunder was noted.",
            "Water and its banks are the worst place in a thunderstorm.",
            "Off the water at once, and not back until 30 minutes after the last thunder.",
            hazard=True,
        )


def _earlier(visit, visits, name):
    """Return the visits to the same station that began before and told a number, the first first."""
    if visit.arrived_at is None:
        return []
    there = [one for one in visits if one.station_code == visit.station_code and one.id != visit.id]
    there = [one for one in there if one.arrived_at and one.arrived_at < visit.arrived_at]
    return sorted((one for one in there if one.facts.get(name) is not None), key=lambda one: one.arrived_at)


def news_of_the_day(visits, settings):
    """Return (visit, finding) of what the latest visits noticed: of each station its last visit of the latest day."""
    known = sorted((one for one in visits if one.arrived_at), key=lambda one: one.arrived_at)
    latest = {one.station_code: one for one in known if known[-1].arrived_at - one.arrived_at < A_DAY}
    news = [(one, finding) for one in latest.values() for finding in seen_at(one, known, settings).findings]
    news = [(one, finding) for one, finding in news if finding.name not in ("do_not_wade", "wading_caution")]
    return sorted(news, key=lambda pair: (not pair[1].hazard, pair[0].station_code))
