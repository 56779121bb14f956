"""Argument checks shared by the calc modules."""

import numpy as np

from calc.errors import OutOfRangeError

_LARGEST = np.finfo(float).max


def require_range(name, value, low, high, unit):
    """Return the value as a float array, or raise when any of it lies outside low to high.

    Parameters
    ----------
    name : str
        The argument's name, for the message.
    value : float or array_like, shape (...)
        NaN passes: it is a missing value.
    low, high : float
        Both included. Infinite bounds leave that side open; an infinite value is refused all the same.
    unit : str
        Unit for the message, may be empty.

    Raises
    ------
    OutOfRangeError
        Naming the argument, the range and the first offending value.
    """
    values = np.asarray(value, dtype=float)
    # Two passes settle the ordinary case; NaN and infinity fail a comparison and go the long way.
    if values.size and max(low, -_LARGEST) <= values.min() and values.max() <= min(high, _LARGEST):
        return values
    bad = ~(np.isnan(values) | ((values >= low) & (values <= high) & np.isfinite(values)))
    if bad.any():
        worst = values[bad].flat[0]
        unit_text = f" {unit}" if unit else ""
        raise OutOfRangeError(f"{name} must be between {low:g} and {high:g}{unit_text}, got {worst:g}{unit_text}")
    return values


def require_same_shape(**arrays):
    """Return the arrays as float arrays of one shape, or raise naming the two that differ."""
    named = {name: np.asarray(value, dtype=float) for name, value in arrays.items()}
    (first_name, first), *others = named.items()
    for name, value in others:
        if value.shape != first.shape:
            raise OutOfRangeError(f"{name} must have the shape of {first_name} {first.shape}, got {value.shape}")
    return tuple(named.values())


def require_positive(name, value, unit):
    """Return the value as a float array, or raise when any of it is zero, negative or infinite. NaN passes."""
    values = require_range(name, value, 0, np.inf, unit)
    if (values == 0).any():
        unit_text = f" {unit}" if unit else ""
        raise OutOfRangeError(f"{name} must be above 0{unit_text}, got 0{unit_text}")
    return values
