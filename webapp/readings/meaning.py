"""What a reading means for the sag, in one sentence and at most a few short ones after it."""

from dataclasses import dataclass

ABOVE, FALLING, LOWEST, RISING = "above the outfall", "falling", "lowest", "rising"
# What a careful reading and a good prediction may differ by: less says nothing about the sag.
NEAR_MG_L = 0.3
# What two careful readings may differ by: less is neither a rise nor a fall of the river.
LEVEL_MG_L = 0.2
BY_PLANTS = "Plants give off oxygen in the light; before dawn it will be lower."


@dataclass(frozen=True)
class Facts:
    """What the sentence rests on; None where it is not known.

    limb is where the plan has the station: ABOVE the outfall, on the FALLING or RISING limb or where oxygen is LOWEST.
    upstream_difference and downstream_difference are read less predicted at the neighbours, upstream_do_mg_l what was
    read there. lowest_at is "first" or "last" where this is the lowest of several stations read and nothing was read
    above or below it.
    """

    code: str
    do_mg_l: float
    percent: float | None = None
    predicted_mg_l: float | None = None
    low_mg_l: float | None = None
    high_mg_l: float | None = None
    limb: str | None = None
    missing: str = ""
    upstream_code: str = ""
    upstream_do_mg_l: float | None = None
    upstream_difference: float | None = None
    downstream_code: str = ""
    downstream_difference: float | None = None
    criterion_mg_l: float | None = None
    lowest_at: str = ""
    nothing_below_mg_l: float = 0.2

    @property
    def difference(self):
        """Return read less predicted."""
        return None if self.predicted_mg_l is None else self.do_mg_l - self.predicted_mg_l

    @property
    def in_band(self):
        """Return whether the plan's own doubts allow the reading."""
        return self.low_mg_l <= self.do_mg_l <= self.high_mg_l


def sentence(facts):
    """Return what the reading means, in one sentence."""
    if facts.do_mg_l < facts.nothing_below_mg_l:
        return _without_oxygen(facts)
    if facts.predicted_mg_l is None:
        return _without_prediction(facts)
    if abs(facts.difference) <= NEAR_MG_L:
        return f"As predicted: the plan has {_band(facts)} here."
    if facts.limb == ABOVE:
        brings = "less" if facts.difference < 0 else "more"
        return f"{_apart(facts)}: the river brings {brings} oxygen than planned, and the sag starts from that."
    return f"{_apart(facts)}: {_lower(facts) if facts.difference < 0 else _higher(facts)}."


def afterwards(facts):
    """Return the short sentences that follow: neighbours, plants, criterion, an end that is still open."""
    says = []
    if facts.predicted_mg_l is not None and abs(facts.difference) > NEAR_MG_L:
        if facts.in_band:
            says.append(f"The plan's own doubts allow it: {facts.low_mg_l:.1f} to {facts.high_mg_l:.1f} mg/L.")
        if neighbours := _neighbours(facts):
            says.append(neighbours)
    if facts.percent is not None and facts.percent > 100:
        says.append(f"Above saturation. {BY_PLANTS}")
    if facts.criterion_mg_l is not None and facts.do_mg_l < facts.criterion_mg_l:
        says.append(f"Below the criterion of {facts.criterion_mg_l:g} mg/L.")
    if facts.lowest_at == "last":
        says.append(f"The lowest so far, and the last station downstream: the low point may lie below {facts.code}.")
    elif facts.lowest_at == "first":
        says.append(f"The lowest so far, and the first station: the low point may lie above {facts.code}.")
    return tuple(says)


def _without_oxygen(facts):
    if facts.predicted_mg_l is None:
        return "No oxygen that a meter could tell from zero."
    if facts.predicted_mg_l < facts.nothing_below_mg_l:
        return "No oxygen that a meter could tell from zero, as predicted."
    return f"No oxygen that a meter could tell from zero, where the plan has {_band(facts)}."


def _without_prediction(facts):
    if facts.limb == ABOVE:
        return "Background, above the outfall: what the river brings."
    return f"Nothing to compare with: {facts.missing or 'the plan does not reach this station.'}"


def _lower(facts):
    if facts.limb == FALLING:
        return "oxygen falls faster than planned, so the sag is deeper or comes earlier"
    if facts.limb == RISING:
        return "the sag is deeper or further along than planned" + _still_falling(facts)
    return "the sag is deeper than planned" + _still_falling(facts)


def _still_falling(facts):
    if facts.upstream_do_mg_l is None:
        return f"; the low point may lie downstream of {facts.code}"
    change = facts.do_mg_l - facts.upstream_do_mg_l
    if abs(change) < LEVEL_MG_L:
        return f"; oxygen is level from {facts.upstream_code} to here: the low point may lie downstream of {facts.code}"
    falls = change < 0
    where = f"may lie downstream of {facts.code}" if falls else f"lies upstream of {facts.code}"
    return f"; oxygen {'still falls' if falls else 'rises'} from {facts.upstream_code} to here: the low point {where}"


def _higher(facts):
    if facts.limb == FALLING:
        return "oxygen falls more slowly than planned, so the sag is shallower or comes later"
    if facts.limb == RISING:
        return "the river has recovered further than planned, so the sag is shallower or came earlier"
    return "the sag is shallower than planned, or its low point lies elsewhere"


def _neighbours(facts):
    """Return whether the neighbours say the same, where any was read."""
    beside = [
        (code, difference)
        for code, difference in (
            (facts.upstream_code, facts.upstream_difference),
            (facts.downstream_code, facts.downstream_difference),
        )
        if difference is not None
    ]
    alike = [code for code, difference in beside if difference * facts.difference > 0 and _half(difference, facts)]
    if alike:
        return f"{' and '.join(alike)} {'differs' if len(alike) == 1 else 'differ'} the same way: it is the river."
    if beside and not any(_half(difference, facts) for _, difference in beside):
        codes = [code for code, _ in beside]
        return f"{' and '.join(codes)} {'fits' if len(codes) == 1 else 'fit'} the plan: read here once more to be sure."
    return ""


def _half(difference, facts):
    return abs(difference) >= abs(facts.difference) / 2


def _apart(facts):
    return f"{abs(facts.difference):.1f} mg/L {'lower' if facts.difference < 0 else 'higher'} than predicted"


def _band(facts):
    return f"{facts.predicted_mg_l:.1f} mg/L ({facts.low_mg_l:.1f} to {facts.high_mg_l:.1f})"
