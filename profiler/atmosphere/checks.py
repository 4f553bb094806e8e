"""Range checks of the package's arguments."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.units import Float

__all__ = ["not_negative", "positive", "within"]


def within(name: str, values: ArrayLike, low: float, high: float, allowed: str, *, open_low: bool = False) -> Float:
    """Return the values as an array, or stop with one line that shows the first value outside."""
    array = np.asarray(values, dtype=float)
    inside = ((array > low) if open_low else (array >= low)) & (array <= high)
    if not inside.all():
        raise InputError(f"{name} = {array[~inside].flat[0]:g}: must be {allowed}")
    return array


def positive(name: str, values: ArrayLike, unit: str) -> Float:
    """Return the values as an array if all are finite and above 0; NaN is refused as well."""
    return within(name, values, 0.0, np.finfo(float).max, f"finite and more than 0 {unit}".rstrip(), open_low=True)


def not_negative(name: str, values: ArrayLike, unit: str) -> Float:
    """Return the values as an array if all are finite and 0 or above; NaN is refused as well."""
    return within(name, values, 0.0, np.finfo(float).max, f"finite and 0 {unit} or more")
