"""May the crew leave: whether the critical point is held between stations, beside the trade's own rule."""

from dataclasses import dataclass

import numpy as np

from calc.brackets import BracketCheck, bracket_check
from calc.fit import FitSettings, refine
from calc.fitness import FITS
from calc.outlook import new_places, outlook

HELD, OPEN_ABOVE, OPEN_BELOW, FLAT, NOT_YET = "held", "open above", "open below", "flat", "not yet"
_NARROWS = 0.10
_OUT_OF_REACH = 0.10


@dataclass(frozen=True)
class Answer:
    """The answer to "may we leave": word is held, open above, open below, flat or not yet; missing says what lacks.

    do_half_mg_l and place_half (a share of the distance from the outfall) are half-widths of the 90 % intervals,
    p_between the probability that the critical point lies between stations. bracket is the trade's rule; where the two
    disagree, disagrees is True and disagreement says how.
    """

    word: str
    missing: tuple[str, ...]
    do_half_mg_l: float
    place_half: float
    p_above: float
    p_between: float
    p_below: float
    regret_mg_l: float
    bracket: BracketCheck
    disagrees: bool
    disagreement: str


def verdict(plan, stations_km, do_mg_l, *, estimate=None, access_km=(), spread=None, settings=None, bracket=None):
    """Return the Answer for readings along a plan's river.

    Parameters
    ----------
    plan, stations_km, do_mg_l, spread, settings
        As for calc.fit.refine.
    estimate : Estimate, optional
        That of the same readings, if already made.
    access_km : array_like, optional
        Points where a further station could be: the answer is "flat" only where none of them would narrow the place.
    bracket : BracketCheck, optional
        The trade's rule, when more is known for it than readings (calc.brackets.bracket_check).
    """
    settings = settings or (estimate.settings if estimate else FitSettings())
    estimate = estimate or refine(plan, stations_km, do_mg_l, spread=spread, settings=settings)
    evidence = estimate.evidence
    bracket = bracket or bracket_check(estimate.plan, evidence.distance_km, evidence.do_mg_l)
    do_half = (estimate.critical_do_mg_l.high - estimate.critical_do_mg_l.low) / 2
    place = estimate.critical_km
    place_half = (place.high - place.low) / 2 / max(place.median - estimate.outfall_km, 0.05 * estimate.scale_km)
    p_above, p_below = float(estimate.p_in_gap[0]), float(estimate.p_in_gap[-1])
    if not len(estimate.stations_km):
        p_above, p_below = 0.0, 1.0
    between = 1 - p_above - p_below
    missing = _missing(estimate, settings, do_half, place_half, between)
    word = _word(estimate, missing, access_km)
    if word == OPEN_BELOW:
        missing |= _out_of_reach(estimate, access_km)
    leave = bracket.bracketed or (word == FLAT and bracket.flat)
    disagrees = (word in (HELD, FLAT)) != leave
    return Answer(
        word=word,
        missing=tuple(missing.values()),
        do_half_mg_l=float(do_half),
        place_half=float(place_half),
        p_above=p_above,
        p_between=float(np.clip(between, 0, 1)),
        p_below=p_below,
        regret_mg_l=estimate.regret_mg_l,
        bracket=bracket,
        disagrees=disagrees,
        disagreement=_disagreement(word, bracket) if disagrees else "",
    )


def _missing(estimate, settings, do_half, place_half, between):
    """Return what lacks for "held", by name, each a sentence."""
    missing = {}
    count = len(estimate.stations_km)
    if count < settings.fewest_stations:
        missing["stations"] = (
            f"{count} of at least {settings.fewest_stations} stations below the outfall with a reading that counts."
        )
    if estimate.fit.word != FITS and count >= settings.fewest_stations:
        missing["fit"] = f"The estimate {_FIT_SAID[estimate.fit.word]}. {estimate.fit.reason}"
    if between < settings.between:
        missing["between"] = (
            f"The low point lies between your stations with {100 * between:.0f} % probability; "
            f"{100 * settings.between:.0f} % is needed."
        )
    if do_half > settings.do_half_mg_l:
        missing["value"] = (
            f"The lowest oxygen is known to ± {do_half:.2f} mg/L; ± {settings.do_half_mg_l:.2f} is needed."
        )
    if place_half > settings.place_half and estimate.regret_mg_l > settings.regret_mg_l:
        missing["place"] = (
            f"The place of the low point is known to ± {100 * place_half:.0f} %; ± {100 * settings.place_half:.0f} % "
            f"is needed, or that oxygen elsewhere is no more than {settings.regret_mg_l:.2f} mg/L lower."
        )
    return missing


_FIT_SAID = {"strained": "is strained", "does not fit": "does not fit the readings"}


def _word(estimate, missing, access_km):
    if not missing:
        return HELD
    side = _open_side(estimate, missing)
    if side is not None:
        return OPEN_ABOVE if side == "above" else OPEN_BELOW
    if set(missing) == {"place"} and not _could_narrow(estimate, access_km):
        return FLAT
    return NOT_YET


def _open_side(estimate, missing):
    """Return the side on which the critical point is not held, or None."""
    read = estimate.stations_km
    if not len(read):
        return None
    lowest_km = estimate.evidence.distance_km[_lowest_row(estimate)]
    if len(read) > 1 and lowest_km in (read[0], read[-1]):
        return "above" if lowest_km == read[0] else "below"
    if "between" in missing and len(read) > 1:
        return "above" if estimate.p_in_gap[0] > estimate.p_in_gap[-1] else "below"
    return None


def _out_of_reach(estimate, access_km):
    """Return the warning that the low point may lie where the crew cannot read, if so."""
    access = np.asarray(access_km, dtype=float)
    reach_km = max([*access[np.isfinite(access)], estimate.stations_km[-1]])
    chance = float(estimate.weight @ (estimate.place_km > reach_km))
    if not len(access) or chance < _OUT_OF_REACH:
        return {}
    return {"reach": f"The low point may lie below your last access point ({100 * chance:.0f} % probability)."}


def _lowest_row(estimate):
    evidence = estimate.evidence
    return int(np.where(evidence.distance_km >= estimate.outfall_km, evidence.do_mg_l, np.inf).argmin())


def _could_narrow(estimate, access_km):
    """Return whether a reading at some point left would narrow the place by a tenth."""
    places = new_places(estimate, np.atleast_1d(np.asarray(access_km, dtype=float)))
    return len(places) > 0 and bool((outlook(estimate, places)["narrows_place"] >= _NARROWS).any())


def _disagreement(word, bracket):
    if word in (HELD, FLAT):
        failed = "; ".join(clause.said for clause in bracket.clauses if clause.holds is False)
        return f"The estimate holds the low point, the trade's bracket rule does not: {failed}."
    return "The trade's bracket rule is met, but the estimate does not yet hold the low point."
