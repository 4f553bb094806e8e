"""Least heights for a limit that is no straight line in the heights: diffraction loss, or an availability objective."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from profiler.errors import InputError
from profiler.heights.choose import Choice, NoPair, cheapest_of
from profiler.heights.positions import free_positions
from profiler.models import TowerChoice, frozen_array
from profiler.units import Float

__all__ = ["LimitHeights", "heights_for_loss", "heights_within"]

_RESOLUTION_M = 0.01


@dataclass(frozen=True, slots=True, eq=False)
class LimitHeights:
    """Heights that keep a quantity within its limit.

    ``least_equal_m`` is the least equal height within both towers' limits, to a centimetre; None where none was found.
    ``holds_above`` says whether every greater equal height that was tried is good too. ``frontier_m`` (m, 2) are the
    pairs of free positions, A rising, each with the least B for its A; pairs with no gain in B are left out.
    """

    least_equal_m: float | None
    holds_above: bool
    frontier_m: Float
    cheapest: Choice | NoPair


def heights_within(
    excess: Callable[[float, float], float],
    tower_a: TowerChoice,
    tower_b: TowerChoice,
    *,
    what: str = "diffraction loss",
    unit: str = "dB",
) -> LimitHeights:
    """Find the least heights that keep a quantity within its limit, by trial of a forward model.

    The equal heights are tried at every step from the bottom to the top, and the first good one is refined to a
    centimetre. The pairs follow a staircase: from the lowest A and the highest B, B comes down while the limit holds,
    then A goes up a step. Every answer was tried and is good, and B a step lower was tried and is not.

    Neither diffraction loss nor outage falls strictly with height (the smooth-earth heights of delta-Bullington move
    with the antennas; a steeper path has less multipath fading), so a good pair away from the staircase can be
    overlooked; `LimitHeights.holds_above` tells whether the equal heights behave.

    Parameters
    ----------
    excess
        Forward model: how far the quantity is over its limit, for antenna heights A and B above ground in metres; 0 or
        less is good, infinity and NaN are bad.
    tower_a, tower_b
        Limits, steps, taken positions and costs.
    what, unit
        Name and unit of the quantity, for the statement when nothing is found.

    Returns
    -------
    LimitHeights
        Its ``cheapest`` is a `NoPair`, marked as not proven, when no pair was found.

    Raises
    ------
    InputError
        If a tower's limits hold no whole step.

    Examples
    --------
    A loss of 20 dB that falls by 0.1 dB for every metre of either antenna, held to 12.54 dB:

    >>> tower = TowerChoice(lowest_m=20, highest_m=60, step_m=5)
    >>> found = heights_within(lambda a, b: 20 - 0.1 * (a + b) - 12.54, tower, tower)
    >>> round(found.least_equal_m, 1), found.holds_above
    (37.3, True)
    >>> found.frontier_m.tolist()
    [[20.0, 55.0], [25.0, 50.0], [30.0, 45.0], [35.0, 40.0], [40.0, 35.0], [45.0, 30.0], [50.0, 25.0], [55.0, 20.0]]
    >>> found.cheapest
    Choice(antenna_a_m=35.0, antenna_b_m=40.0, cost=75.0)
    """
    free_a, free_b = free_positions(tower_a), free_positions(tower_b)
    pairs = _staircase(excess, free_a, free_b)
    equal, holds = _least_equal(excess, tower_a, tower_b)
    choice: Choice | NoPair
    if pairs.size:
        choice = cheapest_of(pairs[:, 0], pairs[:, 1], tower_a, tower_b)
    elif not (free_a.size and free_b.size):
        full = " and ".join(name for name, free in (("A", free_a), ("B", free_b)) if not free.size)
        choice = NoPair(f"no pair: every position of tower {full} is taken, or too close to one", math.nan, math.nan)
    else:
        best_a, best_b = float(free_a[-1]), float(free_b[-1])
        over = excess(best_a, best_b)
        verdict = (
            f"the {what} is {over:.2f} {unit} over its limit"
            if math.isfinite(over)
            else f"the {what} has no value: an antenna stands inside its own cover"
        )
        reason = f"no pair found: at the highest there is, A {best_a:.2f} m and B {best_b:.2f} m, {verdict}"
        choice = NoPair(reason, best_a, best_b, proven=False)
    return LimitHeights(equal, holds, frozen_array(pairs), choice)


def heights_for_loss(
    loss_db: Callable[[float, float], float],
    limit_db: float,
    *,
    grounds_m: tuple[float, float],
    surfaces_m: tuple[float, float],
    tower_a: TowerChoice,
    tower_b: TowerChoice,
) -> LimitHeights:
    """Find the least heights for which the diffraction loss stays within a limit; see `heights_within`.

    Parameters
    ----------
    loss_db
        Loss over free space in dB for antenna centres A and B above the datum, at the k that is asked for: for
        instance `profiler.diffraction.delta_bullington` with the profile and the effective radius filled in.
    limit_db
        Greatest loss, 0 dB or more.
    grounds_m, surfaces_m
        Ground, and ground plus cover, at A and B above the datum. An antenna below the surface of its own site is bad
        whatever the loss, and ``loss_db`` is not asked about it.
    tower_a, tower_b
        Limits, steps, taken positions and costs.

    Raises
    ------
    InputError
        For a limit below 0, or a tower's limits that hold no whole step.

    Examples
    --------
    A knife edge 30 m above two equal sites, halfway on a 10 km hop at 6 GHz (ν = 0.1265·h); a ray that grazes it loses
    6.03 dB. Trees of 8 m stand at B:

    >>> from profiler.diffraction import knife_edge_loss
    >>> edge = lambda a, b: float(knife_edge_loss(0.1265 * (30 - (a + b) / 2)))
    >>> found = heights_for_loss(edge, 6.04, grounds_m=(0, 0), surfaces_m=(0, 8), tower_a=TowerChoice(),
    ...     tower_b=TowerChoice())
    >>> round(found.least_equal_m, 1), found.frontier_m[:2].tolist(), found.frontier_m[-1].tolist()
    (30.0, [[1.0, 59.0], [2.0, 58.0]], [52.0, 8.0])
    """
    if not 0 <= limit_db < math.inf:
        raise InputError(f"limit_db = {limit_db}: must be 0 dB or more")

    def excess(antenna_a_m: float, antenna_b_m: float) -> float:
        centres = grounds_m[0] + antenna_a_m, grounds_m[1] + antenna_b_m
        inside = any(centre < surface for centre, surface in zip(centres, surfaces_m, strict=True))
        return math.inf if inside else loss_db(*centres) - limit_db

    return heights_within(excess, tower_a, tower_b)


def _staircase(excess: Callable[[float, float], float], free_a: Float, free_b: Float) -> Float:
    """Pairs of positions, (m, 2): least B for each A, walked so that each step tries one pair."""
    pairs = []
    last = free_b.size
    for a in free_a:
        index = min(last, free_b.size - 1)
        if index < 0 or not excess(float(a), float(free_b[index])) <= 0:
            continue
        while index > 0 and excess(float(a), float(free_b[index - 1])) <= 0:
            index -= 1
        if index < last:
            pairs.append((float(a), float(free_b[index])))
            last = index
        if index == 0:
            break
    return np.array(pairs, dtype=float).reshape(-1, 2)


def _least_equal(
    excess: Callable[[float, float], float], tower_a: TowerChoice, tower_b: TowerChoice
) -> tuple[float | None, bool]:
    """Least equal height in both towers' range that is good, and whether all greater ones tried are good."""
    lowest, highest = max(tower_a.lowest_m, tower_b.lowest_m), min(tower_a.highest_m, tower_b.highest_m)
    if lowest > highest:
        return None, False
    tried = np.unique((*np.arange(lowest, highest, max(tower_a.step_m, tower_b.step_m)), highest))
    good = np.array([excess(float(height), float(height)) <= 0 for height in tried])
    if not good.any():
        return None, False
    first = int(np.argmax(good))
    high, low = float(tried[first]), float(tried[first - 1] if first else tried[0])
    while high - low > _RESOLUTION_M:
        middle = 0.5 * (low + high)
        low, high = (low, middle) if excess(middle, middle) <= 0 else (middle, high)
    return high, bool(good[first:].all())
