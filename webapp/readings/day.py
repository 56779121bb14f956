"""What a survey knows at one moment: its plan, settings and readings, each fetched once for the page or the save."""

from datetime import UTC, datetime
from functools import partial

from webapp.display import Show
from webapp.meters.queries import meters_of
from webapp.plan.queries import current_plan
from webapp.readings.asking import findings_on_new, thresholds, to_ask
from webapp.readings.check import on_site_check
from webapp.readings.expected import mixed_conductance, prediction_or_reasons
from webapp.readings.judging import judgement_of
from webapp.readings.kept import readings_kept
from webapp.readings.layers import final, placed
from webapp.readings.occasions import occasions_of
from webapp.readings.points import BOAT, before_reading, points_left, section_reason
from webapp.readings.repeats import due_of, local_day
from webapp.readings.section_words import spreads
from webapp.readings.settling import settle
from webapp.readings.surroundings import distances_of, look_around
from webapp.sag.estimate import estimate_of
from webapp.sag.moved import against_today
from webapp.surveys.queries import current_settings
from webapp.visits.layers import final_visit
from webapp.visits.queries import visits_of

OF_WADING = ("do_not_wade", "wading_caution")


class Day:
    """A survey now; readings are FinalReadings, and grow by what is stored meanwhile."""

    def __init__(self, db, survey):
        self._db = db
        self.survey = survey
        self.now = datetime.now(UTC)
        self.plan = current_plan(db, survey.id)
        self.settings = thresholds(current_settings(db, survey.id))
        stored, self.readings = readings_kept(db, survey.id)
        self.authors = {one.id: one.author_id for one in stored}
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
        if reading.id not in self.authors:
            self.authors[reading.id] = reading.author_id
            self.readings.append(final(reading))

    def check(self, reading):
        """Return the OnSiteCheck of a stored reading; who stands on a bridge or in a boat is told nothing of wading."""
        known = (self.survey, self.plan, self.settings, reading, self.readings)
        check = on_site_check(*known)
        if not any(one.name in OF_WADING for one in check.hazards):
            return check
        platform = self._platform(check.reading)
        return on_site_check(*known, platform) if platform else check

    def _platform(self, reading):
        """Return what the crew of a reading stood on, empty where no visit says."""
        visits = [final_visit(one) for one in visits_of(self._db, self.survey.id)]
        occasions = occasions_of([reading], self.authors, visits, self.settings, {})
        visit = next(one.visit for one in occasions if one.readings)
        return visit.facts.get("platform", "") if visit else ""

    def still_to_read(self, reading):
        """Return (why left, centre and right are wanted at the station, the Points left there) after a reading.

        Occasions are told by the clock alone, without the visits: it is for the crew that stands there now.
        """
        now = final(reading)
        in_order = sorted(self.readings, key=lambda one: one.taken_at)
        balance = mixed_conductance(self.survey, self.plan)
        occasions = occasions_of(in_order, self.authors, (), self.settings, balance)
        here = next(one for one in occasions if any(each.id == now.id for each in one.readings))
        prediction, _ = prediction_or_reasons(self.survey, self.plan)
        why = section_reason(self.plan, prediction, occasions, now.station_code)
        deep = now.depth_m is not None and now.depth_m > self.settings.profile_depth_m
        boat = deep and self._platform(now) == BOAT
        return why, points_left(now, here, bool(why), self.settings, boat)

    def replicate_due(self, reading):
        """Return a sentence where the crew of a stored reading owes a replicate that day; empty where not."""
        day = partial(local_day, self.survey)
        own = [one for one in self.readings if self.authors[one.id] == reading.author_id]
        return due_of([one for one in own if day(one.taken_at) == day(reading.taken_at)], self.settings)

    def today(self):
        """Return today's sag from all readings, or why there is none."""
        return estimate_of(self.survey, self.plan, self.settings, self.readings)

    def among_all(self, reading):
        """Return what all readings and checks of the survey say of a stored one, for its check.

        {"against", "sag", "judged", "spread_words"}: against today's sag, the sag where it is to be drawn, the Judged,
        and how far the points of its section lie apart.
        """
        against = self.against_today(reading)
        judged = judgement_of(self._db, self.survey).by_id[reading.id]
        return {
            "against": against,
            "sag": self.today() if against is not None and against.expected is not None else None,
            "judged": judged,
            "spread_words": spreads(judged.section),
        }

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


class Fresh:
    """What a form for a reading to come needs of a survey."""

    def __init__(self, db, survey):
        self._db = db
        self.survey = survey
        self.now = datetime.now(UTC)
        self.plan = current_plan(db, survey.id)
        self.meters = meters_of(db, survey.id)

    def before(self, code):
        """Return {"before", "across"}: what is known of a station, and why three points are wanted there."""
        settings = thresholds(current_settings(self._db, self.survey.id))
        judged = judgement_of(self._db, self.survey)
        prediction, _ = prediction_or_reasons(self.survey, self.plan)
        return {
            "before": before_reading(self.plan, prediction, judged.of_station(code), settings, code, self.now),
            "across": section_reason(self.plan, prediction, judged.occasions, code),
        }
