"""Places for text on a chart, so that no two overlap. Sizes are those of the viewBox."""

from dataclasses import dataclass
from functools import cached_property, lru_cache

TEXT_SIZE = 13
# Letters of ordinary sans-serif faces are narrower than this share of the text's size, on average.
_LETTER, _BOLD_LETTER = 0.55, 0.78
# What the search for places may cost before it makes do with fewer.
_MOST_TRIES = 1500
_ASCENT, _DESCENT = 0.8, 0.25


@dataclass(frozen=True)
class Box:
    """A rectangle that is taken."""

    left: float
    top: float
    right: float
    bottom: float

    def hits(self, other):
        """Return whether two rectangles share an area."""
        return (
            self.left < other.right and other.left < self.right and self.top < other.bottom and other.top < self.bottom
        )

    def within(self, other):
        """Return whether this lies in another."""
        return (
            other.left <= self.left
            and self.right <= other.right
            and other.top <= self.top
            and self.bottom <= other.bottom
        )


@dataclass(frozen=True)
class Label:
    """A text: x and y of its baseline as SVG wants them, and the box it takes."""

    x: float
    y: float
    anchor: str
    text: str
    kind: str = ""

    @cached_property
    def box(self):
        """Return the rectangle the text takes."""
        width = text_width(self.text, bold=self.kind == "code")
        left = self.x - {"start": 0, "middle": width / 2, "end": width}[self.anchor]
        return Box(left, self.y - _ASCENT * TEXT_SIZE, left + width, self.y + _DESCENT * TEXT_SIZE)


def text_width(text, bold=False):
    """Return how wide a text is at most, roughly."""
    return (_BOLD_LETTER if bold else _LETTER) * TEXT_SIZE * len(text)


def shortened(text, longest):
    """Return the text, cut with an ellipsis where it is longer than so many letters."""
    return text if len(text) <= longest else text[: longest - 1].rstrip() + "\u2026"


def without_collisions(labels, gap=5):
    """Return the labels of one row that fit beside each other, from the left, none dropped that fits."""
    kept = []
    for label in sorted(labels, key=lambda one: one.box.left):
        if not kept or label.box.left >= kept[-1].box.right + gap:
            kept.append(label)
    return kept


def beside(x, y, radius, text, frame, taken, kind=""):
    """Return a Label next to a mark, where nothing is taken and the frame holds it; None where there is no such place.

    taken are Boxes. Above is tried first, then below, the sides, and aslant.
    """
    clear = radius + 3
    above, below, aslant = round(y - clear - 1, 1), round(y + clear + _ASCENT * TEXT_SIZE, 1), round(0.6 * clear, 1)
    for label in (
        Label(x, above, "middle", text, kind),
        Label(x, below, "middle", text, kind),
        Label(round(x + clear, 1), round(y + 4.5, 1), "start", text, kind),
        Label(round(x - clear, 1), round(y + 4.5, 1), "end", text, kind),
        Label(round(x - aslant, 1), round(below - 2, 1), "end", text, kind),
        Label(round(x + aslant, 1), round(above + 2, 1), "start", text, kind),
        Label(round(x + aslant, 1), round(below - 2, 1), "start", text, kind),
        Label(round(x - aslant, 1), round(above + 2, 1), "end", text, kind),
    ):
        if label.box.within(frame) and not any(label.box.hits(box) for box in taken):
            return label
    return None


@dataclass(frozen=True)
class _Place:
    """One way to put the label of a mark under an axis: its row, and where its leader comes down."""

    label: Label
    box: Box
    row: int
    leader_x: float

    def conflicts(self, other):
        """Return whether two labels overlap, or one is crossed by the leader of the other."""
        if self.row == other.row and self.box.left < other.box.right + 3 and other.box.left < self.box.right + 3:
            return True
        return self._crosses(other) or other._crosses(self)

    def _crosses(self, other):
        return self.row >= other.row and other.box.left - 2 < self.leader_x < other.box.right + 2


@lru_cache(maxsize=128)
def in_rows(marks, left, right, top, row_height, most_rows):
    """Return {index: (Label, row)} for a tuple of marks (x, text) under an axis, in rows, each with a leader to it.

    No label overlaps another or is crossed by a leader, and there are as few rows as that takes. Where most_rows do not
    suffice, or the marks are too many to try every way, some are left out.
    """
    ways = [_ways(x, text, left, right, top, row_height, most_rows) for x, text in marks]
    for rows in range(1, most_rows + 1):
        few = [[way for way in each if way.row < rows] for each in ways]
        if (found := _all_placed(few, [], [_MOST_TRIES])) is not None:
            return {index: (way.label, way.row) for index, way in enumerate(found)}
    placed = {}
    for index in sorted(range(len(marks)), key=lambda one: -marks[one][0]):
        free = (way for way in ways[index] if not any(way.conflicts(other) for other in placed.values()))
        if (way := next(free, None)) is not None:
            placed[index] = way
    return {index: (way.label, way.row) for index, way in placed.items()}


def _all_placed(ways, placed, tries):
    """Return a way for each mark after those placed, none in conflict, or None; tries holds how many are left."""
    if len(placed) == len(ways):
        return placed
    for way in ways[len(placed)]:
        tries[0] -= 1
        if tries[0] < 0:
            return None
        if any(way.conflicts(other) for other in placed):
            continue
        if (found := _all_placed(ways, [*placed, way], tries)) is not None:
            return found
    return None


def _ways(x, text, left, right, top, row_height, most_rows):
    """Return the _Places beside a leader that the width holds, the upper rows first."""
    ways = []
    for row in range(most_rows):
        y = top + (row + 1) * row_height - 4
        for label in (Label(round(x + 4, 1), y, "start", text), Label(round(x - 4, 1), y, "end", text)):
            if left <= label.box.left and label.box.right <= right:
                ways.append(_Place(label, label.box, row, x))
    return ways
