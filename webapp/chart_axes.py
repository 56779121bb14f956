"""Scales and round tick numbers for the charts."""

import math
from dataclasses import dataclass

import numpy as np

HOUR_STEPS = (0.25, 0.5, 1, 2, 3, 6, 12, 24, 48, 96, 240, 480)


@dataclass(frozen=True)
class Scale:
    """A straight scale from values to coordinates."""

    from_value: float
    to_value: float
    from_place: float
    to_place: float

    def at(self, value):
        """Return the coordinate of a value, to a tenth; values beyond the ends are drawn at the end."""
        share = (value - self.from_value) / (self.to_value - self.from_value)
        return round(self.from_place + min(max(share, 0.0), 1.0) * (self.to_place - self.from_place), 1)

    def each(self, values):
        """Return the coordinates of an array of values, as a list."""
        share = np.clip((values - self.from_value) / (self.to_value - self.from_value), 0.0, 1.0)
        return np.round(self.from_place + share * (self.to_place - self.from_place), 1).tolist()


@dataclass(frozen=True)
class Tick:
    """A mark on an axis: its coordinate and its number as text."""

    place: float
    text: str


def round_step(span, at_most):
    """Return the smallest step of 1, 2 or 5 times a power of ten that divides a span into at most so many steps."""
    rough = span / at_most
    power = 10 ** math.floor(math.log10(rough))
    return next(step * power for step in (1, 2, 5, 10) if step * power >= rough * (1 - 1e-9))


def hour_step(span_h, at_most):
    """Return the smallest step that people count hours in, dividing a span into at most so many steps."""
    return next((step for step in HOUR_STEPS if step * at_most >= span_h), 10 ** math.ceil(math.log10(span_h)))


def multiples(low, high, step):
    """Return the multiples of a step between two values, both included."""
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return [count * step for count in range(first, last + 1)]


def plain(value, step):
    """Return a tick's number with no more decimals than its step needs."""
    text = f"{value:.{max(0, -math.floor(math.log10(step) + 1e-9))}f}"
    return text[1:] if float(text) == 0 and text.startswith("-") else text.replace("-", "\u2212")
