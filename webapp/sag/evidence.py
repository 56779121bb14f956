"""Which readings an estimate goes by: visits told apart, and a section across the river taken as one."""

from dataclasses import dataclass

from webapp.readings.layers import final
from webapp.readings.surroundings import OCCASION, distances_of


@dataclass(frozen=True)
class Counted:
    """One value that counts: a reading, or the mean of a section across the river. visit tells occupations apart."""

    code: str
    distance_km: float
    do_mg_l: float
    water_temp_c: float | None
    meter: str
    visit: str


@dataclass(frozen=True)
class Visit:
    """One occupation of one station with one meter: its readings that count, in the order they were taken."""

    code: str
    label: str
    meter: str
    readings: tuple

    @property
    def by_position(self):
        """Return the readings by where across the river they were taken; not noted counts as the centre."""
        found = {}
        for one in self.readings:
            found.setdefault(one.position or "centre", []).append(one)
        return found

    @property
    def is_section(self):
        """Return whether more than one place across the river was read."""
        return len(self.by_position) > 1

    @property
    def is_replicated(self):
        """Return whether one place was read more than once."""
        return any(len(here) > 1 for here in self.by_position.values())


def visits_of(readings, codes):
    """Return the Visits of readings with oxygen that are not set aside, at the stations of these codes, in time order.

    Readings of one station with one meter, each within two hours of the one before, are one visit.
    """
    grouped, last = {}, {}
    counts = [one for one in map(final, readings) if not one.set_aside and one.do_mg_l is not None]
    for one in sorted((one for one in counts if one.station_code in codes), key=lambda one: (one.taken_at, one.id)):
        who = (one.station_code, one.meter)
        before = last.get(who)
        number = before[0] if before else 0
        if before is None or one.taken_at - before[1] > OCCASION:
            number += 1
        last[who] = (number, one.taken_at)
        grouped.setdefault((*who, number), []).append(one)
    return [Visit(code, f"{code} {number}", meter, tuple(found)) for (code, meter, number), found in grouped.items()]


def counted(readings, plan_version):
    """Return what counts, as a tuple of Counted in the order it was read.

    The places of a section differ because the river is not mixed there, which is no scatter of the meter: their mean
    counts. Readings repeated at one place stay apart, so that their scatter tells the error of a reading.
    """
    distances = distances_of(plan_version)
    found = []
    for visit in visits_of(readings, distances):
        rows = [_mean(visit)] if visit.is_section else [(one.do_mg_l, one.water_temp_c) for one in visit.readings]
        found += [Counted(visit.code, distances[visit.code], *row, visit.meter, visit.label) for row in rows]
    return tuple(found)


def _mean(visit):
    """Return oxygen and temperature averaged over the places of a section, each place's repeats first."""
    places = visit.by_position.values()
    oxygen = _average([_average([one.do_mg_l for one in here]) for here in places])
    celsius = [one.water_temp_c for one in visit.readings if one.water_temp_c is not None]
    return oxygen, _average(celsius) if celsius else None


def _average(values):
    return sum(values) / len(values)
