"""Hold arguments to their ranges, each with one line that shows the first value outside and what is allowed."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import Bare, InputError, MissingGroundError
from profiler.units import Float

__all__ = ["check_profile", "finite", "not_negative", "positive", "within"]

_GREATEST = np.finfo(np.float64).max


def within(name: str, values: ArrayLike, low: float, high: float, allowed: str, *, above: bool = False) -> Float:
    """Return the values as float64 if all are from ``low`` (or above it) to ``high``; NaN never is.

    Parameters
    ----------
    name
        Name of the argument, with its unit.
    values
        Any shape.
    low, high
        The range, both ends included unless ``above``.
    allowed
        The range in words, with its unit.
    above
        Whether ``low`` itself is outside.

    Returns
    -------
    ndarray
        The shape of the values.

    Raises
    ------
    InputError
        With the first value outside.

    Examples
    --------
    >>> within("latitude", [10, -95], -90, 90, "-90 to 90 degrees")
    Traceback (most recent call last):
    ...
    profiler.errors.InputError: latitude = -95: must be -90 to 90 degrees
    """
    array = np.asarray(values, dtype=float)
    inside = ((array > low) if above else (array >= low)) & (array <= high)
    if not inside.all():
        raise InputError(field=name, value=Bare(f"{array[~inside].flat[0]:g}"), allowed=allowed)
    return array


def positive(name: str, values: ArrayLike, unit: str = "", *, infinite: bool = False) -> Float:
    """Return the values as float64 if all are above 0, and finite unless infinity is allowed.

    Examples
    --------
    >>> positive("frequency_hz", 0.0, "Hz")
    Traceback (most recent call last):
    ...
    profiler.errors.InputError: frequency_hz = 0: must be finite and more than 0 Hz
    """
    allowed = f"{'' if infinite else 'finite and '}more than 0 {unit}".rstrip()
    return within(name, values, 0.0, np.inf if infinite else _GREATEST, allowed, above=True)


def not_negative(name: str, values: ArrayLike, unit: str = "", *, infinite: bool = False) -> Float:
    """Return the values as float64 if all are 0 or more, and finite unless infinity is allowed.

    Examples
    --------
    >>> not_negative("rain_mm_h", [0.0, 42.0], "mm/h").tolist()
    [0.0, 42.0]
    """
    allowed = f"{'' if infinite else 'finite and '}0 {unit}".rstrip() + " or more"
    return within(name, values, 0.0, np.inf if infinite else _GREATEST, allowed)


def finite(name: str, values: ArrayLike, unit: str) -> Float:
    """Return the values as float64 if all are finite.

    Examples
    --------
    >>> finite("gain_dbi", float("nan"), "dBi")
    Traceback (most recent call last):
    ...
    profiler.errors.InputError: gain_dbi = nan: must be a finite number of dBi
    """
    return within(name, values, -_GREATEST, _GREATEST, f"a finite number of {unit}")


def check_profile(distance_m: ArrayLike, height_m: ArrayLike) -> tuple[Float, Float]:
    """Return the two rows of a profile as float64 if they are equal in length, ascend from 0 and have no gap.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), n at least 2; the last is B.
    height_m
        Heights above the datum, (n,).

    Raises
    ------
    InputError
        If the rows do not fit each other, or the distances do not ascend from 0.
    MissingGroundError
        If a height is not a finite number; the message says where.

    Examples
    --------
    >>> check_profile([0, 5e3, 10e3], [10, float("nan"), 10])
    Traceback (most recent call last):
    ...
    profiler.errors.MissingGroundError: no height at 5000 m from A: must be known; fill it or give more terrain
    """
    distance, height = np.asarray(distance_m, dtype=float), np.asarray(height_m, dtype=float)
    if distance.ndim != 1 or distance.shape != height.shape or distance.size < 2:
        raise InputError(f"profile of shapes {distance.shape} and {height.shape}: must be two equal rows of 2 or more")
    if distance[0] != 0 or not np.all(np.diff(distance) > 0):
        raise InputError("distance_m: must ascend from 0 at site A, each point further than the one before")
    gaps = ~np.isfinite(height)
    if gaps.any():
        where = float(distance[gaps][0])
        raise MissingGroundError(f"no height at {where:.0f} m from A: must be known; fill it or give more terrain")
    return distance, height
