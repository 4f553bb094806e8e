"""Least heights for a limit that is no straight line in the heights: diffraction loss, or an availability objective."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from profiler.checks import not_negative
from profiler.geometry import ROUNDING_M
from profiler.heights.choose import Choice, NoPair, cheapest_of, no_position
from profiler.heights.positions import both_free
from profiler.models import TowerChoice, frozen_array
from profiler.units import Float

__all__ = ["LimitHeights", "cheapest_by_trial", "heights_within", "loss_excess"]

_RESOLUTION_M = 0.01
_AT_ONCE = 24
"""Positions of a tower looked at in one pass: a pass tries at most twice as many pairs, and each shrinks the steps
between them twelvefold, so that three passes do for the most positions there are."""


@dataclass(frozen=True, slots=True, eq=False)
class LimitHeights:
    """Heights that keep a quantity within its limit.

    ``least_equal_m`` is the least equal height within both towers' limits, to a centimetre; None where none was found.
    ``holds_above`` says whether every greater equal height that was tried is good too. ``frontier_m`` (m, 2) are good
    pairs of free positions, A rising and B falling. ``trials`` is how many pairs of heights were tried.
    """

    least_equal_m: float | None
    holds_above: bool
    frontier_m: Float
    cheapest: Choice | NoPair
    trials: int


def heights_within(
    excess: Callable[[float, float], float],
    tower_a: TowerChoice,
    tower_b: TowerChoice,
    *,
    spacing_m: float = 0.0,
    what: str = "diffraction loss",
    unit: str = "dB",
) -> LimitHeights:
    """Find the least heights that keep a quantity within its limit, by trial of a forward model.

    Some equal heights from the bottom to the top are tried, and the first good one is refined to a centimetre. The
    pairs are those of `cheapest_by_trial`. Every answer was tried and is good.

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
    spacing_m
        Spacing of a diversity pair, whose lower antennas need free positions too; 0 without.
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
    tried = cache(excess)
    free_a, free_b = both_free(tower_a, tower_b, spacing_m=spacing_m)
    found, pairs = cheapest_by_trial(tried, free_a, free_b, tower_a, tower_b)
    equal, holds = _least_equal(tried, tower_a, tower_b)
    choice: Choice | NoPair
    if found is not None:
        choice = found
    elif not (free_a.size and free_b.size):
        choice = no_position(tower_a, tower_b, free_a, free_b, spacing_m)
    else:
        best_a, best_b = float(free_a[-1]), float(free_b[-1])
        over = tried(best_a, best_b)
        verdict = (
            f"the {what} is {over:.2f} {unit} over its limit"
            if math.isfinite(over)
            else f"the {what} has no value: an antenna stands inside its own cover"
        )
        reason = f"no pair found: at the highest there is, A {best_a:.2f} m and B {best_b:.2f} m, {verdict}"
        choice = NoPair(reason, best_a, best_b, proven=False)
    return LimitHeights(equal, holds, frozen_array(pairs), choice, tried.cache_info().misses)


def loss_excess(
    loss_db: Callable[[float, float], float],
    limit_db: float,
    *,
    grounds_m: tuple[float, float],
    surfaces_m: tuple[float, float],
) -> Callable[[float, float], float]:
    """Give the forward model of `heights_within` that holds a diffraction loss to a limit.

    Parameters
    ----------
    loss_db
        Loss over free space in dB for antenna centres A and B above the datum, at the k that is asked for: for
        instance `profiler.diffraction.delta_bullington` with the profile and the effective radius filled in.
    limit_db
        Greatest loss, 0 dB or more.
    grounds_m, surfaces_m
        Ground, and ground plus cover, at A and B above the datum. An antenna that is not above the surface of its own
        site is bad whatever the loss, and ``loss_db`` is not asked about it.

    Returns
    -------
    callable
        By how many dB antenna heights A and B above ground exceed the limit.

    Raises
    ------
    InputError
        For a limit below 0.

    Examples
    --------
    A knife edge 30 m above two equal sites, halfway on a 10 km hop at 6 GHz (ν = 0.1265·h); a ray that grazes it loses
    6.03 dB. Trees of 8 m stand at B:

    >>> from profiler.diffraction import knife_edge_loss
    >>> edge = lambda a, b: float(knife_edge_loss(0.1265 * (30 - (a + b) / 2)))
    >>> excess = loss_excess(edge, 6.04, grounds_m=(0, 0), surfaces_m=(0, 8))
    >>> found = heights_within(excess, TowerChoice(), TowerChoice())
    >>> round(found.least_equal_m, 1), found.cheapest
    (30.0, Choice(antenna_a_m=30.0, antenna_b_m=30.0, cost=60.0))
    """
    not_negative("limit_db", limit_db, "dB")

    def excess(antenna_a_m: float, antenna_b_m: float) -> float:
        centres = grounds_m[0] + antenna_a_m, grounds_m[1] + antenna_b_m
        inside = any(centre <= surface for centre, surface in zip(centres, surfaces_m, strict=True))
        return math.inf if inside else loss_db(*centres) - limit_db

    return excess


def cheapest_by_trial(
    excess: Callable[[float, float], float], free_a: Float, free_b: Float, tower_a: TowerChoice, tower_b: TowerChoice
) -> tuple[Choice | None, Float]:
    """Find the cheapest pair of positions that is good, in a bounded number of trials.

    In one pass a staircase is walked over some positions of each tower, spread evenly: from the lowest A and the
    highest B, B comes down while the pair is good, then A goes up. The next pass looks more finely around the cheapest
    pair found, until no position there is left out. Where heights only ever help, no pair nearby is cheaper; on towers
    of more than some two dozen positions a pair elsewhere can be, by no more than a step of the first pass costs.

    Parameters
    ----------
    excess
        As in `heights_within`.
    free_a, free_b
        Free positions, ascending.
    tower_a, tower_b
        Costs.

    Returns
    -------
    choice, pairs
        The cheapest pair, or None; all good pairs found of which none is higher than another at both ends, (m, 2).

    Examples
    --------
    >>> free, tower = np.arange(1.0, 1001.0), TowerChoice()
    >>> cheapest_by_trial(lambda a, b: 700.5 - a - 2 * b, free, free, tower, tower)[0]
    Choice(antenna_a_m=1.0, antenna_b_m=350.0, cost=351.0)
    """
    span_a, span_b = (0, free_a.size - 1), (0, free_b.size - 1)
    kept_a, kept_b = [tower_a.threshold_m], [tower_b.threshold_m]
    found = np.empty((0, 2))
    choice: Choice | None = None
    while min(span_a[1], span_b[1]) >= 0:
        some_a, some_b = _some(free_a, span_a, kept_a), _some(free_b, span_b, kept_b)
        found = np.concatenate((found, _staircase(excess, free_a[some_a], free_b[some_b])))
        if not found.size:
            break
        choice = cheapest_of(found[:, 0], found[:, 1], tower_a, tower_b)
        step_a, step_b = (int(np.diff(some).max(initial=1)) for some in (some_a, some_b))
        if step_a == step_b == 1:
            break
        kept_a, kept_b = [choice.antenna_a_m], [choice.antenna_b_m]
        span_a, span_b = _around(free_a, choice.antenna_a_m, step_a), _around(free_b, choice.antenna_b_m, step_b)
    return choice, _undominated(found)


def _some(free: Float, span: tuple[int, int], kept_m: list[float | None]) -> NDArray[np.intp]:
    """Spread indices evenly over a span, with both ends and the positions just at or under some heights."""
    spread = np.linspace(*span, min(_AT_ONCE, span[1] - span[0] + 1)).round()
    under = np.searchsorted(free, [height + ROUNDING_M for height in kept_m if height is not None]) - 1
    kept = under[(under >= span[0]) & (under <= span[1])]
    return np.unique(np.concatenate((spread, kept)).astype(np.intp))


def _around(free: Float, height_m: float, step: int) -> tuple[int, int]:
    """Span of indices a step to each side of a position."""
    at = int(np.searchsorted(free, height_m))
    return max(0, at - step), min(free.size - 1, at + step)


def _undominated(pairs: Float) -> Float:
    """Pairs with A rising and B falling: each is lower than every other at one end."""
    ordered = pairs[np.lexsort((pairs[:, 1], pairs[:, 0]))]
    lowest_before = np.minimum.accumulate(np.concatenate(([np.inf], ordered[:, 1])))[:-1]
    return np.asarray(ordered[ordered[:, 1] < lowest_before])


def _staircase(excess: Callable[[float, float], float], free_a: Float, free_b: Float) -> Float:
    """Pairs of positions, (m, 2): least B for each A, walked so that each step tries one pair."""
    if excess(float(free_a[0]), float(free_b[0])) <= 0:
        return np.array([[free_a[0], free_b[0]]])
    pairs = []
    last = free_b.size
    for a in free_a:
        index = min(last, free_b.size - 1)
        if not excess(float(a), float(free_b[index])) <= 0:
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
    steps = math.ceil((highest - lowest) / max(tower_a.step_m, tower_b.step_m))
    tried = np.unique(np.linspace(lowest, highest, min(_AT_ONCE, steps) + 1))
    good = np.array([excess(float(height), float(height)) <= 0 for height in tried])
    if not good.any():
        return None, False
    first = int(np.argmax(good))
    high, low = float(tried[first]), float(tried[first - 1] if first else tried[0])
    while high - low > _RESOLUTION_M:
        middle = 0.5 * (low + high)
        low, high = (low, middle) if excess(middle, middle) <= 0 else (middle, high)
    return high, bool(good[first:].all())
