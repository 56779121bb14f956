"""Compares ways of siting stations on simulated rivers, all on the same rivers in one run.

Run it from the top of the checkout: `python -m tests.bench.siting --rivers 300 --seed 1 --workers 2`. The rivers are
those of siting_rivers, the strategies those of siting_strategies. Times are processor time of one thread, so that what
else runs on the machine adds little. `--world other` runs instead through worlds unlike what the estimate assumes.
"""

import argparse
import os
import sys
from functools import partial
from multiprocessing import Pool
from time import perf_counter

# One process per worker; numpy's own threads would only get in the others' way. It must be set before numpy is loaded.
for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(name, "1")

from tests.bench.siting_report import (  # noqa: E402
    Outcomes,
    goals,
    print_goals,
    print_stops,
    print_table,
    print_times,
    print_worst,
)
from tests.bench.siting_rivers import WORLDS, simulated  # noqa: E402
from tests.bench.siting_strategies import EVEN, LOWEST, NEXT, SIZES, STRATEGIES, outcomes  # noqa: E402

_OTHER = (LOWEST, EVEN, NEXT)


def main(arguments=None):
    """Run the comparison and print it; return the Goals reached or not, by world."""
    options = _options(arguments)
    worlds = [world for world in WORLDS if world != "base"] if options.world == "other" else [options.world]
    rows_by_world = {}
    for world in worlds:
        strategies = options.strategies or (STRATEGIES if world == "base" else _OTHER)
        found = Outcomes(run(options.rivers, options.seed, world, strategies, options.sizes, options.workers))
        print(f"\nworld {world}, {options.rivers} rivers, seed {options.seed}")
        print_table(found)
        rows_by_world[world] = goals(found)
        if world == "base":
            print_goals(rows_by_world[world])
        print_stops(found, max(options.sizes))
        print_times(found)
        print_worst(found, 6, options.worst)
    return rows_by_world


def run(rivers, seed, world, strategies, sizes, workers=1):
    """Return the Outcomes of strategies at a number of simulated rivers; the same for any number of workers."""
    task = partial(_one, seed, world, strategies, sizes)
    began, found = perf_counter(), []
    with Pool(workers) if workers > 1 else _Here() as pool:
        for done, part in enumerate(pool.imap_unordered(task, range(rivers)), start=1):
            found.extend(part)
            if done % 25 == 0:
                spent_s = perf_counter() - began
                print(f"{world}: {done} of {rivers} rivers, {spent_s:.0f} s", file=sys.stderr, flush=True)
    return sorted(found, key=lambda outcome: (STRATEGIES.index(outcome.strategy), outcome.n, outcome.index))


class _Here:
    """A pool of no other process."""

    imap_unordered = staticmethod(map)

    def __enter__(self):
        return self

    def __exit__(self, *_):
        return None


def _one(seed, world, strategies, sizes, index):
    return outcomes(simulated(seed, index, world), strategies, sizes)


def _options(arguments):
    parser = argparse.ArgumentParser(prog="python -m tests.bench.siting", description=__doc__.split("\n")[0])
    parser.add_argument("--rivers", type=int, default=300)
    parser.add_argument("--seed", type=int, required=True)
    parser.add_argument("--workers", type=int, default=1)
    parser.add_argument("--world", choices=(*WORLDS, "other"), default="base")
    parser.add_argument("--worst", type=int, default=0, help="list the worst rivers of where next, 6 stations")
    parser.add_argument("--sizes", type=int, nargs="+", default=SIZES)
    parser.add_argument("--strategies", nargs="+", choices=STRATEGIES, default=None, metavar="NAME")
    return parser.parse_args(arguments)


if __name__ == "__main__":
    main()
