"""What the outcomes of siting add up to: a table of every strategy, the stop rule, and the goals with pass or fail."""

from dataclasses import dataclass
from math import nan

import numpy as np

from tests.bench.siting_strategies import EVEN, LOWEST, NEXT, ORACLE, SIZES, TOLD, UNRESTRAINED

_RESAMPLES = 400
_HEADS = ["n", "all", "DO rms", "DO p90", "place med", "p90", "regret", "in DO", "in place", "between", "km", "ms"]


@dataclass(frozen=True)
class Goal:
    """A row of the comparison: what is compared, our value with its standard error, the limits, the study's value."""

    text: str
    value: float
    error: float
    low: float
    high: float
    study: str

    @property
    def reached(self):
        """Whether the value lies within its limits; False when it is not known."""
        return bool(self.low <= self.value <= self.high)


class Outcomes:
    """The outcomes of one run, by strategy, number of stations and river."""

    def __init__(self, outcomes):
        self._by_key = {}
        for outcome in outcomes:
            self._by_key.setdefault((outcome.strategy, outcome.n), {})[outcome.index] = outcome
        self.strategies = list(dict.fromkeys(outcome.strategy for outcome in outcomes))

    def at(self, strategy, n):
        """Return the outcomes of a strategy with n stations, in the order of the rivers."""
        found = self._by_key.get((strategy, n), {})
        return [found[index] for index in sorted(found)]

    def pair(self, first, second, kept=lambda outcome: True):
        """Return the outcomes of two (strategy, n) on the rivers that both have, in the same order."""
        ours, theirs = self._by_key.get(first, {}), self._by_key.get(second, {})
        both = [index for index in sorted(ours.keys() & theirs.keys()) if kept(ours[index])]
        return [ours[index] for index in both], [theirs[index] for index in both]


def values(outcomes, name):
    """Return one field of outcomes as an array."""
    return np.array([getattr(outcome, name) for outcome in outcomes], dtype=float)


def rms(errors):
    """Return the root mean square, NaN of nothing."""
    return float(np.sqrt(np.mean(np.square(errors)))) if len(errors) else nan


def percentile(numbers, share):
    """Return a percentile of the numbers that are known, NaN of nothing."""
    known = numbers[~np.isnan(numbers)]
    return float(np.percentile(known, share)) if len(known) else nan


_STATISTICS = {
    "DO rms": lambda found: rms(found["do_error_mg_l"]),
    "DO p90": lambda found: percentile(np.abs(found["do_error_mg_l"]), 90),
    "place med": lambda found: percentile(np.abs(found["place_error"]), 50),
    "regret": lambda found: float(np.mean(found["regret_mg_l"])),
    "between": lambda found: float(np.mean(found["between"])),
    "km": lambda found: float(np.mean(found["driving_km"])),
}
_FIELDS = ("do_error_mg_l", "place_error", "regret_mg_l", "between", "driving_km")


def compared(ours, theirs, statistic, join=np.divide):
    """Return a ratio (or difference) of two strategies on the same rivers, and its standard error over the rivers."""
    if not ours:
        return nan, nan
    tables = [{name: values(side, name) for name in _FIELDS} for side in (ours, theirs)]
    measure = _STATISTICS[statistic]
    draw = np.random.default_rng(1)
    resampled = []
    for _ in range(_RESAMPLES):
        chosen = draw.integers(0, len(ours), len(ours))
        sides = [measure({name: value[chosen] for name, value in table.items()}) for table in tables]
        resampled.append(join(*sides))
    return float(join(*(measure(table) for table in tables))), float(np.std(resampled))


def goals(found):
    """Return the Goals, for those strategies that were run."""
    rows = []

    def ratio(first, second, statistic, high, study, kept=lambda outcome: True):
        value, error = compared(*found.pair(first, second, kept), statistic)
        text = f"{first[0]} {first[1]} / {second[0]} {second[1]}: {statistic}"
        rows.append(Goal(text, value, error, 0.0, high, study))

    ours = (NEXT, 6)
    ratio(ours, (LOWEST, 10), "place med", 0.50, "0.46")
    ratio(ours, (LOWEST, 10), "regret", 0.50, "0.49")
    ratio(ours, (LOWEST, 10), "DO rms", 0.88, "0.85")
    for statistic, study in (("DO rms", "1.00"), ("DO p90", "1.02"), ("regret", "1.03")):
        ratio(ours, (EVEN, 10), statistic, 1.05, study)
    ratio(ours, (EVEN, 6), "DO rms", 0.92, "0.89")
    ratio(ours, (EVEN, 6), "regret", 0.90, "0.88")
    value, error = compared(*found.pair(ours, (EVEN, 6)), "between", np.subtract)
    rows.append(Goal(f"{NEXT} 6 - {EVEN} 6: between", value, error, 0.05, 1.0, "0.08"))
    ratio((TOLD, 6), ours, "regret", 0.60, "0.55", lambda outcome: outcome.kind != "one reach")
    for name, text in (("do_inside", "DO"), ("place_inside", "place")):
        inside = values(found.at(*ours), name)
        spread = float(np.std(inside) / np.sqrt(max(len(inside), 1))) if len(inside) else nan
        value = float(np.mean(inside)) if len(inside) else nan
        rows.append(Goal(f"{NEXT} 6: 90 % interval of {text} covers", value, spread, 0.87, 0.94, "0.90-0.92"))
    ratio(ours, (ORACLE, 6), "DO rms", 1.38, "1.38")
    ratio(ours, (UNRESTRAINED, 6), "km", 0.85, "0.82")
    asked = [outcome for n in SIZES for outcome in found.at(NEXT, n)]
    suggestion = values(asked, "suggest_ms")
    all_three = values(asked, "estimate_ms") + suggestion + values(asked, "verdict_ms")
    rows.append(Goal("one suggestion: ms, 95th percentile", percentile(suggestion, 95), nan, 0, 50, "25"))
    rows.append(Goal("estimate + where next + verdict: ms, 95th", percentile(all_three, 95), nan, 0, 100, "-"))
    return rows


def print_goals(rows):
    """Print the Goals; a row whose strategies were not run is left out."""
    print(f"\n{'compared':<74} {'ours':>7} {'± se':>6}  {'goal':<12} {'study':<10}")
    for row in rows:
        if np.isnan(row.value):
            continue
        limit = f"<= {row.high:g}" if row.low == 0 else f"{row.low:g} - {row.high:g}"
        word = "pass" if row.reached else "FAIL"
        print(f"{row.text:<74} {row.value:7.3f} {row.error:6.3f}  {limit:<12} {row.study:<10} {word}")


def print_table(found, sizes=SIZES):
    """Print every strategy at every size: errors, coverage of the 90 % intervals, driving, milliseconds an estimate."""
    print(f"{'strategy':<32}" + "".join(f"{head:>10}" for head in _HEADS))
    for strategy in found.strategies:
        for n in sizes:
            rows = found.at(strategy, n)
            if not rows:
                continue
            do, place = np.abs(values(rows, "do_error_mg_l")), 100 * np.abs(values(rows, "place_error"))
            cells = [f"{n:d}", f"{len(rows):d}", f"{rms(do):.3f}", f"{percentile(do, 90):.3f}"]
            cells += [f"{percentile(place, 50):.1f}%", f"{percentile(place, 90):.1f}%"]
            cells += [f"{np.mean(values(rows, 'regret_mg_l')):.4f}"]
            cells += [f"{100 * np.mean(values(rows, name)):.1f}%" for name in ("do_inside", "place_inside", "between")]
            cells += [f"{np.mean(values(rows, 'driving_km')):.0f}"]
            cells += [f"{percentile(values(rows, 'estimate_ms'), 50):.0f}"]
            print(f"{strategy:<32}" + "".join(f"{cell:>10}" for cell in cells))


def stopped(found, largest, words=("held",)):
    """Return for each river the outcome at which "where next" was first told one of words; None where it never was."""
    first = {}
    for n in range(1, largest + 1):
        for outcome in found.at(NEXT, n):
            if first.get(outcome.index) is None:
                first[outcome.index] = outcome if outcome.word in words else None
    return first


def print_stops(found, largest):
    """Print how soon the crew was told that the critical point is held, and what was true where it was."""
    for words in (("held",), ("held", "flat")):
        first = stopped(found, largest, words)
        ended = [outcome for outcome in first.values() if outcome is not None]
        if not ended:
            continue
        used = values(ended, "n")
        within = ", ".join(f"{np.sum(used <= n) / len(first):.0%} by {n}" for n in SIZES)
        print(f"\nstop at {' or '.join(words)}: {within}; never {1 - len(ended) / len(first):.0%}; ", end="")
        stations = np.mean([largest if outcome is None else outcome.n for outcome in first.values()])
        print(f"{np.mean(used):.1f} stations where stopped, {stations:.1f} over all")
        between, error = np.mean(values(ended, "between")), rms(values(ended, "do_error_mg_l"))
        regret, place = np.mean(values(ended, "regret_mg_l")), np.abs(values(ended, "place_error"))
        print(f"  where stopped: truly between stations {between:.1%}, DO rms {error:.3f}, ", end="")
        print(f"regret {regret:.4f}, place median {percentile(100 * place, 50):.1f}%")
    for n in SIZES:
        rows = found.at(NEXT, n)
        counts = {word: sum(row.word == word for row in rows) for word in sorted({row.word for row in rows})}
        print(f"  {n} stations: {counts}")
        for word in sorted({row.fit for row in rows}):
            print_coverage(f"    {word}", [row for row in rows if row.fit == word])


def print_coverage(label, rows):
    """Print how often the 90 % intervals of some outcomes hold the truth, and their errors."""
    do, place = np.mean(values(rows, "do_inside")), np.mean(values(rows, "place_inside"))
    error, regret = rms(values(rows, "do_error_mg_l")), np.mean(values(rows, "regret_mg_l"))
    print(f"{label}: {len(rows)}, covers DO {do:.0%}, place {place:.0%}, DO rms {error:.3f}, regret {regret:.4f}")


def print_times(found):
    """Print milliseconds of an estimate, a suggestion and a verdict: median and 95th percentile over all sizes."""
    rows = [outcome for n in SIZES for outcome in found.at(NEXT, n)]
    for name in ("estimate_ms", "suggest_ms", "verdict_ms"):
        spent = values(rows, name)
        print(f"{name[:-3]}: median {percentile(spent, 50):.1f} ms, 95th percentile {percentile(spent, 95):.1f} ms")


def print_worst(found, n, count):
    """Print the rivers with the largest errors of "where next", and those kinds of river it does worst at."""
    rows = found.at(NEXT, n)
    if not rows or not count:
        return
    squares = np.sort(np.square(values(rows, "do_error_mg_l")))[::-1]
    share = squares[:count].sum() / squares.sum()
    print(f"\nthe worst {count} of {NEXT} {n} carry {share:.0%} of the squared DO error")
    for row in sorted(rows, key=lambda row: -abs(row.do_error_mg_l))[:count]:
        print(
            f"  river {row.index} ({row.kind}): DO error {row.do_error_mg_l:+.2f} half {row.do_half_mg_l:.2f}, "
            f"place {row.place_error:+.0%} half {row.place_half:.0%}, regret {row.regret_mg_l:.3f}, "
            f"{'between' if row.between else 'outside'}, {row.word}, {row.fit}"
        )
    for kind in sorted({row.kind for row in rows}):
        print_coverage(f"  {kind}", [row for row in rows if row.kind == kind])
