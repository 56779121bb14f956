"""Estimate, where next and verdict together, 40 readings and 40 access points: python -m tests.bench.estimate

On the demo's real river (five reaches, a tributary, a weir), with readings of its true river. Beside it one plain pass
of numpy over a matrix as large as the draws' oxygen at the readings and access points: exponentials and one product.
"""

import os

os.environ.setdefault("OMP_NUM_THREADS", "1")

from time import process_time

import numpy as np

from calc.fit import refine
from calc.sag import predict
from calc.siting import next_station, verdict
from demo_survey import make
from webapp.plan.prediction import predict_plan

READINGS, ACCESS, DRAWS = 40, 40, 512
GOAL_MS = 100.0


def timed_ms(deed, repeats=15):
    """Return median and 95th percentile of the processor time of a deed. [ms]"""
    times = []
    for _ in range(repeats):
        begun = process_time()
        deed()
        times.append(1e3 * (process_time() - begun))
    return float(np.median(times)), float(np.quantile(times, 0.95))


def all_three(plan, stations_km, do_mg_l, access_km):
    """Estimate, site and judge once."""
    estimate = refine(plan, stations_km, do_mg_l)
    next_station(plan, stations_km, do_mg_l, access_km, estimate=estimate)
    return verdict(plan, stations_km, do_mg_l, estimate=estimate, access_km=access_km)


def plain_pass():
    """Return a deed that works once over a matrix of draws by places."""
    rng = np.random.default_rng(1)
    rates, places = rng.uniform(0.1, 5, (DRAWS, 1)), np.linspace(0, 1, READINGS + ACCESS)

    def deed():
        oxygen = 9 - 5 * np.exp(-rates * places) + 4 * np.exp(-2 * rates * places)
        return oxygen.T @ oxygen

    return deed


def main():
    """Print the times and the ratio."""
    plan = predict_plan(make.PLAN, make.ELEVATION_M).river
    stations_km = np.linspace(0.9, 30.0, READINGS)
    noise = np.random.default_rng(7).normal(0, 0.12, READINGS)
    do_mg_l = predict(make.true_river(), stations_km).do_mg_l + noise
    access_km = np.linspace(0.5, 31.5, ACCESS)
    answer = all_three(plan, stations_km, do_mg_l, access_km)
    median, high = timed_ms(lambda: all_three(plan, stations_km, do_mg_l, access_km))
    plain, _ = timed_ms(plain_pass(), 200)
    print(f"{READINGS} readings, {ACCESS} access points: median {median:.0f} ms, 95th percentile {high:.0f} ms "
          f"of processor time (goal {GOAL_MS:.0f}); answer: {answer.word}")  # fmt: skip
    print(f"one plain pass over {DRAWS} x {READINGS + ACCESS}: {plain:.2f} ms, ratio {median / max(plain, 1e-3):.0f}")


if __name__ == "__main__":
    main()
