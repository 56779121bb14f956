"""Readings made ready for an estimate: those that count, replicates averaged, at the temperatures of the day.

Oxygen is compared at the water's own temperature: the plan is warmed or cooled by the middle difference between the
temperatures read and planned, and what a single reading still differs goes through saturation, so that the deficit is
compared.
"""

from dataclasses import dataclass, replace

import numpy as np

from calc.errors import OutOfRangeError
from calc.oxygen import salinity_psu, saturation_mg_l
from calc.sag import predict
from calc.unmeasured import completed


@dataclass(frozen=True)
class Evidence:
    """What an estimate goes by, one row a station visit and meter, upstream first.

    distance_km, do_mg_l (as if at the plan's temperature), error_sd_mg_l, meter (a place in meters), count of readings;
    row: for each reading given, its row or -1. bod_km, bod_mg_l, bod_sd_mg_l: measured demand. noise_mg_l is the error
    of a single reading. dropped: sentences on what could not be used. warmer_c is how much the plan was warmed.
    """

    distance_km: np.ndarray
    do_mg_l: np.ndarray
    error_sd_mg_l: np.ndarray
    meter: np.ndarray
    meters: int
    row: np.ndarray
    bod_km: np.ndarray
    bod_mg_l: np.ndarray
    bod_sd_mg_l: np.ndarray
    noise_mg_l: float
    dropped: tuple[str, ...]
    warmer_c: float

    @property
    def stations_km(self):
        """The distinct distances with a reading. [km]"""
        return np.unique(self.distance_km)


def gather(plan, stations_km, do_mg_l, *, water_temp_c=None, meters=None, visits=None, used=None, bod=None, settings):
    """Return the plan completed and warmed, and the Evidence; the arguments are those of calc.fit.refine."""
    plan = completed(plan)
    distance, do = (np.atleast_1d(np.asarray(values, dtype=float)) for values in (stations_km, do_mg_l))
    if distance.shape != do.shape or distance.ndim != 1:
        raise OutOfRangeError(f"do_mg_l must have the shape of stations_km {distance.shape}, got {do.shape}")
    count = len(distance)
    used = np.ones(count, dtype=bool) if used is None else np.asarray(used, dtype=bool)
    celsius = np.full(count, np.nan) if water_temp_c is None else np.asarray(water_temp_c, dtype=float)
    labels = _codes(meters, count), _codes(visits, count)
    valid, dropped = _valid(plan, distance, do, used)
    plan, warmer, do = _at_plan_temperature(plan, distance, do, celsius, valid)
    key = np.stack([distance, *labels], axis=1)[valid]
    groups, row_of, sizes = np.unique(key, axis=0, return_inverse=True, return_counts=True)
    row_of = row_of.reshape(-1)
    means = np.bincount(row_of, weights=do[valid], minlength=len(groups)) / np.maximum(sizes, 1)
    noise = _noise(do[valid] - means[row_of], int((sizes - 1).sum()), settings)
    row = np.full(count, -1)
    row[valid] = row_of
    bod_km, bod_mg_l, bod_sd, unused = _bod(plan, bod)
    return plan, Evidence(
        distance_km=groups[:, 0],
        do_mg_l=means,
        # Half of the error is the station's own, which reading it again at once does not average out.
        error_sd_mg_l=noise * np.sqrt(0.5 + 0.5 / np.maximum(sizes, 1)),
        meter=groups[:, 1].astype(int),
        meters=int(labels[0].max(initial=0)) + 1,
        row=row,
        bod_km=bod_km,
        bod_mg_l=bod_mg_l,
        bod_sd_mg_l=bod_sd,
        noise_mg_l=noise,
        dropped=(*dropped, *unused),
        warmer_c=warmer,
    )


def _codes(labels, count):
    """Return a number for each label, in sorted order, so that the order of readings does not matter."""
    if labels is None:
        return np.zeros(count, dtype=int)
    names = ["" if label is None else str(label) for label in labels]
    if len(names) != count:
        raise OutOfRangeError(f"meters and visits must hold one label for each of {count} readings, got {len(names)}")
    return np.unique(names, return_inverse=True)[1].reshape(-1)


def _valid(plan, distance, do, used):
    """Return which readings count, and sentences on those that cannot."""
    reasons = (
        (
            "{count} of the readings {is_are} beyond the plan, which covers {low:g} to {high:g} km.",
            used & np.isfinite(do) & ((distance < plan.from_km) | (distance > plan.to_km)),
        ),
        ("{count} of the readings {has_have} no distance.", used & np.isfinite(do) & ~np.isfinite(distance)),
        (
            "{count} of the readings {is_are} no possible oxygen (below 0 or above 60 mg/L).",
            used & np.isfinite(do) & ((do < 0) | (do > 60)),
        ),
    )
    valid, sentences = used & np.isfinite(do), []
    for text, bad in reasons:
        if bad.any():
            one = bad.sum() == 1
            words = {"is_are": "is" if one else "are", "has_have": "has" if one else "have"}
            sentences.append(text.format(count=bad.sum(), low=plan.from_km, high=plan.to_km, **words))
        valid = valid & ~bad
    return valid, sentences


def _at_plan_temperature(plan, distance, do, celsius, valid):
    """Return the plan at the day's temperature, by how much it is warmer, and oxygen as if read at its temperature."""
    known = valid & np.isfinite(celsius) & (celsius >= 0) & (celsius <= 40)
    if not known.any():
        return plan, 0.0, do
    profile = predict(plan, distance[known])
    warmer = float(np.median(celsius[known] - profile.water_temp_c))
    temperatures = _temperatures(plan)
    warmer = float(np.clip(warmer, -min(temperatures), 40 - max(temperatures)))
    plan = _warmed(plan, warmer)
    profile = predict(plan, distance[known])
    salinity = salinity_psu(np.nan_to_num(profile.conductance_us_cm))
    at_reading = saturation_mg_l(celsius[known], plan.pressure_mmhg, salinity)
    do = do.copy()
    do[known] += profile.saturation_mg_l - at_reading
    return plan, warmer, do


def _temperatures(plan):
    joining = [inflow.water.water_temp_c for inflow in plan.inflows if inflow.kind != "withdrawal"]
    fixed = [reach.water_temp_c for reach in plan.reaches if reach.water_temp_c is not None]
    return [plan.head.water_temp_c, *joining, *fixed]


def _warmed(plan, warmer_c):
    def warm(water):
        return replace(water, water_temp_c=water.water_temp_c + warmer_c)

    return replace(
        plan,
        head=warm(plan.head),
        inflows=tuple(
            inflow if inflow.kind == "withdrawal" else replace(inflow, water=warm(inflow.water))
            for inflow in plan.inflows
        ),
        reaches=tuple(reach if reach.water_temp_c is None else warm(reach) for reach in plan.reaches),
    )


def _noise(residuals, degrees, settings):
    """Return the error of a reading from its replicates, drawn towards the stated one while there are few."""
    prior = settings.replicate_prior
    squares = prior * settings.noise_mg_l**2 + float(residuals @ residuals)
    return max(float(np.sqrt(squares / (prior + degrees))), settings.noise_mg_l / 3)


def _bod(plan, bod):
    """Return the distances, values and errors of measured demand within the plan, and sentences on the rest."""
    if bod is None:
        return *(np.empty(0),) * 3, ()
    distance, value, deviation = np.broadcast_arrays(*(np.atleast_1d(np.asarray(each, dtype=float)) for each in bod))
    known = np.isfinite(distance) & np.isfinite(value) & np.isfinite(deviation) & (value >= 0) & (deviation > 0)
    inside = known & (distance >= plan.from_km) & (distance <= plan.to_km)
    unused = int((~inside).sum())
    said = (f"{unused} of the measured demands could not be used.",) if unused else ()
    return distance[inside], value[inside], deviation[inside], said


def covariances(evidence, points_km, scale_km, settings):
    """Return for each kind of error the covariance of the readings, of readings with truth, and of the truth.

    The truth is the smooth misfit at points_km, then the bias of each meter. Kinds: stated, large misfit, noisier.
    """
    length = settings.misfit_length * scale_km
    apart = np.abs(evidence.distance_km[:, None] - evidence.distance_km)
    across = np.abs(points_km[:, None] - evidence.distance_km)
    beside = np.abs(points_km[:, None] - points_km)
    same_meter = settings.bias_mg_l**2 * (evidence.meter[:, None] == evidence.meter)
    biases = settings.bias_mg_l**2 * (np.arange(evidence.meters)[:, None] == evidence.meter)
    noise = np.diag(evidence.error_sd_mg_l**2)
    shapes = [matern(each, length) for each in (apart, across, beside)]
    found = []
    for misfit, noisier in (
        (settings.misfit_mg_l, 1.0),
        (settings.large_misfit_mg_l, 1.0),
        (settings.misfit_mg_l, settings.noisier),
    ):
        truth = np.zeros((len(points_km) + evidence.meters,) * 2)
        truth[: len(points_km), : len(points_km)] = misfit**2 * shapes[2]
        truth[len(points_km) :, len(points_km) :] = settings.bias_mg_l**2 * np.eye(evidence.meters)
        readings = misfit**2 * shapes[0] + same_meter + noisier**2 * noise
        found.append((readings, np.concatenate([misfit**2 * shapes[1], biases]), truth))
    return found


def matern(apart, length):
    """Return the Matérn 5/2 correlation of places so far apart."""
    ratio = np.sqrt(5) * apart / length
    return (1 + ratio + ratio**2 / 3) * np.exp(-ratio)
