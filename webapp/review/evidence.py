"""Everything that speaks for or against one reading, for one screen."""

from dataclasses import dataclass

from webapp.readings.judging import Judged, judgement_of
from webapp.readings.layers import FinalReading
from webapp.readings.settling import spread_of, stability_of, thresholds
from webapp.review.words import BRACKETS, QUALITY_NAMES, odd_of, reasons_in_words, review_of
from webapp.surveys.queries import current_settings


@dataclass(frozen=True)
class Beside:
    """Another reading and how the one looked at differs from it: in oxygen, temperature, and in time after it. [h]"""

    what: str
    reading: FinalReading
    do_difference_mg_l: float | None
    temp_difference_c: float | None
    hours_after: float


@dataclass(frozen=True)
class Evidence:
    """What there is about a reading.

    neighbours are the stations read upstream and downstream near in time, repeats what it repeats and what repeats it,
    section the other points of the same occasion. only_then are the findings that the crew was asked about, and that
    today's numbers and settings no longer give. settled is calc's Stability of the raw values of oxygen, why that of
    whatever was still moving; both None without raw values.
    """

    judged: Judged
    neighbours: tuple[Beside, ...]
    repeats: tuple[Beside, ...]
    section: tuple[Beside, ...]
    only_then: tuple[dict, ...]
    settled: object
    why: object

    @property
    def odd(self):
        """Return what is odd in one sentence."""
        return odd_of(self.judged)

    @property
    def quality(self):
        """Return its quality in a word or two."""
        return QUALITY_NAMES[self.judged.quality]

    @property
    def reasons(self):
        """Return the reasons in plain words."""
        return reasons_in_words(self.judged)

    @property
    def checks(self):
        """Return whether it lies between two passing checks, in words."""
        return BRACKETS[self.judged.bracket.state]

    @property
    def review(self):
        """Return what reviewers did about it, in words."""
        return review_of(self.judged.reading)


def evidence_of(db, survey, reading):
    """Return the Evidence about a Reading of the survey."""
    judgement = judgement_of(db, survey)
    judged = judgement.by_id[reading.id]
    found = {one.name for one in judged.findings}
    settings = thresholds(current_settings(db, survey.id))
    now, around = judged.reading, judged.around
    sides = (("Upstream", around.upstream), ("Downstream", around.downstream))
    repeats = [("It repeats", judgement.by_id[judged.repeats_id])] if judged.repeats_id in judgement.by_id else []
    repeats += [("Repeated by", one) for one in judgement.by_id.values() if one.repeats_id == reading.id]
    shown = {reading.id, *(one.reading.id for _, one in repeats)}
    return Evidence(
        judged=judged,
        neighbours=tuple(_beside(what, one.reading, now) for what, one in sides if one),
        repeats=tuple(_beside(what, one.reading, now) for what, one in repeats),
        section=tuple(_beside("In the section", one, now) for one in judged.occasion.readings if one.id not in shown),
        only_then=tuple(one for one in reading.kept_findings if one.get("name") not in found),
        settled=spread_of(now.series, settings),
        why=stability_of(now.series, settings),
    )


def _beside(what, other, now):
    return Beside(
        what=what,
        reading=other,
        do_difference_mg_l=_less(now.do_mg_l, other.do_mg_l),
        temp_difference_c=_less(now.water_temp_c, other.water_temp_c),
        hours_after=(now.taken_at - other.taken_at).total_seconds() / 3600,
    )


def _less(one, other):
    return None if one is None or other is None else one - other
