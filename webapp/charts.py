"""Data to coordinates for the SVG templates. The viewBox is as wide as a phone, so text keeps its size there.

A chart holds tuples of Bands and Lines: a further line, as of a fitted sag, is one more of each.
"""

from dataclasses import dataclass

from webapp.chart_axes import Scale, Tick, hour_step, multiples, plain, round_step
from webapp.chart_labels import Box, Label, beside, in_rows, shortened, text_width, without_collisions
from webapp.chart_words import Row, description, rows_of, sentence_of

WIDTH = 360
LEFT, RIGHT, TOP, BOTTOM = 30, 350, 24, 214
ROW_HEIGHT, MOST_ROWS = 17, 6
LONGEST_NAME = 18
# How far a drawn line may lie from its points.
_NEAR = 0.25
FEATURE_WORDS = {
    "outfall": "the outfall",
    "tributary": "water joins",
    "withdrawal": "water is taken out",
    "weir": "a weir",
}


@dataclass(frozen=True)
class Line:
    """A line through points, by its kind ("plan")."""

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
    """The predicted lowest point and the bar of its interval along the river."""

    x: float
    y: float
    left: float
    right: float


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
    critical: Critical | None
    criterion_y: float | None
    dots: tuple[Dot, ...]
    features: tuple[Feature, ...]
    labels: tuple[Label, ...]
    legend: tuple[tuple[str, str], ...]
    sentence: str
    description: str
    rows: tuple[Row, ...]
    width: int = WIDTH
    left: int = LEFT
    right: int = RIGHT
    top: int = TOP
    bottom: int = BOTTOM


def sag_chart(show, prediction, readings=(), marked=None, criterion=None, features=True):
    """Return the SagChart of a Prediction.

    readings have distance_km, do_mg_l, state ("used" or "set aside") and label, their station's code, and an id or not;
    marked is the id of the one to make stand out, criterion the oxygen to keep above [mg/L], features whether to draw
    what joins the river, what is taken out, and its weirs.
    """
    readings = [one for one in readings if one.do_mg_l is not None]
    along = _distance_scale(prediction, readings)
    oxygen = _oxygen_scale(prediction, readings, criterion)
    curve = _points(along, oxygen, prediction.grid_km, prediction.do_mg_l)
    marks, names, strip_height = _features(prediction, along) if features else ((), (), 0)
    distance_y = BOTTOM + strip_height + (6 if strip_height else 0)
    hours_y = distance_y + 42
    dots = tuple(_dot(one, along, oxygen, marked) for one in readings)
    critical = _critical(prediction, along, oxygen)
    criterion_y = None if criterion is None else oxygen.at(criterion)
    taken = [*_boxes(curve), *(_around(dot) for dot in dots), _around(critical), _interval_box(critical)]
    labels = _criterion_label(show, criterion, criterion_y, taken)
    labels += _codes(dots, [*taken, *(label.box for label in labels)])
    edge = [
        *_points(along, oxygen, prediction.grid_km, prediction.high_mg_l),
        *reversed(_points(along, oxygen, prediction.grid_km, prediction.low_mg_l)),
    ]
    return SagChart(
        height=hours_y + 36,
        strip_y=distance_y,
        hours_y=hours_y,
        distance_title=_distance_title(show),
        oxygen_ticks=tuple(Tick(oxygen.at(value), plain(value, 1)) for value in _oxygen_values(oxygen)),
        distance_ticks=_distance_ticks(show, along, distance_y + 16),
        hour_ticks=_hour_ticks(prediction, along, hours_y + 16),
        bands=(Line("plan", _text(edge)),),
        lines=(Line("plan", _text(curve)),),
        critical=critical,
        criterion_y=criterion_y,
        dots=dots,
        features=marks,
        labels=(*labels, *names),
        legend=_legend(criterion, dots, marks),
        sentence=sentence_of(show, prediction, readings),
        description=description(show, prediction, readings, criterion),
        rows=rows_of(show, prediction, readings, marked, _kilometres(show, along)),
    )  # fmt: skip


def _distance_title(show):
    """Return what the distance axis counts; a river mile needs no unit beside its name."""
    counts_up = show.distance_rule != "downstream"
    return show.place_label() if counts_up else f"{show.place_label()}, {show.unit_label('place')}"


def _distance_scale(prediction, readings):
    places = [prediction.river.from_km, prediction.river.to_km, *(one.distance_km for one in readings)]
    return Scale(min(places), max(places), LEFT, RIGHT)


def _oxygen_scale(prediction, readings, criterion):
    highest = max([float(prediction.high_mg_l.max()), criterion or 0, *(one.do_mg_l for one in readings)])
    step = round_step(max(highest, 4), 6)
    return Scale(0, step * -(-highest * 1.02 // step), BOTTOM, TOP)


def _oxygen_values(oxygen):
    return multiples(0, oxygen.to_value, max(round_step(oxygen.to_value, 6), 1))


def _points(along, oxygen, distances_km, values_mg_l):
    """Return the corners of a line: no more than it takes to stay within a quarter of a unit of all its points."""
    pairs = zip(distances_km.tolist(), values_mg_l.tolist(), strict=True)
    points = [(along.at(km), oxygen.at(value)) for km, value in pairs]
    kept, waiting = points[:1], []
    for point in points[1:]:
        if any(_off_line(kept[-1], point, passed) > _NEAR for passed in waiting):
            kept.append(waiting[-1])
            waiting = []
        waiting.append(point)
    return [*kept, points[-1]]


def _off_line(start, end, point):
    """Return how far above or below the line between two points a third one lies."""
    if end[0] == start[0]:
        return abs(point[0] - start[0]) + (0 if min(start[1], end[1]) <= point[1] <= max(start[1], end[1]) else 1)
    return abs(start[1] + (end[1] - start[1]) * (point[0] - start[0]) / (end[0] - start[0]) - point[1])


def _text(points):
    """Return points as SVG wants them, always with a decimal dot."""
    return " ".join(f"{x:.1f},{y:.1f}" for x, y in points)


def _dot(reading, along, oxygen, marked):
    is_marked = marked is not None and getattr(reading, "id", None) == marked
    return Dot(along.at(reading.distance_km), oxygen.at(reading.do_mg_l), reading.state, is_marked, reading.label)


def _critical(prediction, along, oxygen):
    point, interval = prediction.critical, prediction.critical_interval
    return Critical(
        along.at(point.distance_km), oxygen.at(point.do_mg_l), along.at(interval.low_km), along.at(interval.high_km)
    )


def _kilometres(show, along):
    """Return where the distance axis has its numbers. [km]"""
    ends = sorted((show.shown("place", along.from_value), show.shown("place", along.to_value)))
    step = round_step(ends[1] - ends[0], 7)
    return [(show.to_si("place", value), plain(value, step)) for value in multiples(*ends, step)]


def _distance_ticks(show, along, y):
    return tuple(without_collisions([Label(along.at(km), y, "middle", text) for km, text in _kilometres(show, along)]))


def _hour_ticks(prediction, along, y):
    """Return the round hours of travel, where along the river they are; slow reaches stretch them."""
    hours, places = prediction.travel_time_h.tolist(), prediction.grid_km.tolist()
    step = hour_step(hours[-1], 6)
    labels = [
        Label(along.at(_place_of(value, hours, places)), y, "middle", plain(value, min(step, 1) if step < 1 else 1))
        for value in multiples(0, hours[-1], step)
    ]
    return tuple(without_collisions(labels))


def _place_of(hour, hours, places):
    """Return where the water is after so many hours, between points of the grid. [km]"""
    for (h1, p1), (h2, p2) in zip(
        zip(hours, places, strict=True), zip(hours[1:], places[1:], strict=True), strict=False
    ):
        if h1 <= hour <= h2:
            return p1 if h2 == h1 else p1 + (p2 - p1) * (hour - h1) / (h2 - h1)
    return places[-1]


def _features(prediction, along):
    """Return the Features, the Labels of those that have room, and how high the strip of labels is."""
    found = [(one.distance_km, one.kind, one.name) for one in prediction.river.inflows]
    found += [(one.distance_km, "weir", one.name or "weir") for one in prediction.river.weirs]
    found.sort()
    marks = [
        (along.at(km), shortened("outfall" if kind == "outfall" else name, LONGEST_NAME)) for km, kind, name in found
    ]
    placed = in_rows(marks, LEFT, WIDTH - 1, BOTTOM + 8, ROW_HEIGHT, MOST_ROWS)
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


def _legend(criterion, dots, features):
    """Return (symbol, words) for what the chart shows and no more."""
    lines = [("plan", "predicted"), ("band", "its 90 % band"), ("critical", "predicted lowest, with its 90 % interval")]
    states = {dot.state for dot in dots}
    lines += [("used", "reading")] * ("used" in states) + [("aside", "reading set aside")] * ("set aside" in states)
    lines += [("marked", "this reading")] * any(dot.marked for dot in dots)
    lines += [("criterion", "criterion")] * (criterion is not None)
    kinds = {feature.kind for feature in features}
    return tuple(lines + [(kind, words) for kind, words in FEATURE_WORDS.items() if kind in kinds])
