"""Lines of a chart with as few corners as it takes: which points those are is found once for each line and kept."""

from functools import lru_cache

import numpy as np

# How far a drawn line may lie from its points, in units of the viewBox.
_NEAR = 0.25


class _Same:
    """An array as a key: the same array, whatever it holds. The arrays of a sag are never changed."""

    def __init__(self, values):
        self.values = values

    def __hash__(self):
        return id(self.values)

    def __eq__(self, other):
        return self.values is other.values


def corners(grid_km, values, along, across):
    """Return the corners (x, y) of the line through values over grid_km, within a quarter of a unit of all of it.

    along and across are the Scales of distance and of values.
    """
    unit = abs(across.to_place - across.from_place) / (across.to_value - across.from_value)
    kept = _corners(_Same(grid_km), _Same(values), unit)
    return list(zip(along.each(grid_km[kept]), across.each(values[kept]), strict=True))


@lru_cache(maxsize=256)
def _corners(grid, values, unit):
    """Return which points stay: from each the longest step whose line passes all points between."""
    x, y = grid.values, np.nan_to_num(values.values) * unit
    kept, last = [0], len(x) - 1
    for end in range(2, len(x)):
        begin = kept[-1]
        if end - begin < 2:
            continue
        between = slice(begin + 1, end)
        line = y[begin] + (y[end] - y[begin]) * (x[between] - x[begin]) / max(x[end] - x[begin], 1e-12)
        if np.abs(y[between] - line).max() > _NEAR:
            kept.append(end - 1)
    return np.array([*kept, last] if last else kept)


def points_text(points):
    """Return points as SVG wants them, always with a decimal dot."""
    return " ".join(f"{x:.1f},{y:.1f}" for x, y in points)
