"""Times saturation over a million values against one vectorised pass of the same terms in numpy.

Run it as `python tests/bench/saturation.py`. The pass has no range checks and knows its coefficients; goal: ratio <= 2.
"""

import sys
from pathlib import Path
from timeit import repeat

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2]))

from calc.oxygen import saturation_mg_l


def fresh_pass(celsius):
    """Return the exponent of fresh-water saturation at 1 atm, and 1/T, from the published terms."""
    x = 1 / (celsius + 273.15)
    return -139.34411 + x * (1.575701e5 + x * (-6.642308e7 + x * (1.2438e10 - x * 8.621949e11))), x


def full_pass(celsius, pressure_mmhg, salinity):
    """Return saturation at any pressure and salinity from the published terms. [mg/L]"""
    ln_fresh, x = fresh_pass(celsius)
    ln_salinity = salinity * (0.017674 + x * (-10.754 + x * 2140.7))
    vapour = np.exp(11.8571 + x * (-3840.70 - x * 216961))
    theta = 0.000975 + celsius * (-1.426e-5 + celsius * 6.436e-8)
    pressure = pressure_mmhg / 760
    return np.exp(ln_fresh - ln_salinity) * (pressure - vapour) * (1 - theta * pressure) / ((1 - vapour) * (1 - theta))


def main(count=1_000_000, rounds=9):
    """Print both times and their ratio, for arrays of every argument and for temperature alone."""
    draw = np.random.default_rng(1)
    temps, pressures, salinities = (draw.uniform(low, high, count) for low, high in ((0, 40), (400, 800), (0, 40)))
    report(
        "every argument",
        lambda: saturation_mg_l(temps, pressures, salinities),
        lambda: full_pass(temps, pressures, salinities),
        rounds,
    )
    report("temperature alone", lambda: saturation_mg_l(temps), lambda: np.exp(fresh_pass(temps)[0]), rounds)


def report(label, ours, plain, rounds):
    """Print the best time of each and the ratio."""
    ours_s, plain_s = (min(repeat(call, number=1, repeat=rounds)) for call in (ours, plain))
    print(f"{label}: {ours_s * 1e3:.1f} ms, one pass {plain_s * 1e3:.1f} ms, ratio {ours_s / plain_s:.2f}")


if __name__ == "__main__":
    main()
