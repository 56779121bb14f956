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
    says, _ = _oddest(judged)
    return says


def also_of(judged):
    """Return the reasons of a reading in plain words, without the one that odd_of tells."""
    _, told = _oddest(judged)
    return [REASONS[reason] for reason in judged.reasons if reason != told]


def reasons_in_words(judged):
    """Return the reasons of a reading, each in plain words."""
    return [REASONS[reason] for reason in judged.reasons]


def _oddest(judged):
    """Return the sentence that tells the worst reason, and that reason; what a correction mended is no longer odd."""
    reasons = [reason for reason in judged.reasons if reason not in TELLING]
    if not reasons:
        looked = judged.reading.review == KEPT
        return ("Nothing is odd." if looked else "Nothing is odd; nobody has looked yet."), ""
    worst = max(reasons, key=lambda reason: WEIGHTS.get(reason, 0))
    for finding in judged.findings:
        if REASON_OF.get(finding.name, "other") == worst:
            return finding.says, worst
    words = REASONS[worst]
    return f"{words[0].upper()}{words[1:]}.", worst
