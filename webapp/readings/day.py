"""What a survey knows at one moment: its plan, settings and readings, each fetched once for the page or the save."""

from datetime import UTC, datetime

from webapp.display import Show
from webapp.meters.queries import meters_of
from webapp.plan.queries import current_plan
from webapp.readings.asking import findings_on_new, thresholds, to_ask
from webapp.readings.check import on_site_check
from webapp.readings.layers import final, placed
from webapp.readings.queries import readings_of
from webapp.readings.settling import settle
from webapp.readings.surroundings import distances_of, look_around
from webapp.sag.estimate import estimate_of
from webapp.sag.moved import against_today
from webapp.surveys.queries import current_settings


class Day:
    """A survey now; readings are FinalReadings, and grow by what is stored meanwhile."""

    def __init__(self, db, survey):
        self.survey = survey
        self.now = datetime.now(UTC)
        self.plan = current_plan(db, survey.id)
        self.settings = thresholds(current_settings(db, survey.id))
        self.readings = [final(one) for one in readings_of(db, survey.id)]
        self.meters = meters_of(db, survey.id)

    def settled(self, new):
        """Return a NewReading with what its several raw values give; None as it is."""
        return new and settle(new, self.settings)

    def asks(self, new, saved_at=None):
        """Return the findings to ask about before this reading is stored: none for one that is stored already.

        saved_at is when a phone without signal saved it.
        """
        if new is None or any(one.id == new.id for one in self.readings):
            return []
        around = look_around(
            self.survey, self.plan, new.station_code, new.taken_at, self.readings, replicate=new.replicate, point=new
        )
        findings = findings_on_new(self.survey, self.settings, new, around, self.now, self.meters)
        return to_ask(findings, new, self.now, saved_at)

    def holds(self, reading):
        """Count a reading that was stored after the others were fetched."""
        if all(one.id != reading.id for one in self.readings):
            self.readings.append(final(reading))

    def check(self, reading):
        """Return the OnSiteCheck of a stored reading."""
        return on_site_check(self.survey, self.plan, self.settings, reading, self.readings)

    def today(self):
        """Return today's sag from all readings, or why there is none."""
        return estimate_of(self.survey, self.plan, self.settings, self.readings)

    def against_today(self, reading):
        """Return what a stored reading says against today's sag; None where it does not count or has no place."""
        now, distances = final(reading), distances_of(self.plan)
        if now.set_aside or now.do_mg_l is None or now.station_code not in distances:
            return None
        others = [one for one in self.readings if one.id != now.id]
        before = estimate_of(self.survey, self.plan, self.settings, others)
        return against_today(Show.of(self.survey), before, self.today(), now, distances[now.station_code])

    def placed(self):
        """Return the readings that a chart can draw."""
        return placed(self.readings, self.plan.tables["stations"] if self.plan else [])
