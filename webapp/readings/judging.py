"""Every reading of a survey judged by today's settings: quality, reasons, its checks, its visit. Nothing is stored."""

import threading
from collections import OrderedDict
from dataclasses import dataclass

from sqlalchemy.orm import Session

from calc.findings import Finding
from calc.quality_meter import Bracket
from calc.quality_section import not_mixed, stratified
from webapp.meters.queries import checks_of
from webapp.meters.verdicts import Brackets, JudgedCheck, judged_checks
from webapp.plan.queries import current_plan
from webapp.readings import queries
from webapp.readings.asking import findings_on_stored, thresholds
from webapp.readings.expected import mixed_conductance
from webapp.readings.layers import FinalReading, final
from webapp.readings.occasions import Occasion, occasions_of
from webapp.readings.quality_words import quality_of, reasons_of, severity_of
from webapp.readings.saturations import saturations_of
from webapp.readings.surroundings import Neighbourhood, Surroundings
from webapp.surveys.queries import current_settings
from webapp.visits.layers import final_visit
from webapp.visits.queries import visits_of

_KEPT_SURVEYS = 4


@dataclass(frozen=True)
class Judged:
    """A reading and what is to be said of it.

    findings are those of today's settings without the hazards, of_itself those that do not come from the section it is
    a point of; kept are the names of those that were asked about on site and kept. air_temp_c is what its visit says.
    severity is 0 where nothing wants a look.
    """

    reading: FinalReading
    author_id: str
    author: str
    around: Surroundings
    of_itself: tuple[Finding, ...]
    air_temp_c: float | None
    findings: tuple[Finding, ...]
    kept: tuple[str, ...]
    bracket: Bracket
    check_before: JudgedCheck | None
    check_after: JudgedCheck | None
    occasion: Occasion
    repeats_id: str
    quality: str
    reasons: tuple[str, ...]
    severity: float

    @property
    def grade(self):
        """Return the grade of the check that closes it, empty where none does."""
        return self.check_after.verdict.grade if self.check_after else ""

    @property
    def visit_id(self):
        """Return the id of its visit, empty where nobody opened one."""
        return self.occasion.visit.id if self.occasion.visit else ""

    @property
    def visit_no(self):
        """Return which occupation of its station it belongs to."""
        return self.occasion.visit_no

    @property
    def section(self):
        """Return the verdict on the section it is a point of."""
        return self.occasion.section

    @property
    def layers(self):
        """Return whether the water was layered there."""
        return self.occasion.layers


@dataclass(frozen=True)
class Judgement:
    """All readings of a survey, judged: by id, in time order, and by the occasions they were taken on."""

    by_id: dict[str, Judged]
    occasions: list[Occasion]
    checks: list[JudgedCheck]

    def of_station(self, code):
        """Return the occasions at a station, the latest last."""
        return [one for one in self.occasions if one.station_code == code]


def judge(survey, plan_version, settings, readings, checks, visits, before=None):
    """Return the Judgement of a survey.

    readings, checks and visits are all rows of the survey with what hangs on them; readings in time order; settings
    are calc's. before is an earlier Judgement by the same plan, settings and facts of the survey: what it found holds
    wherever nothing that it rests on has changed.
    """
    known = before.by_id if before else {}
    finals = [_same_or_new(known.get(one.id), final(one)) for one in readings]
    authors = {one.id: one.author_id for one in readings}
    balance = mixed_conductance(survey, plan_version)
    occasions = occasions_of(finals, authors, [final_visit(one) for one in visits], settings, balance)
    checked = judged_checks(checks, settings)
    judges = _Judges(survey, settings, Neighbourhood(survey, plan_version, finals), Brackets(checked, settings), known)
    occasion_of = {reading.id: one for one in occasions for reading in one.readings}
    by_id = {
        one.id: judges.judged(one, now, occasion_of[one.id], float(saturation))
        for one, now, saturation in zip(readings, finals, saturations_of(finals), strict=True)
    }
    return Judgement(by_id, occasions, checked)


def _same_or_new(old, now):
    """Return the reading as it was judged before where nothing in it has changed: then it is the same to look at."""
    return old.reading if old is not None and old.reading == now else now


@dataclass(frozen=True)
class _Judges:
    """What every reading of a survey is judged by; known holds what was judged before, by id."""

    survey: object
    settings: object
    neighbourhood: Neighbourhood
    brackets: Brackets
    known: dict

    def judged(self, reading, now, occasion, saturation_mg_l):
        """Return the Judged of a reading; now is it as it stands."""
        around = self.neighbourhood.around(now.station_code, now.taken_at, now.id, now.replicate)
        bracket, before, after = self.brackets.of(now.meter, now.taken_at)
        air_temp_c = occasion.visit.facts.get("air_temp_c") if occasion.visit else None
        known = {"bracket": bracket, "air_temp_c": air_temp_c, "saturation_mg_l": saturation_mg_l}
        of_itself = self._of_itself(reading, now, around, known)
        findings = (*of_itself, *not_mixed(occasion.section), *stratified(occasion.layers))
        findings = tuple(one for one in findings if not one.hazard)
        reasons = reasons_of(reading, now, [one.name for one in findings], self.settings.oxygen_low_mg_l)
        return Judged(
            reading=now,
            author_id=reading.author_id,
            author=reading.author.name,
            around=around,
            of_itself=of_itself,
            air_temp_c=air_temp_c,
            findings=findings,
            kept=tuple(str(one.get("name")) for one in reading.kept_findings),
            bracket=bracket,
            check_before=before,
            check_after=after,
            occasion=occasion,
            repeats_id=around.repeats.id if around.repeats else "",
            quality=quality_of(now, reasons),
            reasons=reasons,
            severity=severity_of(now, reasons),
        )

    def _of_itself(self, reading, now, around, known):
        """Return the findings on the reading alone: those of before where nothing that they rest on has changed."""
        old = self.known.get(reading.id)
        if old is not None and old.reading is now:
            rests_on = (old.around, old.bracket, old.air_temp_c)
            if rests_on == (around, known["bracket"], known["air_temp_c"]):
                return old.of_itself
        source = reading.pressure_source
        return findings_on_stored(self.survey, self.settings, now, around, reading.received_at, source=source, **known)


_kept = OrderedDict()
_keeping = threading.Lock()


def judgement_of(db, survey):
    """Return the Judgement of a survey as it is now; kept in memory until anything it rests on changes."""
    plan, settings = current_plan(db, survey.id), current_settings(db, survey.id)
    mark = (queries.mark_of(db, survey.id), plan and plan.id, settings and settings.id, _facts(survey))
    with _keeping:
        held, found = _kept.get(survey.id, (None, None))
        if held == mark:
            _kept.move_to_end(survey.id)
            return found
    # What is kept needs rows of its own: those of a session that rolls back are emptied, and filled by no other.
    with Session(db.connection(), join_transaction_mode="rollback_only") as aside:
        rows = (queries.plain_readings_of(aside, survey.id), checks_of(aside, survey.id), visits_of(aside, survey.id))
        before = found if held is not None and held[1:] == mark[1:] else None
        found = judge(survey, current_plan(aside, survey.id), thresholds(settings), *rows, before=before)
    with _keeping:
        _kept[survey.id] = (mark, found)
        _kept.move_to_end(survey.id)
        while len(_kept) > _KEPT_SURVEYS:
            _kept.popitem(last=False)
    return found


def _facts(survey):
    """Return what of a survey's own facts its readings are judged by."""
    return survey.elevation_m, survey.sampling, survey.release_at, survey.time_zone, survey.created_at
