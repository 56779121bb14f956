"""Data to coordinates for the SVG templates. The viewBox is as wide as a phone, so text keeps its size there.

A chart holds tuples of Bands and Lines: a further line, as of a fitted sag, is one more of each.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from webapp.chart_axes import Scale, Tick, hour_step, multiples, plain, round_step
from webapp.chart_labels import Box, Label, beside, in_rows, shortened, text_width, without_collisions
from webapp.chart_lines import corners, points_text
from webapp.chart_words import description, rows_of, sentence_of

WIDTH = 360
LEFT, RIGHT, TOP, BOTTOM = 30, 350, 24, 214
ROW_HEIGHT, MOST_ROWS = 17, 6
LONGEST_NAME = 18
# The numbered mark of a candidate, and how far below its line it stands.
MARK, STEM = 18, 26
FEATURE_WORDS = {
    "outfall": "the outfall",
    "tributary": "water joins",
    "withdrawal": "water is taken out",
    "weir": "a weir",
}


@dataclass(frozen=True)
class Line:
    """A line through points, by its kind ("plan" or "today")."""

    kind: str
    points: str


@dataclass(frozen=True)
class Dot:
    """A reading: its state chooses the symbol, marked draws it larger with a ring."""

    x: float
    y: float
    state: str
    marked: bool
    code: str


@dataclass(frozen=True)
class Critical:
    """A lowest point and the bar of its interval along the river, by its kind ("plan" or "today")."""

    kind: str
    x: float
    y: float
    left: float
    right: float


@dataclass(frozen=True)
class Candidate:
    """A place for the next station: a numbered mark, on a stem down from the line that today's sag has there."""

    x: float
    line_y: float
    y: float
    number: int


@dataclass(frozen=True)
class Feature:
    """Something on the river, on the line at the bottom of the plot; a leader runs down to its label, if it has one."""

    x: float
    kind: str
    leader_y: float


@dataclass(frozen=True)
class SagChart:
    """A sag plot with every coordinate ready, its sentence, and the rows of the table beside it."""

    height: float
    strip_y: float
    hours_y: float
    distance_title: str
    oxygen_ticks: tuple[Tick, ...]
    distance_ticks: tuple[Label, ...]
    hour_ticks: tuple[Label, ...]
    bands: tuple[Line, ...]
    lines: tuple[Line, ...]
    criticals: tuple[Critical, ...]
    criterion_y: float | None
    dots: tuple[Dot, ...]
    candidates: tuple[Candidate, ...]
    features: tuple[Feature, ...]
    labels: tuple[Label, ...]
    legend: tuple[tuple[str, str], ...]
    sentence: str
    description: str
    table: Callable
    width: int = WIDTH
    left: int = LEFT
    right: int = RIGHT
    top: int = TOP
    bottom: int = BOTTOM

    @property
    def has_today(self):
        """Return whether today's sag is drawn."""
        return len(self.lines) > 1

    @property
    def rows(self):
        """Return the Rows of the table, worked out when they are asked for: not every page prints them."""
        return self.table()


def sag_chart(show, prediction, readings=(), marked=None, criterion=None, features=True, today=None, candidates=()):
    """Return the SagChart of a Prediction.

    readings have distance_km, do_mg_l, state ("used" or "set aside") and label, their station's code, and an id or not;
    marked is the id of the one to make stand out, criterion the oxygen to keep above [mg/L], features whether to draw
    what joins the river, what is taken out, and its weirs; today the sag estimated from readings, a sag.estimate.Today,
    drawn beside the plan's; candidates have distance_km, in the order they are offered.
    """
    readings = [one for one in readings if one.do_mg_l is not None]
    along = _distance_scale(prediction, readings)
    oxygen = _oxygen_scale(prediction, readings, criterion, today)
    marks, names, strip_height = _features(prediction, along) if features else ((), (), 0)
    distance_y = BOTTOM + strip_height + (6 if strip_height else 0)
    hours_y = distance_y + 42
    dots = tuple(_dot(one, along, oxygen, marked) for one in readings)
    bands, lines, criticals = _sags(prediction, today, along, oxygen)
    next_marks = _candidates(candidates, today, prediction, along, oxygen)
    criterion_y = None if criterion is None else oxygen.at(criterion)
    labels = _labels(show, criterion, criterion_y, lines, dots, criticals, next_marks)
    return SagChart(
        height=hours_y + 36,
        strip_y=distance_y,
        hours_y=hours_y,
        distance_title=_distance_title(show),
        oxygen_ticks=tuple(Tick(oxygen.at(value), plain(value, 1)) for value in _oxygen_values(oxygen)),
        distance_ticks=_distance_ticks(show, along, distance_y + 16),
        hour_ticks=_hour_ticks(prediction, along, hours_y + 16),
        bands=tuple(Line(kind, points_text(points)) for kind, points in bands),
        lines=tuple(Line(kind, points_text(points)) for kind, points in lines),
        criticals=criticals,
        criterion_y=criterion_y,
        dots=dots,
        candidates=next_marks,
        features=marks,
        labels=(*labels, *names),
        legend=_legend(criterion, dots, marks, today, next_marks),
        sentence=sentence_of(show, prediction, readings, today),
        description=description(show, prediction, readings, criterion, today),
        table=lambda: rows_of(show, prediction, readings, marked, _kilometres(show, along), today, candidates),
    )  # fmt: skip


def _sags(prediction, today, along, oxygen):
    """Return bands and lines as (kind, points), and the Criticals: the plan's, and today's over it."""
    sags = [("plan", prediction.grid_km, (prediction.low_mg_l, prediction.do_mg_l, prediction.high_mg_l))]
    point, interval = prediction.critical, prediction.critical_interval
    places = [("plan", point.distance_km, point.do_mg_l, interval.low_km, interval.high_km)]
    if today is not None:
        estimate = today.estimate
        sags.append(("today", estimate.grid_km, today.bands))
        place = estimate.critical_km
        places.append(("today", place.median, estimate.critical_do_mg_l.median, place.low, place.high))
    bands, lines = [], []
    for kind, grid_km, values in sags:
        low, middle, high = (corners(grid_km, one, along, oxygen) for one in values)
        bands.append((kind, [*high, *reversed(low)]))
        lines.append((kind, middle))
    criticals = tuple(
        Critical(kind, along.at(km), oxygen.at(do), along.at(low), along.at(high)) for kind, km, do, low, high in places
    )
    return bands, lines, criticals


def _candidates(offers, today, prediction, along, oxygen):
    """Return the Candidates of the places offered, below today's line, else the plan's; none covers another."""
    found = []
    for number, offer in enumerate(offers, start=1):
        here = (today and today.at(offer.distance_km)) or prediction.at(offer.distance_km)
        if here is None:
            continue
        x, line_y = along.at(offer.distance_km), oxygen.at(here.do_mg_l)
        found.append(Candidate(x, line_y, _clear_of(found, x, line_y), number))
    return tuple(found)


def _clear_of(found, x, line_y):
    """Return where a candidate's mark stands at x: below its line, deeper where others stand, else above the line."""
    steps = [STEM + level * (MARK + 4) for level in range(6)]
    ways = [round(line_y + step, 1) for step in (*steps, *(-step for step in steps))]
    inside = [y for y in ways if y - MARK / 2 >= TOP and y + MARK / 2 <= BOTTOM]
    clear = (y for y in inside if all(max(abs(one.x - x), abs(one.y - y)) >= MARK + 3 for one in found))
    return next(clear, ways[0])


def _labels(show, criterion, criterion_y, lines, dots, criticals, candidates):
    """Return the Labels of the criterion and of the stations, clear of everything drawn."""
    taken = [box for _, points in lines for box in _boxes(points)]
    taken += [_around(mark) for mark in (*dots, *criticals, *candidates)]
    taken += [_interval_box(one) for one in criticals]
    labels = _criterion_label(show, criterion, criterion_y, taken)
    return labels + _codes(dots, [*taken, *(label.box for label in labels)])


def _distance_title(show):
    """Return what the distance axis counts; a river mile needs no unit beside its name."""
    counts_up = show.distance_rule != "downstream"
    return show.place_label() if counts_up else f"{show.place_label()}, {show.unit_label('place')}"


def _distance_scale(prediction, readings):
    places = [prediction.river.from_km, prediction.river.to_km, *(one.distance_km for one in readings)]
    return Scale(min(places), max(places), LEFT, RIGHT)


def _oxygen_scale(prediction, readings, criterion, today):
    highest = max([float(prediction.high_mg_l.max()), criterion or 0, *(one.do_mg_l for one in readings)])
    if today is not None:
        highest = max(highest, float(today.bands[2].max()))
    step = round_step(max(highest, 4), 6)
    return Scale(0, step * -(-highest * 1.02 // step), BOTTOM, TOP)


def _oxygen_values(oxygen):
    return multiples(0, oxygen.to_value, max(round_step(oxygen.to_value, 6), 1))


def _dot(reading, along, oxygen, marked):
    is_marked = marked is not None and getattr(reading, "id", None) == marked
    return Dot(along.at(reading.distance_km), oxygen.at(reading.do_mg_l), reading.state, is_marked, reading.label)


def _kilometres(show, along):
    """Return where the distance axis has its numbers. [km]"""
    ends = sorted((show.shown("place", along.from_value), show.shown("place", along.to_value)))
    step = round_step(ends[1] - ends[0], 7)
    return [(show.to_si("place", value), plain(value, step)) for value in multiples(*ends, step)]


def _distance_ticks(show, along, y):
    return tuple(without_collisions([Label(along.at(km), y, "middle", text) for km, text in _kilometres(show, along)]))


def _hour_ticks(prediction, along, y):
    """Return the round hours of travel, where along the river they are; slow reaches stretch them."""
    last = float(prediction.travel_time_h[-1])
    step = hour_step(last, 6)
    hours = multiples(0, last, step)
    places = np.interp(hours, prediction.travel_time_h, prediction.grid_km).tolist()
    labels = [
        Label(along.at(km), y, "middle", plain(value, min(step, 1) if step < 1 else 1))
        for value, km in zip(hours, places, strict=True)
    ]
    return tuple(without_collisions(labels))


def _features(prediction, along):
    """Return the Features, the Labels of those that have room, and how high the strip of labels is."""
    found = [(one.distance_km, one.kind, one.name) for one in prediction.river.inflows]
    found += [(one.distance_km, "weir", one.name or "weir") for one in prediction.river.weirs]
    found.sort()
    marks = [
        (along.at(km), shortened("outfall" if kind == "outfall" else name, LONGEST_NAME)) for km, kind, name in found
    ]
    placed = in_rows(tuple(marks), LEFT, WIDTH - 1, BOTTOM + 8, ROW_HEIGHT, MOST_ROWS)
    rows = 1 + max((row for _, row in placed.values()), default=-1)
    features = tuple(
        Feature(x, kind, placed[index][0].y if index in placed else BOTTOM)
        for index, ((x, _), (_, kind, _)) in enumerate(zip(marks, found, strict=True))
    )
    return features, tuple(label for label, _ in placed.values()), 8 + rows * ROW_HEIGHT


def _boxes(curve):
    """Return Boxes that the predicted line takes."""
    return [
        Box(min(x1, x2) - 1, min(y1, y2) - 2, max(x1, x2) + 1, max(y1, y2) + 2)
        for (x1, y1), (x2, y2) in zip(curve, curve[1:], strict=False)
    ]


def _around(mark):
    half = 11 if getattr(mark, "marked", False) else 6
    return Box(mark.x - half, mark.y - half, mark.x + half, mark.y + half)


def _interval_box(critical):
    return Box(critical.left, critical.y - 5, critical.right, critical.y + 5)


def _criterion_label(show, criterion, y, taken):
    """Return the criterion's label at the end of its line where it hides least."""
    if criterion is None:
        return []
    text = f"criterion {show.number('oxygen', criterion, 1)}"
    width = text_width(text)
    places = [
        Label(x, round(baseline, 1), anchor, text, "criterion")
        for x, anchor in ((RIGHT - 2, "end"), (LEFT + 4, "start"), (round((LEFT + RIGHT - width) / 2, 1), "start"))
        for baseline in (y - 5, y + 14)
        if TOP + 6 <= baseline <= BOTTOM
    ]
    return [min(places, key=lambda label: sum(label.box.hits(box) for box in taken))]


def _codes(dots, taken):
    """Return the codes beside the readings that have room for one: the marked one's first, each station's once."""
    frame = Box(LEFT + 1, TOP - 12, RIGHT + 8, BOTTOM - 1)
    labels, named = [], set()
    for dot in sorted(dots, key=lambda one: (not one.marked, -one.y)):
        if dot.code in named:
            continue
        others = [*taken, *(label.box for label in labels)]
        own = _around(dot)
        label = beside(
            dot.x, dot.y, 11 if dot.marked else 5, dot.code, frame, [box for box in others if box != own], "code"
        )
        if label is None and dot.marked:
            label = Label(
                min(max(dot.x, LEFT + 20), RIGHT - 20), round(max(dot.y - 15, TOP + 8), 1), "middle", dot.code, "code"
            )
        if label:
            labels.append(label)
            named.add(dot.code)
    return labels


def _legend(criterion, dots, features, today, candidates):
    """Return (symbol, words) for what the chart shows and no more."""
    plan = "planned" if today is not None else "predicted"
    lines = []
    if today is not None:
        lines += [("today", "today's sag"), ("today band", "today's 90 % band"), ("today critical", "its lowest, 90 %")]
    lines += [("plan", plan), ("band", f"{plan}, 90 % band"), ("critical", f"{plan} lowest, with its 90 % interval")]
    states = {dot.state for dot in dots}
    lines += [("used", "reading")] * ("used" in states) + [("aside", "reading set aside")] * ("set aside" in states)
    lines += [("marked", "this reading")] * any(dot.marked for dot in dots)
    lines += [("candidate", "where next, by rank")] * bool(candidates)
    lines += [("criterion", "criterion")] * (criterion is not None)
    kinds = {feature.kind for feature in features}
    return tuple(lines + [(kind, words) for kind, words in FEATURE_WORDS.items() if kind in kinds])
