"""What a reading's judgement says in words: what is odd, whether checks lie on both sides, what was decided."""

from webapp.readings.layers import ANSWERED, ASKED, KEPT
from webapp.readings.quality_words import REASON_OF, REASONS, TELLING, WEIGHTS

BRACKETS = {
    "bracketed": "between two passing checks",
    "drift": "the meter drifted until the check after",
    "not_reportable": "the check after is too far off to report it",
    "no_check_before": "no meter check before",
    "check_before_failed": "the check before did not pass",
    "no_check_after": "no meter check after",
    "check_after_failed": "the check after did not pass",
}
QUALITY_NAMES = {
    "good": "good",
    "not_checked": "not checked",
    "questionable": "questionable",
    "bad": "bad",
    "missing": "missing",
}
REVIEWS = {KEPT: "looked at", ASKED: "waiting for the crew", ANSWERED: "answered by the crew"}


def review_of(now):
    """Return what reviewers did about a FinalReading, in words."""
    return REVIEWS.get(now.review, "not looked at")


def odd_of(judged):
    """Return what is odd about a reading in one sentence: the finding that weighs most."""
    found = sorted(judged.findings, key=lambda one: -_weight(one.name))
    if found:
        return found[0].says
    reasons = [reason for reason in judged.reasons if reason not in TELLING]
    if reasons:
        words = REASONS[max(reasons, key=lambda reason: WEIGHTS.get(reason, 0))]
        return f"{words[0].upper()}{words[1:]}."
    return "Nothing is odd." if judged.reading.review == KEPT else "Nothing is odd; nobody has looked yet."


def reasons_in_words(judged):
    """Return the reasons of a reading, each in plain words."""
    return [REASONS[reason] for reason in judged.reasons]


def _weight(name):
    return WEIGHTS.get(REASON_OF.get(name, "other"), 0)
