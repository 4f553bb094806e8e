"""How sure it is that a pair of heights clears, and the least heights that are sure enough, over draws of the errors.

Every draw of the errors moves the ground and with it what the ray must reach, so every draw has a clearing region of
its own. The draws do not depend on the antenna heights: one set answers for every pair.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.checks import within
from profiler.heights.region import ClearingRegion, clearing_region
from profiler.units import Float

__all__ = ["DrawnRegions", "drawn_regions", "least_b_sure", "least_surplus_drawn"]

_BLOCK = 64

_SINGLE_M = 2e-5
"""Rounding of heights of some 100 m in single precision."""


@dataclass(frozen=True, slots=True, eq=False)
class DrawnRegions:
    """What the ray must reach in every draw, at the points that are the tightest in any.

    ``share`` (m,) is the way to B, 0 to 1. ``needed_m`` (m, draws) is the least height of the ray above the straight
    line between the given ground at the sites, from where the antenna heights count.
    """

    share: NDArray[np.float32]
    needed_m: NDArray[np.float32]


def drawn_regions(region: ClearingRegion, errors: Callable[[NDArray[np.intp]], NDArray[np.float32]]) -> DrawnRegions:
    """Move a clearing region by every draw of the errors.

    Parameters
    ----------
    region
        From `profiler.heights.clearing_region`: what the ray must reach on the given ground.
    errors
        Gives what each draw adds to the surplus of the ray at some of the points, (k, draws) for k indices. It is asked
        for a block of points at a time: all of them at once would fill the memory.

    Returns
    -------
    DrawnRegions
        Without the points that cannot be the tightest in any draw: those whose greatest need over the draws stays
        under the hull of the least needs.

    Examples
    --------
    >>> region = clearing_region([0, 5e3, 10e3], [100, 160, 100], 100, 100)
    >>> drawn = drawn_regions(region, np.array([[0, 0], [-4, 4], [0, 0]], dtype=np.float32).__getitem__)
    >>> drawn.share.tolist(), drawn.needed_m.tolist()
    ([0.0, 0.5, 1.0], [[0.0, 0.0], [64.0, 56.0], [0.0, 0.0]])
    """
    share = region.distance_m / region.distance_m[-1]
    above_line = region.least_ray_m - (1.0 - share) * region.ground_a_m - share * region.ground_b_m
    greatest, least = above_line.copy(), above_line.copy()
    for first in range(0, share.size, _BLOCK):
        index = np.arange(first, min(first + _BLOCK, share.size))
        drawn = errors(index)
        greatest[index] -= drawn.min(axis=1)
        least[index] -= drawn.max(axis=1)
    # only the hull is wanted: the sites' own ground is far below
    hull = clearing_region(region.distance_m, least, float(least[0]), float(least[-1]))
    corners = hull.governing_point
    kept = np.flatnonzero(greatest >= np.interp(share, share[corners], least[corners]) - _SINGLE_M)
    return DrawnRegions(
        share=share[kept].astype(np.float32),
        needed_m=above_line[kept, None].astype(np.float32) - errors(kept),
    )


def least_surplus_drawn(drawn: DrawnRegions, antenna_a_m: float, antenna_b_m: float) -> NDArray[np.float32]:
    """Least surplus of the ray in every draw, (draws,), for one pair of antenna heights.

    Examples
    --------
    >>> region = clearing_region([0, 5e3, 10e3], [100, 160, 100], 100, 100)
    >>> drawn = drawn_regions(region, np.array([[0, 0], [-4, 4], [0, 0]], dtype=np.float32).__getitem__)
    >>> least_surplus_drawn(drawn, 61, 61).tolist()
    [-3.0, 5.0]
    """
    ray = (1 - drawn.share) * np.float32(antenna_a_m) + drawn.share * np.float32(antenna_b_m)
    surplus: NDArray[np.float32] = (ray[:, None] - drawn.needed_m).min(axis=0)
    return np.where(np.abs(surplus) < np.float32(_SINGLE_M), np.float32(0), surplus)


def least_b_sure(drawn: DrawnRegions, antenna_a_m: ArrayLike, chance: float) -> Float:
    """Least antenna B for each antenna A with which the given share of the draws clears; infinite where no B does.

    For each A every draw asks for a least B; the answer is the order statistic of these, exact but for the number of
    draws, and never rises with A.

    Parameters
    ----------
    drawn
        From `drawn_regions`.
    antenna_a_m
        Antennas A above ground, (k,).
    chance
        Share of the draws, more than 0 and at most 1.

    Returns
    -------
    ndarray
        (k,), metres above the ground at B.

    Raises
    ------
    InputError
        For a chance out of range.

    Examples
    --------
    >>> region = clearing_region([0, 5e3, 10e3], [100, 160, 100], 100, 100)
    >>> drawn = drawn_regions(region, np.array([[0, 0], [-4, 4], [0, 0]], dtype=np.float32).__getitem__)
    >>> least_b_sure(drawn, [-1.0, 60.0, 70.0], 0.5).tolist(), least_b_sure(drawn, [60.0], 1.0).tolist()
    ([inf, 52.0, 42.0], [68.0])
    """
    within("chance", chance, 0.0, 1.0, "more than 0 and at most 1", above=True)
    rank = int(np.ceil(chance * drawn.needed_m.shape[1])) - 1
    lifts = drawn.share > 0
    share, needed = drawn.share[lifts, None], drawn.needed_m[lifts]
    per_b, per_a = needed / share, ((1 - share) / share)
    # what stands at A itself no B can lift
    at_a = drawn.needed_m[~lifts].max(axis=0, initial=-np.inf)
    heights = np.asarray(antenna_a_m, dtype=float)
    found = np.empty(heights.shape)
    for index, height in enumerate(heights):
        wanted = (per_b - np.float32(height) * per_a).max(axis=0)
        wanted[at_a > height + _SINGLE_M] = np.inf
        found[index] = np.partition(wanted, rank)[rank]
    return found
