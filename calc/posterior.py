"""What readings leave of the plausible rivers: modes of all hypotheses at once, then weighted draws around them.

Batched Gauss-Newton on whitened residuals with Levenberg's damping, evidence by Laplace, draws from the mixture of the
Laplace approximations with a heavier tail, importance-weighted; the smooth misfit and the meters' biases are then drawn
given the residuals. Random numbers come from a fixed seed: the same readings give the same answer.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from calc.beliefs import PLAN, Hypotheses
from calc.evidence import covariances
from calc.plausible import unfold

_STEP = 1e-4
_FREEDOM = 8
_LONGEST_STEP = 1.5
_FARTHEST = 6.0
_FIRST_ROUND, _SECOND_ROUND = 7, 5
_GAINED = 0.02
_NEGLIGIBLE = 7.0


@dataclass(frozen=True)
class Modes:
    """The best rivers under each hypothesis: latents z (h, k), residual (h, m) and its slope (h, m, k), whitened."""

    found: Hypotheses
    z: np.ndarray
    residual: np.ndarray
    slope: np.ndarray
    objective: np.ndarray
    log_evidence: np.ndarray

    @property
    def share(self):
        """The probability of each hypothesis, by Laplace's approximation."""
        share = np.exp(self.log_evidence - self.log_evidence.max())
        return share / share.sum()


class Likelihood:
    """How well latents explain the evidence: whitened residuals for any rows of latents and hypotheses."""

    def __init__(self, frame, latents, evidence, settings, scale_km):
        self.frame, self.latents, self.evidence = frame, latents, evidence
        kinds = covariances(evidence, np.empty(0), scale_km, settings)
        roots = [np.linalg.cholesky(readings) for readings, _, _ in kinds]
        self.unroot = np.stack([np.linalg.inv(root) for root in roots])
        self.log_size = np.array([np.log(np.diag(root)).sum() for root in roots])

    def residuals(self, z, found):
        """Return the whitened residuals (n, m) of latents z (n, k) under hypotheses, one a row."""
        evidence = self.evidence
        rivers = unfold(self.frame, self.latents.members(z, found))
        return self.whitened(rivers.at(evidence.distance_km), rivers, found)

    def whitened(self, do_mg_l, rivers, found):
        """Return the whitened residuals of oxygen (m, n) at the readings, and of the demand of the rivers."""
        evidence = self.evidence
        apart = (evidence.do_mg_l[:, None] - do_mg_l).T
        residual = np.empty_like(apart)
        for kind, unroot in enumerate(self.unroot):
            rows = found.errors == kind
            residual[rows] = apart[rows] @ unroot.T
        if not len(evidence.bod_km):
            return residual
        demand = rivers.at(evidence.bod_km, demand=True)[1]
        bod = ((evidence.bod_mg_l[:, None] - demand) / evidence.bod_sd_mg_l[:, None]).T
        return np.concatenate([residual, bod], axis=1)

    def linearised(self, z, found):
        """Return residuals (h, m) at z (h, k) and the slope of the prediction there (h, m, k), whitened."""
        h, k = z.shape
        steps = np.concatenate([np.zeros((1, k)), _STEP * np.eye(k)])
        rows = (z[:, None] + steps).reshape(h * (k + 1), k)
        residual = self.residuals(rows, found.rows(np.repeat(np.arange(h), k + 1))).reshape(h, k + 1, -1)
        return residual[:, 0], np.swapaxes(residual[:, :1] - residual[:, 1:], 1, 2) / _STEP


def modes(likelihood, found):
    """Return the Modes of all hypotheses, without those of negligible probability.

    The plan's own come first; the others begin where it ended, which saves them half of their steps.
    """
    simple = found.structure == PLAN
    plan = _climb(likelihood, found.rows(simple), np.zeros((simple.sum(), likelihood.latents.count)), _FIRST_ROUND)
    start = np.repeat(plan.z[[plan.log_evidence.argmax()]], (~simple).sum(), axis=0)
    others = _climb(likelihood, found.rows(~simple), start, _SECOND_ROUND)
    both = Modes(
        Hypotheses(*(np.concatenate(pair) for pair in zip(_parts(plan.found), _parts(others.found), strict=True))),
        *(np.concatenate(pair) for pair in zip(_parts(plan)[1:], _parts(others)[1:], strict=True)),
    )
    kept = _not_negligible(both.log_evidence, _NEGLIGIBLE)
    return Modes(both.found.rows(kept), *(part[kept] for part in _parts(both)[1:]))


def _parts(one):
    return tuple(vars(one).values())


def _climb(likelihood, found, z, steps):
    """Return the Modes of hypotheses from latents z (h, k) on, dropping on the way those that will not matter."""
    residual, slope = likelihood.linearised(z, found)
    objective, damping = _objective(z, residual), np.full(len(z), 0.1)
    for step in range(steps if len(z) else 0):
        tried = np.clip(z + _step(z, residual, slope, damping), -_FARTHEST, _FARTHEST)
        new_residual, new_slope = likelihood.linearised(tried, found)
        new_objective = _objective(tried, new_residual)
        better = new_objective < objective
        gained = np.where(better, objective - new_objective, 0.0).max()
        z, objective = np.where(better[:, None], tried, z), np.where(better, new_objective, objective)
        residual = np.where(better[:, None], new_residual, residual)
        slope = np.where(better[:, None, None], new_slope, slope)
        damping = np.where(better, damping / 8, np.maximum(damping, 0.05) * 8)
        if step == 1:
            kept = _not_negligible(_evidence(likelihood, found, objective, slope), 2 * _NEGLIGIBLE)
            found, z, residual, slope = found.rows(kept), z[kept], residual[kept], slope[kept]
            objective, damping = objective[kept], damping[kept]
        if step > 0 and better.any() and gained < _GAINED:
            break
    return Modes(found, z, residual, slope, objective, _evidence(likelihood, found, objective, slope))


def _objective(z, residual):
    return 0.5 * ((z**2).sum(axis=1) + (residual**2).sum(axis=1))


def _step(z, residual, slope, damping):
    curvature = np.swapaxes(slope, 1, 2) @ slope
    curvature[:, np.arange(z.shape[1]), np.arange(z.shape[1])] += 1 + damping[:, None]
    downhill = (np.swapaxes(slope, 1, 2) @ residual[:, :, None])[:, :, 0] - z
    step = np.linalg.solve(curvature, downhill[:, :, None])[:, :, 0]
    return step * np.minimum(1.0, _LONGEST_STEP / np.maximum(np.abs(step).max(axis=1), 1e-12))[:, None]


def _evidence(likelihood, found, objective, slope):
    """Return the log evidence of each hypothesis by Laplace's approximation, up to a constant."""
    k = slope.shape[2]
    size = np.linalg.slogdet(np.eye(k) + np.swapaxes(slope, 1, 2) @ slope)[1]
    return found.log_prior - objective - 0.5 * size - likelihood.log_size[found.errors]


def _not_negligible(log_evidence, margin):
    return log_evidence > log_evidence.max(initial=-np.inf) - margin


@lru_cache(maxsize=16)
def _normals(rows, columns, seed):
    """Return fixed standard normal numbers, half of them the others' mirror images, and fixed chi-squares."""
    draw = np.random.default_rng(seed)
    half = draw.standard_normal(((rows + 1) // 2, columns))
    normals = np.empty((rows, columns))
    normals[::2], normals[1::2] = half, -half[: rows // 2]
    squares = draw.chisquare(_FREEDOM, (rows + 1) // 2)
    return normals, np.repeat(squares, 2)[:rows]


@dataclass(frozen=True)
class Draws:
    """Weighted plausible rivers after the readings: latents (n, k), hypothesis of each, and its weight."""

    z: np.ndarray
    found: Hypotheses
    weight: np.ndarray
    rivers: object
    do_mg_l: np.ndarray
    truth: np.ndarray
    residual: np.ndarray

    @property
    def effective(self):
        """The effective number of draws."""
        return float(1 / (self.weight**2).sum())


def draws(likelihood, best, points_km, scale_km, settings):
    """Return the Draws, with oxygen at points_km (p, n) including the smooth misfit, and each meter's bias (b, n)."""
    n = settings.draws
    counts = _allotted(best.share, n)
    which = np.repeat(np.arange(len(counts)), counts)
    k = best.z.shape[1]
    normals, squares = _normals(n, k, 20)
    tail = normals / np.sqrt(squares / _FREEDOM)[:, None]
    z, log_spread = np.empty((n, k)), np.empty(n)
    curvature = np.eye(k) + np.swapaxes(best.slope, 1, 2) @ best.slope
    for place, (root, mode) in enumerate(zip(np.linalg.cholesky(curvature), best.z, strict=True)):
        rows = which == place
        z[rows] = mode + settings.inflation * np.linalg.solve(root.T, tail[rows].T).T
        log_spread[rows] = np.log(np.diag(root)).sum()
    found = best.found.rows(which)
    evidence = likelihood.evidence
    rivers = unfold(likelihood.frame, likelihood.latents.members(z, found))
    do = rivers.at(np.concatenate([evidence.distance_km, points_km]))
    readings = len(evidence.distance_km)
    residual = likelihood.whitened(do[:readings], rivers, found)
    log_target = found.log_prior - _objective(z, residual) - likelihood.log_size[found.errors]
    log_drawn = log_spread - 0.5 * (_FREEDOM + k) * np.log1p((tail**2).sum(axis=1) / _FREEDOM)
    weight = _weights(log_target - log_drawn - np.log(counts[which]))
    truth = _conditioned(evidence, points_km, scale_km, settings, evidence.do_mg_l[:, None] - do[:readings], found)
    oxygen = np.maximum(do[readings:] + truth[: len(points_km)], 0.0)
    return Draws(z, found, weight, rivers, oxygen, truth, residual)


def _allotted(share, n):
    """Return how many draws each hypothesis gets: by its probability, none without."""
    edges = np.round(np.cumsum(share) * n).astype(int)
    counts = np.maximum(np.diff(edges, prepend=0), 2)
    counts[share.argmax()] -= counts.sum() - n
    return counts


def _weights(log_weight):
    """Return normalised weights, the largest cut back so that no single draw decides."""
    weight = np.exp(log_weight - log_weight.max())
    weight = np.minimum(weight, weight.mean() * np.sqrt(len(weight)))
    return weight / weight.sum()


def _conditioned(evidence, points_km, scale_km, settings, apart, found):
    """Return draws of the smooth misfit at points and of each meter's bias, given the differences apart (m, n)."""
    size = len(points_km) + evidence.meters
    normals = _normals(apart.shape[1], size, 21)[0].T
    drawn = np.empty((size, apart.shape[1]))
    for kind, (readings, across, truth) in enumerate(covariances(evidence, points_km, scale_km, settings)):
        rows = found.errors == kind
        if not rows.any():
            continue
        gain = np.linalg.solve(readings, across.T).T
        left = truth - gain @ across.T
        root = np.linalg.cholesky(left + (1e-9 + 1e-6 * truth.max()) * np.eye(size))
        drawn[:, rows] = gain @ apart[:, rows] + root @ normals[:, rows]
    return drawn
