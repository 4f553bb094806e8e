"""The heights at which a tower can take an antenna, and what they cost."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.geometry import ROUNDING_M
from profiler.models import TowerChoice
from profiler.units import Float

__all__ = ["all_positions", "free_positions", "height_cost", "round_up"]


def all_positions(tower: TowerChoice) -> Float:
    """Heights above ground that a tower offers, ascending: whole steps from its lowest to its highest.

    Where the lowest and the highest are the same, that one height, whatever the step.

    Raises
    ------
    InputError
        If no whole step lies between two different limits.

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
    if last < first:
        raise InputError(
            f"lowest_m = {tower.lowest_m:g}, highest_m = {tower.highest_m:g}: must hold a whole step of "
            f"{tower.step_m:g} m; widen the range, or give a smaller step"
        )
    return np.asarray(np.arange(first, last + 1) * tower.step_m)


def free_positions(tower: TowerChoice) -> Float:
    """Positions of a tower that stand clear of the taken ones, ascending; empty when the tower is full.

    Examples
    --------
    >>> free_positions(TowerChoice(lowest_m=9, highest_m=14, taken_m=(11.5,))).tolist()
    [9.0, 10.0, 13.0, 14.0]
    """
    positions = all_positions(tower)
    taken = np.asarray(tower.taken_m, dtype=float)
    apart = np.abs(positions[:, None] - taken) >= tower.taken_clearance_m - ROUNDING_M
    return np.asarray(positions[apart.all(axis=1)])


def round_up(height_m: float, tower: TowerChoice) -> float | None:
    """Lowest free position of a tower at or above a height; None when there is none.

    Examples
    --------
    >>> round_up(10.2, TowerChoice(highest_m=14, taken_m=(11.5,))), round_up(14.1, TowerChoice(highest_m=14))
    (13.0, None)
    """
    fitting = free_positions(tower)
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
