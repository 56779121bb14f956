"""How far an estimate may be trusted: each reading against what the others say, and a verdict in plain words."""

from dataclasses import dataclass

import numpy as np
from scipy.special import chdtrc

from calc.beliefs import MISFIT, STATED

FITS, STRAINED, DOES_NOT_FIT = "fits", "strained", "does not fit"
_FEWEST = 3
_FEW_DRAWS = 40
_ODD_READING = 3.0
_ODD_CHANCE, _NO_CHANCE = 0.02, 1e-6
# Twice what readings without fault leave to the doubtful hypotheses: reached by about one survey in fifteen of those.
_DOUBTS = 0.25
_SHAPE = "The readings follow a shape that no plausible river has: something along the river is not in the plan."
_SCATTER = "The readings scatter more than their stated error: check the meter, and that the water was mixed."


@dataclass(frozen=True)
class FitVerdict:
    """The estimate's verdict on itself: word is "fits", "strained" or "does not fit"; reasons say why, in sentences.

    chance is that of readings as odd as these in the best of the plausible rivers; row is the place, among the readings
    that count, of the oddest, or -1.
    """

    word: str
    reasons: tuple[str, ...]
    chance: float
    row: int = -1

    @property
    def reason(self):
        """All reasons in one text."""
        return " ".join(self.reasons)


def standardised(likelihood, best):
    """Return for each row of the evidence how many standard deviations it lies from what the others say.

    By the linear response at each hypothesis with the stated errors, averaged by their probability: from prior and all
    other readings a reading's value is predicted with a variance, to which its own error is added.
    """
    readings = len(likelihood.evidence.distance_km)
    chosen = np.flatnonzero(best.found.errors == STATED)
    if not readings or not len(chosen):
        chosen = np.arange(len(best.found.errors))
    slope = best.slope[chosen]
    apart = best.residual[chosen] + (slope @ best.z[chosen][:, :, None])[:, :, 0]
    inverse = np.linalg.inv(np.eye(slope.shape[1]) + slope @ np.swapaxes(slope, 1, 2))
    # Whitened residuals are unroot @ residuals for the oxygen, and each its own for measured demand.
    unroot = np.tile(np.eye(slope.shape[1]), (len(chosen), 1, 1))
    unroot[:, :readings, :readings] = likelihood.unroot[best.found.errors[chosen]]
    precision = np.swapaxes(unroot, 1, 2) @ inverse @ unroot
    pull = (np.swapaxes(unroot, 1, 2) @ (inverse @ apart[:, :, None]))[:, :, 0]
    scaled = pull / np.sqrt(np.maximum(np.diagonal(precision, axis1=1, axis2=2), 1e-12))
    share = best.share[chosen]
    return (share / share.sum()) @ scaled[:, :readings] if readings else np.empty(0)


def judge(evidence, stations_km, differences, best, found, settings):
    """Return the FitVerdict."""
    word, reasons = FITS, []
    count = best.residual.shape[1]
    stated = best.found.errors == STATED
    objective = best.objective[stated].min() if stated.any() else best.objective.min()
    chance = float(chdtrc(count, 2 * objective)) if count else 1.0
    doubted = float(best.share[~stated].sum())
    row = int(np.abs(differences).argmax()) if len(differences) else -1
    if len(stations_km) < _FEWEST:
        word = STRAINED
        reasons.append(_too_few(len(stations_km)))
    if row >= 0 and abs(differences[row]) > _ODD_READING:
        word = STRAINED
        side = "higher" if differences[row] > 0 else "lower"
        reasons.append(
            f"The reading at {evidence.distance_km[row]:.1f} km is {side} than the others allow, by "
            f"{abs(differences[row]):.1f} times its error."
        )
    if chance < _ODD_CHANCE or doubted > _DOUBTS:
        word = STRAINED
        misfit = best.share[best.found.errors == MISFIT].sum()
        reasons.append(_SHAPE if misfit > doubted / 2 else _SCATTER)
    if chance < _NO_CHANCE:
        word = DOES_NOT_FIT
        reasons.append("No river near the plan gives these readings: check the plan's numbers, and the meter.")
    if found.effective < _FEW_DRAWS:
        word = STRAINED if word == FITS else word
        reasons.append(f"The intervals rest on few draws ({found.effective:.0f} effective): take them as rough.")
    return FitVerdict(word, (*reasons, *evidence.dropped), chance, row)


def _too_few(stations):
    if not stations:
        return "No reading counts yet: this is the plan with its own uncertainty."
    return f"Only {stations} station{'s' if stations > 1 else ''} with a reading: too few to tell the rates."
