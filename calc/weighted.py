"""Quantiles of weighted draws."""

import numpy as np


def quantiles(values, weight, levels):
    """Return quantiles of weighted draws, interpolated between them.

    values: shape (n,) or (g, n), the draws last; weight: shape (n,); levels: each between 0 and 1. The result has shape
    (levels,) or (levels, g).
    """
    values = np.atleast_2d(values)
    order = values.argsort(axis=1)
    ordered = np.take_along_axis(values, order, axis=1)
    share = weight[order]
    below = np.cumsum(share, axis=1) - share / 2
    found = np.array([[np.interp(level, at, row) for at, row in zip(below, ordered, strict=True)] for level in levels])
    return found[:, 0] if len(values) == 1 else found
