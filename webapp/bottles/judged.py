"""Bottles and their results judged by today's settings. Nothing of it is stored, and no late result is held back."""

import math
from dataclasses import dataclass

from calc.findings import Finding
from calc.quality_bottle import (
    Hold,
    blank,
    bottle_replicate,
    depletion,
    gga,
    hold,
    incubation,
    not_on_ice,
    past_hold_time,
    receipt_warm,
)
from webapp.bottles.words import REASON_OF, REASONS, SIGNS, TELLING, UNIT_LABELS, UNITS
from webapp.display import plain_digits
from webapp.models import Bottle, LabResult

_BOD5 = ("bod5", "cbod5")
_OXYGEN = ("bod5", "cbod5", "ubod", "winkler_do")
ON_ICE = ("bod5", "cbod5", "ubod", "nh3_n", "chlorophyll_a")


@dataclass(frozen=True)
class JudgedBottle:
    """A bottle, its results and what is to be said of them.

    results are all of the bottle's, oldest first; result is the one that holds, the last, or None. hold says how long
    the bottle waited until its analysis began, or has waited until now where that is not told. reasons are keys of
    words.REASONS in their order, quality a key of words.QUALITIES.
    """

    bottle: Bottle
    results: tuple[LabResult, ...]
    hold: Hold
    findings: tuple[Finding, ...]
    reasons: tuple[str, ...]
    quality: str

    @property
    def result(self):
        """Return the result that holds, or None."""
        return self.results[-1] if self.results else None

    @property
    def reported(self):
        """Return the result as it is reported, for example "<2" or "4.1"; empty where there is none."""
        return reported(self.result)

    @property
    def unit(self):
        """Return the unit of the result as it is written."""
        return UNIT_LABELS[UNITS[self.bottle.analysis]]


def reported(result):
    """Return a LabResult's number as it is reported: one below a limit as "<" and the limit, never as a number."""
    if result is None:
        return ""
    value = result.value if result.censor == "none" else result.limit_value
    return "" if value is None else SIGNS[result.censor] + plain_digits(value)


def judged_bottles(bottles, results, settings, now=None):
    """Return a JudgedBottle for each bottle, in their order.

    results are those of bottles.queries.results_of, settings calc's. With now, the clock of a bottle whose analysis has
    not begun runs until then; without it such a bottle has no time.
    """
    of = {bottle.id: [] for bottle in bottles}
    for result in results:
        of.get(result.bottle_id, []).append(result)
    pairs = _pairs(bottles)
    return [
        _judged(bottle, of[bottle.id], [of[other.id] for other in pairs.get(bottle.id, ())], settings, now)
        for bottle in bottles
    ]


def _pairs(bottles):
    """Return {bottle id: the bottles that repeat it, or that it repeats}."""
    by_code = {(bottle.code.casefold(), bottle.analysis): bottle for bottle in bottles}
    pairs = {}
    for bottle in bottles:
        other = by_code.get((bottle.replicate_of.casefold(), bottle.analysis)) if bottle.replicate_of else None
        if other is not None and other is not bottle:
            pairs.setdefault(bottle.id, []).append(other)
            pairs.setdefault(other.id, []).append(bottle)
    return pairs


def _judged(bottle, results, beside, settings, now):
    result = results[-1] if results else None
    waited = _hold(bottle, result, settings, now)
    findings = [*past_hold_time(waited), *_way(bottle, settings)]
    if result is not None:
        findings += receipt_warm(result.arrival_temp_c, settings)
        findings += _controls(bottle, result, settings)
        findings += [one for others in beside if others for one in _replicate(result, others[-1], settings)]
    found = {REASON_OF[one.name] for one in findings}
    if result is not None and result.censor == "less_than":
        found.add("below_limit")
    if reported(result) and not waited.state:
        found.add("hold_time_unknown")
    reasons = tuple(reason for reason in REASONS if reason in found)
    quality = "missing" if not reported(result) else "questionable" if found - set(TELLING) else "not_checked"
    return JudgedBottle(bottle, tuple(results), waited, tuple(findings), reasons, quality)


def _hold(bottle, result, settings, now):
    filled, begun = bottle.collected_at, result.started_at if result is not None else None
    if bottle.analysis == "chlorophyll_a" and bottle.filtered:
        begun = filled  # its clock runs to the filter, and that was on site
    # The clock of a bottle whose result is there has stopped, even where nobody tells when.
    until = begun or (None if reported(result) else now)
    hours = math.nan if until is None else (until - filled).total_seconds() / 3600
    return hold(0.0, hours, bottle.analysis, settings)


def _way(bottle, settings):
    """Return what happened to a bottle before the laboratory had it."""
    findings = []
    if bottle.on_ice_at is not None and bottle.analysis in ON_ICE:
        findings += not_on_ice((bottle.on_ice_at - bottle.collected_at).total_seconds() / 60, settings)
    if bottle.full is False and bottle.analysis in _OXYGEN:
        says = "There was air under the stopper: oxygen goes in or out of the water."
        cause = "It was not filled from below, or the stopper was not tight."
        findings.append(
            Finding("headspace", "full", says, cause, "Fill another, until it runs over, if there is time.")
        )
    return findings


def _controls(bottle, result, settings):
    told = {name: value for name, value in result.quality.items() if value is not None}
    findings = [*blank(told.get("blank_mg_l"), settings), *gga(told.get("gga_mg_l"), settings)]
    if bottle.analysis not in _BOD5:
        return findings
    if bottle.kind == "blank":
        return [*findings, *blank(result.value, settings)]
    used, left = told.get("depletion_mg_l"), told.get("residual_mg_l")
    if used is not None or left is not None:
        # One of the two told alone is held against its own limit.
        left = settings.residual_mg_l if left is None else left
        used = settings.depletion_mg_l if used is None else used
        findings += depletion(left + used, left, settings)
    days = math.nan
    if result.started_at is not None and result.finished_at is not None:
        days = (result.finished_at - result.started_at).total_seconds() / 86400
    return [*findings, *incubation(days, told.get("incubation_c"), settings)]


def _replicate(result, other, settings):
    """Return whether two results agree; one below a limit counts as the limit, since nothing more is known of it."""
    values = [one.limit_value if one.censor == "less_than" else one.value for one in (result, other)]
    if "greater_than" in (result.censor, other.censor) or result.censor == other.censor == "less_than":
        return ()
    return bottle_replicate(*values, result.limit_value or other.limit_value, settings)
