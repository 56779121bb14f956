"""Readings at one station by one crew at one time: told by a visit, or by the clock where nobody opened one."""

import math
from dataclasses import dataclass, replace
from datetime import timedelta

from calc.quality_section import Layers, SectionPoint, SectionVerdict, section_verdict, stratification
from webapp.readings.layers import FinalReading
from webapp.readings.surroundings import OCCASION
from webapp.visits.layers import FinalVisit

# Clocks of phones differ, and a crew may read before it opens the visit.
_SLACK = timedelta(minutes=15)
_LONGEST = timedelta(hours=6)
# Across a section that is read within this, the water is taken to be the same.
_ACROSS = {"left": "left", "centre": "centre", "right": "right"}


@dataclass(frozen=True)
class Occasion:
    """One occupation of a station: its readings in time order, its visit where one was opened, its number there.

    section and layers are the verdicts on its readings that are used.
    """

    station_code: str
    visit_no: int
    visit: FinalVisit | None
    readings: tuple[FinalReading, ...]
    section: SectionVerdict
    layers: Layers

    @property
    def started_at(self):
        """Return when it began, or None where a visit says nothing of it."""
        times = [one.taken_at for one in self.readings[:1]]
        if self.visit is not None and self.visit.arrived_at is not None:
            times.append(self.visit.arrived_at)
        return min(times, default=None)

    @property
    def ended_at(self):
        """Return when the last reading was taken or the crew left, or None."""
        times = [one.taken_at for one in self.readings[-1:]]
        if self.visit is not None and self.visit.left_at is not None:
            times.append(self.visit.left_at)
        return max(times, default=None)


def occasions_of(finals, authors, visits, settings, balance):
    """Return the Occasions of a survey in the order of their stations and times.

    finals are FinalReadings in time order, authors the id of who recorded each by reading id, visits FinalVisits,
    balance the conductance expected of the mixed water by station code, where known. [µS/cm]
    """
    by_station = {}
    for one in finals:
        by_station.setdefault(one.station_code, ([], []))[0].append(one)
    for visit in visits:
        by_station.setdefault(visit.station_code, ([], []))[1].append(visit)
    found = []
    for code in sorted(by_station):
        readings, here = by_station[code]
        groups = _grouped(readings, authors, sorted(here, key=_arrival))
        made = [_occasion(code, visit, tuple(some), settings, balance.get(code, math.nan)) for visit, some in groups]
        made.sort(key=lambda one: (one.started_at is None, one.started_at, one.visit.id if one.visit else ""))
        found += [replace(one, visit_no=number) for number, one in enumerate(made, 1)]
    return found


def _arrival(visit):
    return (visit.arrived_at is None, visit.arrived_at, visit.id)


def _grouped(readings, authors, visits):
    """Return [visit or None, readings] for each occupation of one station."""
    of_visit = {visit.id: [] for visit in visits}
    loose = []
    for one in readings:
        visit = _visit_of(one, authors.get(one.id), visits)
        (loose if visit is None else of_visit[visit.id]).append(one)
    groups = [[visit, of_visit[visit.id]] for visit in visits]
    for one in loose:
        if groups and groups[-1][0] is None and one.taken_at - groups[-1][1][-1].taken_at <= OCCASION:
            groups[-1][1].append(one)
        else:
            groups.append([None, [one]])
    return groups


def _visit_of(reading, author_id, visits):
    """Return the latest visit that the reading can belong to, one of its author's before others; None without any."""
    fits = [visit for visit in visits if visit.arrived_at is not None and _holds(visit, reading.taken_at)]
    own = [visit for visit in fits if visit.opened_by_id == author_id]
    return (own or fits or [None])[-1]


def _holds(visit, taken_at):
    last = visit.arrived_at + _LONGEST if visit.left_at is None else visit.left_at + _SLACK
    return visit.arrived_at - _SLACK <= taken_at <= last


def _occasion(code, visit, readings, settings, expected_us_cm):
    points = [
        SectionPoint(
            vertical_of(one),
            one.do_mg_l,
            one.water_temp_c,
            one.conductance_us_cm,
            one.sensor_depth_m,
            one.depth_m,
        )
        for one in readings
        if not one.set_aside
    ]
    section = section_verdict(points, settings, expected_us_cm)
    return Occasion(code, 0, visit, readings, section, stratification(points, settings))


def vertical_of(reading):
    """Return which vertical of the section a reading stands in, empty where nobody said."""
    if reading.distance_left_m is not None:
        return f"{reading.distance_left_m:g} m from the left edge"
    return _ACROSS.get(reading.position, "")
