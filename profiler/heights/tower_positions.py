"""The heights at which a tower can take an antenna, and what they cost."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.geometry import ROUNDING_M
from profiler.models import TowerChoice
from profiler.units import Float

__all__ = ["MOST_POSITIONS", "all_positions", "both_free", "free_positions", "height_cost", "round_up"]

MOST_POSITIONS = 5000
"""No tower is bored more finely; far more would take memory and time for nothing."""


def all_positions(tower: TowerChoice, *, field: str = "") -> Float:
    """Heights above ground that a tower offers, ascending: whole steps from its lowest to its highest.

    Where the lowest and the highest are the same, that one height, whatever the step.

    Parameters
    ----------
    tower
        Limits and step.
    field
        What the hop file calls the tower (``"heights.a"``), for the messages.

    Raises
    ------
    InputError
        If no whole step lies between two different limits, or more than `MOST_POSITIONS` do.

    Examples
    --------
    >>> all_positions(TowerChoice(lowest_m=9, highest_m=15, step_m=5 * 0.3048)).round(3).tolist()
    [9.144, 10.668, 12.192, 13.716]
    >>> all_positions(TowerChoice(lowest_m=30.5, highest_m=30.5)).tolist()
    [30.5]
    """
    if tower.lowest_m == tower.highest_m:
        return np.array([tower.lowest_m])
    first = np.ceil((tower.lowest_m - ROUNDING_M) / tower.step_m)
    last = np.floor((tower.highest_m + ROUNDING_M) / tower.step_m)
    name = f"{field}." if field else ""
    if last < first:
        raise InputError(
            f"{name}lowest_m = {tower.lowest_m:g}, {name}highest_m = {tower.highest_m:g}: must hold a whole step of "
            f"{tower.step_m:g} m; widen the range, or give a smaller step"
        )
    if last - first >= MOST_POSITIONS:
        raise InputError(
            f"{name}step_m = {tower.step_m:g}: must leave at most {MOST_POSITIONS} positions from "
            f"{tower.lowest_m:g} to {tower.highest_m:g} m; give a greater step, or a narrower range"
        )
    return np.asarray((np.arange(first, last + 1) * tower.step_m).round(9))  # 22.2 m, not 22.200000000000003


def free_positions(tower: TowerChoice, *, spacing_m: float = 0.0, field: str = "") -> Float:
    """Positions of a tower that stand clear of the taken ones, ascending; empty when there is none.

    Parameters
    ----------
    tower
        Limits, step and taken positions.
    spacing_m
        With a diversity pair, how far the lower antenna is below the main one: a main antenna's position counts if
        the lower one's is free too. 0 is one antenna alone.
    field
        What the hop file calls the tower, for the messages.

    Raises
    ------
    InputError
        As `all_positions`, and for a spacing that is no whole number of steps: both antennas stand on steps.

    Examples
    --------
    >>> free_positions(TowerChoice(lowest_m=9, highest_m=14, taken_m=(11.5,))).tolist()
    [9.0, 10.0, 13.0, 14.0]
    >>> free_positions(TowerChoice(lowest_m=9, highest_m=14, taken_m=(11.5,)), spacing_m=3.0).tolist()
    [13.0]
    """
    positions = all_positions(tower, field=field)
    taken = np.asarray(tower.taken_m, dtype=float)
    apart = np.abs(positions[:, None] - taken) >= tower.taken_clearance_m - ROUNDING_M
    free = np.asarray(positions[apart.all(axis=1)])
    return _above_a_free_one(free, tower, spacing_m, field) if spacing_m > 0 else free


def _above_a_free_one(free: Float, tower: TowerChoice, spacing_m: float, field: str) -> Float:
    """Free positions with another one the spacing below."""
    steps = round(spacing_m / tower.step_m)
    if abs(spacing_m - steps * tower.step_m) > ROUNDING_M:
        below = np.floor(spacing_m / tower.step_m) * tower.step_m
        step = f"{field}.step_m" if field else "step_m"
        raise InputError(
            f"availability.diversity.spacing_m = {spacing_m:g}: must be a whole number of steps of {step} = "
            f"{tower.step_m:g} m, as both antennas stand on steps; give {below + tower.step_m:g}, or a finer step"
        )
    at = np.searchsorted(free, free - spacing_m - ROUNDING_M)  # never past the end: a position is not below itself
    return np.asarray(free[np.abs(free[at] - (free - spacing_m)) <= ROUNDING_M])


def both_free(tower_a: TowerChoice, tower_b: TowerChoice, *, spacing_m: float = 0.0) -> tuple[Float, Float]:
    """Free positions of both towers, as `free_positions`; the messages name the tower.

    Examples
    --------
    >>> both_free(TowerChoice(), TowerChoice(lowest_m=10.2, highest_m=10.8))
    Traceback (most recent call last):
    ...
    profiler.errors.InputError: heights.b.lowest_m = 10.2, heights.b.highest_m = 10.8: must hold a whole step of 1 m; \
widen the range, or give a smaller step
    """
    return (
        free_positions(tower_a, spacing_m=spacing_m, field="heights.a"),
        free_positions(tower_b, spacing_m=spacing_m, field="heights.b"),
    )


def round_up(height_m: float, tower: TowerChoice, *, spacing_m: float = 0.0, field: str = "") -> float | None:
    """Lowest free position of a tower at or above a height, as `free_positions`; None when there is none.

    Examples
    --------
    >>> round_up(10.2, TowerChoice(highest_m=14, taken_m=(11.5,))), round_up(14.1, TowerChoice(highest_m=14))
    (13.0, None)
    """
    fitting = free_positions(tower, spacing_m=spacing_m, field=field)
    fitting = fitting[fitting >= height_m - ROUNDING_M]
    return float(fitting[0]) if fitting.size else None


def height_cost(tower: TowerChoice, antenna_m: ArrayLike) -> Float:
    """Cost of an antenna height: so much a metre, and a fixed sum above the threshold (not at it).

    Examples
    --------
    >>> height_cost(TowerChoice(cost_per_m=2, threshold_m=60, threshold_cost=500), [30, 60, 61]).tolist()
    [60.0, 120.0, 622.0]
    """
    height = np.asarray(antenna_m, dtype=float)
    above = np.zeros_like(height, dtype=bool) if tower.threshold_m is None else height > tower.threshold_m + ROUNDING_M
    return np.asarray(tower.cost_per_m * height + np.where(above, tower.threshold_cost, 0.0))
