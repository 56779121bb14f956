"""What the pages about bottles show: each bottle with its clock, its way and its results."""

from collections import Counter
from dataclasses import dataclass
from datetime import datetime, timedelta

from calc.findings import Finding
from calc.quality_bottle import bottle_counts
from webapp.bottles import queries, service
from webapp.bottles.judged import JudgedBottle
from webapp.models import HandOver
from webapp.plan.queries import current_plan
from webapp.readings.settling import thresholds
from webapp.surveys.queries import current_settings

_ORDER = {"past": 0, "soon": 1, "ok": 2, "": 3}


@dataclass(frozen=True)
class Line:
    """A bottle as a page shows it: until is when its hold time ends, running whether its clock still runs.

    trail holds the hand-overs it was in, oldest first; keeper is who has it.
    """

    judged: JudgedBottle
    until: datetime
    left_h: float
    running: bool
    trail: tuple[HandOver, ...]
    kept: tuple[str, ...] = ()

    @property
    def bottle(self):
        """Return the bottle."""
        return self.judged.bottle

    @property
    def keeper(self):
        """Return who has it, as far as was told: who took it last, or else who filled it."""
        return self.trail[-1].took if self.trail else self.bottle.author.name


@dataclass(frozen=True)
class Bottles:
    """All bottles of a survey: those whose analysis has not begun first, the most urgent of them on top."""

    lines: tuple[Line, ...]
    hand_overs: tuple[HandOver, ...]
    counts: tuple[Finding, ...]
    stations: tuple[str, ...]

    @property
    def waiting(self):
        """Return how many bottles have no result."""
        return sum(not line.judged.reported for line in self.lines)

    @property
    def past(self):
        """Return how many bottles waited too long."""
        return sum(line.judged.hold.state == "past" for line in self.lines)


def bottles_page(db, survey, now):
    """Return the Bottles of a survey."""
    judged, hand_overs = service.judged_of(db, survey, now), queries.hand_overs_of(db, survey.id)
    lines = [line_of(one, hand_overs, now) for one in judged]
    lines.sort(key=lambda line: (not line.running, _ORDER[line.judged.hold.state], line.until))
    kinds = Counter(one.bottle.kind for one in judged)
    settings = thresholds(current_settings(db, survey.id))
    plan = current_plan(db, survey.id)
    rows = (plan.tables.get("stations") or []) if plan else []
    return Bottles(
        lines=tuple(lines),
        hand_overs=tuple(reversed(hand_overs)),
        counts=bottle_counts(kinds["sample"], kinds["replicate"], kinds["blank"], settings),
        stations=tuple(row["code"] for row in rows if row.get("state") != "dropped"),
    )


def bottle_page(db, survey, bottle_id, now):
    """Return the Line of one bottle. Raises NotFound."""
    bottle = queries.get_bottle(db, survey.id, bottle_id)
    judged = next(one for one in service.judged_of(db, survey, now) if one.bottle.id == bottle.id)
    return line_of(judged, queries.hand_overs_of(db, survey.id), now, queries.kept_of(db, survey.id, bottle_id))


def line_of(judged, hand_overs, now, kept=()):
    """Return the Line of a JudgedBottle; kept is what was asked about it on site."""
    bottle, result = judged.bottle, judged.result
    until = bottle.collected_at + timedelta(hours=judged.hold.limit_h)
    begun = (result is not None and result.started_at is not None) or (
        bottle.analysis == "chlorophyll_a" and bottle.filtered
    )
    trail = tuple(one for one in hand_overs if bottle.id in one.bottles)
    return Line(
        judged, until, (until - now).total_seconds() / 3600, not begun and not judged.reported, trail, tuple(kept)
    )
