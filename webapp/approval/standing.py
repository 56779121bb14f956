"""What stands against a survey: told before it is marked as reviewed or approved. Only open questions hold it back."""

import math
from collections import Counter
from dataclasses import dataclass

from calc.quality_day import Completeness, completeness
from webapp.plan.prediction import prediction_of
from webapp.plan.queries import current_plan
from webapp.readings.judging import judgement_of
from webapp.readings.layers import ASKED, KEPT
from webapp.readings.quality_words import QUALITIES, REASONS
from webapp.readings.settling import thresholds
from webapp.surveys.queries import current_settings

_NOT_VALID = ("bad", "missing")


@dataclass(frozen=True)
class Critical:
    """A station that the answer rests on: why, and its lowest valid reading, whose quality is empty where it has none.

    reasons are those of the quality, in words.
    """

    code: str
    why: str
    do_mg_l: float | None = None
    quality: str = ""
    reasons: tuple = ()


@dataclass(frozen=True)
class Standing:
    """What a survey holds, and what stands against it.

    not_looked counts readings that no reviewer but their author has looked at, asked the questions without an answer.
    qualities are (quality, its words, count), disputes (station code, visit id, number of facts), missing the codes of
    planned stations without a valid reading.
    """

    readings: int
    not_looked: int
    asked: int
    qualities: tuple
    disputes: tuple
    missing: tuple[str, ...]
    complete: Completeness
    critical: tuple[Critical, ...]
    authors: frozenset

    @property
    def clear(self):
        """Return whether nothing stands against it."""
        told = self.not_looked or self.asked or self.disputes or self.missing or not self.complete.complete
        return not told and all(one.quality in ("good", "not_checked") for one in self.critical)


def standing_of(db, survey):
    """Return a survey's Standing, judged by its settings of now."""
    judgement, plan = judgement_of(db, survey), current_plan(db, survey.id)
    judged = list(judgement.by_id.values())
    planned = [one for one in (plan.tables.get("stations") or []) if one.get("state") != "dropped"] if plan else []
    valid = {}
    for one in judged:
        if one.quality not in _NOT_VALID:
            valid.setdefault(one.reading.station_code, []).append(one)
    codes = [one["code"] for one in planned]
    critical = _critical(survey, plan, planned, valid)
    with_reading = sum(bool(one.quality) for one in critical)
    found = completeness(
        len(codes),
        sum(code in valid for code in codes),
        len(critical),
        with_reading,
        thresholds(current_settings(db, survey.id)),
    )
    counts = Counter(one.quality for one in judged)
    return Standing(
        readings=len(judged),
        not_looked=sum(one.reading.review not in (KEPT, ASKED) for one in judged),
        asked=sum(one.reading.review == ASKED for one in judged),
        qualities=tuple((key, words, counts[key]) for key, words in QUALITIES.items() if counts[key]),
        disputes=tuple(
            (one.station_code, one.visit.id, len(one.visit.disputes))
            for one in judgement.occasions
            if one.visit is not None and one.visit.disputes
        ),
        missing=tuple(code for code in codes if code not in valid),
        complete=found,
        critical=critical,
        authors=frozenset(one.author_id for one in judged),
    )


def _critical(survey, plan, planned, valid):
    """Return the stations that the answer rests on: where oxygen was lowest, and where the plan has it lowest."""
    below = [one["code"] for one in planned if one["distance_km"] >= 0]
    why = {}
    lowest = {code: _lowest(valid[code]) for code in below if code in valid}
    if lowest:
        why[min(lowest, key=lambda code: lowest[code].reading.do_mg_l)] = "oxygen was lowest here"
    prediction = prediction_of(survey, plan) if plan else None
    place = prediction.critical.distance_km if prediction is not None and prediction.ready else math.nan
    if below and math.isfinite(place):
        near = min((one for one in planned if one["code"] in below), key=lambda one: abs(one["distance_km"] - place))
        why.setdefault(near["code"], "the plan has its lowest oxygen nearest to it")
    return tuple(
        Critical(code, words, *_said_of(lowest[code])) if code in lowest else Critical(code, words)
        for code, words in why.items()
    )


def _lowest(judged):
    return min(judged, key=lambda one: one.reading.do_mg_l)


def _said_of(judged):
    return judged.reading.do_mg_l, judged.quality, tuple(REASONS[reason] for reason in judged.reasons)
