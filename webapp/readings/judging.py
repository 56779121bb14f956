"""Every reading of a survey judged by today's settings: quality, reasons, its checks, its visit. Nothing is stored."""

import gc
import threading
from collections import OrderedDict
from contextlib import contextmanager
from dataclasses import dataclass, field

from sqlalchemy.orm import Session

from calc.findings import Finding
from calc.quality_meter import Bracket
from calc.quality_section import not_mixed, stratified
from webapp.meters.queries import checks_of
from webapp.meters.verdicts import Brackets, JudgedCheck, judged_checks
from webapp.plan.queries import current_plan
from webapp.readings import kept, queries
from webapp.readings.asking import findings_on_stored, thresholds
from webapp.readings.expected import mixed_conductance
from webapp.readings.kept import readings_kept
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
    """All readings of a survey, judged: by id, in time order, and by the occasions they were taken on.

    rows are the readings, checks and visits that it rests on.
    """

    by_id: dict[str, Judged]
    occasions: list[Occasion]
    checks: list[JudgedCheck]
    rows: tuple = field(default=((), (), ()), repr=False, compare=False)

    def of_station(self, code):
        """Return the occasions at a station, the latest last."""
        return [one for one in self.occasions if one.station_code == code]


def judge(survey, plan_version, settings, readings, checks, visits, finals=None, before=None):
    """Return the Judgement of a survey.

    readings, checks and visits are all rows of the survey with what hangs on them; readings in time order, finals what
    they are as they stand, where that is known; settings are calc's. before is an earlier Judgement by the same plan,
    settings and facts of the survey: what it found holds wherever nothing that it rests on has changed.
    """
    before = before or Judgement({}, [], [])
    finals = [final(one) for one in readings] if finals is None else finals
    authors = {one.id: one.author_id for one in readings}
    balance = mixed_conductance(survey, plan_version)
    occasions = occasions_of(finals, authors, [final_visit(one) for one in visits], settings, balance)
    occasions = [_as_before(one, before) for one in occasions]
    checked = before.checks if checks is before.rows[1] else judged_checks(checks, settings)
    judges = _Judges(survey, settings, Neighbourhood(survey, plan_version, finals), before.by_id)
    occasion_of = {reading.id: one for one in occasions for reading in one.readings}
    brackets = Brackets(checked, settings).of_many([(one.meter, one.taken_at) for one in finals])
    by_id = {
        one.id: judges.judged(one, now, occasion_of[one.id], between, float(saturation))
        for one, now, between, saturation in zip(readings, finals, brackets, saturations_of(finals), strict=True)
    }
    return Judgement(by_id, occasions, checked, (readings, checks, visits))


def _as_before(occasion, before):
    """Return the Occasion that was judged before where this one says the same: its verdicts follow from these."""
    for reading in occasion.readings[:1]:
        held = before.by_id[reading.id].occasion if reading.id in before.by_id else None
        same = (occasion.station_code, occasion.visit_no, occasion.visit, occasion.readings)
        if held is not None and same == (held.station_code, held.visit_no, held.visit, held.readings):
            return held
    return occasion


@dataclass(frozen=True)
class _Judges:
    """What every reading of a survey is judged by; known holds what was judged before, by id."""

    survey: object
    settings: object
    neighbourhood: Neighbourhood
    known: dict

    def judged(self, reading, now, occasion, between, saturation_mg_l):
        """Return the Judged of a reading; now is it as it stands, between what Brackets.of says of it."""
        around = self.neighbourhood.around(now.station_code, now.taken_at, now.id, now.replicate)
        old = self.known.get(reading.id)
        if old is not None and _rests_on_the_same(old, now, occasion, between, around):
            return old
        bracket, check_before, check_after = between
        air_temp_c = occasion.visit.facts.get("air_temp_c") if occasion.visit else None
        known = {"bracket": bracket, "air_temp_c": air_temp_c, "saturation_mg_l": saturation_mg_l}
        of_itself = self._of_itself(reading, now, around, known)
        findings = (*of_itself, *not_mixed(occasion.section), *stratified(occasion.layers))
        mended = {"drift_uncorrected"} if now.drift is not None else ()
        findings = tuple([one for one in findings if not one.hazard and one.name not in mended])
        reasons = reasons_of(reading, now, [one.name for one in findings], self.settings.oxygen_low_mg_l)
        return Judged(
            reading=now,
            author_id=reading.author_id,
            author=reading.author.name,
            around=around,
            of_itself=of_itself,
            air_temp_c=air_temp_c,
            findings=findings,
            kept=tuple([str(one.get("name")) for one in reading.kept_findings]),
            bracket=bracket,
            check_before=check_before,
            check_after=check_after,
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


def _rests_on_the_same(old, now, occasion, between, around):
    """Return whether all that is said of a reading was said before from the very same."""
    if old.reading is not now or old.occasion is not occasion:
        return False
    bracket, check_before, check_after = between
    same_checks = old.check_before is check_before and old.check_after is check_after
    return same_checks and old.bracket == bracket and old.around == around


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
    before = found if held is not None and held[1:] == mark[1:] else None
    # What is kept needs rows of its own: those of a session that rolls back are emptied, and filled by no other.
    with _collecting_later(), Session(db.connection(), join_transaction_mode="rollback_only") as aside:
        readings, finals = readings_kept(aside, survey.id)
        others = _others(aside, survey.id, mark[0], found, held and held[0])
        plan = current_plan(aside, survey.id)
        found = judge(survey, plan, thresholds(settings), readings, *others, finals, before)
    with _keeping:
        _kept[survey.id] = (mark, found)
        _kept.move_to_end(survey.id)
        while len(_kept) > _KEPT_SURVEYS:
            _kept.popitem(last=False)
    return found


def forget():
    """Drop what is kept in memory, as a start of the server does."""
    with _keeping:
        _kept.clear()
    kept.forget()


def _others(db, survey_id, counts, found, held):
    """Return the checks and visits of a survey: those of the Judgement found where held says the same."""
    _, checks, visits = found.rows if found else (None, None, None)
    if found is None or held.checks != counts.checks:
        checks = checks_of(db, survey_id)
    if found is None or held.visits != counts.visits:
        visits = visits_of(db, survey_id)
    return checks, visits


@contextmanager
def _collecting_later():
    """Keep the garbage collector from walking many new rows again and again: none of them is garbage, none a cycle."""
    on = gc.isenabled()
    if on:
        gc.disable()
    try:
        yield
    finally:
        if on:
            gc.enable()


def _facts(survey):
    """Return what of a survey's own facts its readings are judged by."""
    return survey.elevation_m, survey.sampling, survey.release_at, survey.time_zone, survey.created_at
