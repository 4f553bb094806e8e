"""Least heights for a limit that is no straight line in the heights: diffraction loss, or an availability objective."""

from __future__ import annotations

import heapq
import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np

from profiler.checks import not_negative
from profiler.heights.choose import Choice, NoPair, cheapest_of, no_position
from profiler.heights.tower_positions import both_free, height_cost
from profiler.models import TowerChoice, frozen_array
from profiler.remarks import Length, note
from profiler.units import Float

__all__ = ["LimitHeights", "cheapest_by_trial", "heights_within", "loss_excess"]

_RESOLUTION_M = 0.01
_MOST_TRIALS = 160
"""Pairs tried for the cheapest one: a second on a path of 500 points, some ten on one of 12 000."""

_EQUAL_TRIED = 24


@dataclass(frozen=True, slots=True, eq=False)
class LimitHeights:
    """Heights that keep a quantity within its limit.

    ``least_equal_m`` is the least equal height within both towers' limits, to a centimetre; None where none was found.
    ``holds_above`` says whether every greater equal height that was tried is good too. ``frontier_m`` (m, 2) are good
    pairs of free positions, A rising and B falling. Where heights only ever help, no pair is cheaper than ``cheapest``
    by more than ``cheaper_by_at_most``. ``trials`` is how many pairs of heights were tried.
    """

    least_equal_m: float | None
    holds_above: bool
    frontier_m: Float
    cheapest: Choice | NoPair
    cheaper_by_at_most: float
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
    with the antennas; a steeper path has less multipath fading), so a good pair can be overlooked;
    `LimitHeights.holds_above` tells whether the equal heights behave.

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
    >>> found.frontier_m[:4].tolist(), found.trials
    ([[20.0, 55.0], [25.0, 50.0], [30.0, 45.0], [35.0, 40.0]], 35)
    >>> found.cheapest
    Choice(antenna_a_m=35.0, antenna_b_m=40.0, cost=75.0)
    """
    tried = cache(excess)
    free_a, free_b = both_free(tower_a, tower_b, spacing_m=spacing_m)
    found, pairs, slack = cheapest_by_trial(tried, free_a, free_b, tower_a, tower_b)
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
        words = f"no pair found: at the highest there is, A {{}} and B {{}}, {verdict}"
        reason = note("heights", words, Length(best_a), Length(best_b))
        choice = NoPair(reason, best_a, best_b, proven=False)
    return LimitHeights(equal, holds, frozen_array(pairs), choice, slack, tried.cache_info().misses)


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
) -> tuple[Choice | None, Float, float]:
    """Find the cheapest pair of positions that is good, in a bounded number of trials.

    If heights only ever help, the least good B falls as A rises. So between two positions of A whose least B are known
    every pair costs at least the next position of A with the least B of the higher one. The gap where that is least is
    halved next, until no gap can hold a cheaper pair, or the trials are used up.

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
    choice
        The cheapest pair found, or None.
    pairs
        Good pairs found, A rising and B falling, (m, 2).
    cheaper_by_at_most
        How much cheaper a pair that was not found can be, if heights only ever help; 0 where none is.

    Examples
    --------
    >>> free, tower = np.arange(1.0, 1001.0), TowerChoice()
    >>> choice, pairs, slack = cheapest_by_trial(lambda a, b: 700.5 - a - 2 * b, free, free, tower, tower)
    >>> choice, slack
    (Choice(antenna_a_m=1.0, antenna_b_m=350.0, cost=351.0), 0.0)
    """
    stairs = _Stairs(excess, free_a, free_b)
    top_a = stairs.top()
    if top_a is None:
        return None, np.empty((0, 2)), 0.0
    cost_a = height_cost(tower_a, free_a)
    cost_b = np.append(height_cost(tower_b, free_b), np.inf)

    def gap(low: int, high: int) -> tuple[float, int, int]:
        cheapest_between = np.inf if high - low < 2 else float(cost_a[low + 1] + cost_b[stairs.least[high]])
        return cheapest_between, low, high

    stairs.resolve(0, -1, free_b.size)
    stairs.resolve(top_a, -1, stairs.least[0])
    gaps = [gap(0, top_a)]
    while gaps[0][0] < stairs.cheapest(cost_a, cost_b) and len(stairs.tried) < _MOST_TRIALS:
        _, low, high = heapq.heappop(gaps)
        middle = (low + high) // 2
        stairs.resolve(middle, stairs.least[high] - 1, stairs.least[low])
        heapq.heappush(gaps, gap(low, middle))
        heapq.heappush(gaps, gap(middle, high))
    pairs = stairs.pairs()
    choice = cheapest_of(pairs[:, 0], pairs[:, 1], tower_a, tower_b)
    return choice, pairs, max(0.0, choice.cost - gaps[0][0])


class _Stairs:
    """Least good positions of B for some positions of A, by their indices; the number of B's where there is none."""

    def __init__(self, excess: Callable[[float, float], float], free_a: Float, free_b: Float) -> None:
        self._excess, self._free_a, self._free_b = excess, free_a, free_b
        self.tried: dict[tuple[int, int], bool] = {}
        self.least: dict[int, int] = {}

    def good(self, a: int, b: int) -> bool:
        if (a, b) not in self.tried:
            self.tried[a, b] = self._excess(float(self._free_a[a]), float(self._free_b[b])) <= 0
        return self.tried[a, b]

    def top(self) -> int | None:
        """Highest A that is good with the highest B, of some spread evenly; None where none is."""
        highest = self._free_b.size - 1
        spread = np.linspace(self._free_a.size - 1, 0, min(_EQUAL_TRIED, self._free_a.size)).round().astype(int)
        return next((int(a) for a in spread if highest >= 0 and self.good(int(a), highest)), None)

    def resolve(self, a: int, bad: int, good: int) -> None:
        """Halve the positions of B between one that is bad with this A and one that is good."""
        if bad < 0 < good and self.good(a, 0):
            good = 0
        while good - bad > 1 and good > 0:
            middle = (bad + good) // 2
            bad, good = (bad, middle) if self.good(a, middle) else (middle, good)
        self.least[a] = good

    def cheapest(self, cost_a: Float, cost_b: Float) -> float:
        return min(float(cost_a[a] + cost_b[b]) for a, b in self.least.items())

    def pairs(self) -> Float:
        """Pairs with A rising and B falling, heights; what no trial saw good at this A, a lower A has as well."""
        good = np.array(sorted(pair for pair in self.least.items() if self.tried.get(pair)), dtype=np.intp).reshape(
            -1, 2
        )
        lowest_before = np.minimum.accumulate(np.append(self._free_b.size, good[:, 1]))[:-1]
        good = good[good[:, 1] < lowest_before]
        return np.column_stack((self._free_a[good[:, 0]], self._free_b[good[:, 1]]))


def _least_equal(
    excess: Callable[[float, float], float], tower_a: TowerChoice, tower_b: TowerChoice
) -> tuple[float | None, bool]:
    """Least equal height in both towers' range that is good, and whether all greater ones tried are good."""
    lowest, highest = max(tower_a.lowest_m, tower_b.lowest_m), min(tower_a.highest_m, tower_b.highest_m)
    if lowest > highest:
        return None, False
    steps = math.ceil((highest - lowest) / max(tower_a.step_m, tower_b.step_m))
    tried = np.unique(np.linspace(lowest, highest, min(_EQUAL_TRIED, steps) + 1))
    good = np.array([excess(float(height), float(height)) <= 0 for height in tried])
    if not good.any():
        return None, False
    first = int(np.argmax(good))
    high, low = float(tried[first]), float(tried[first - 1] if first else tried[0])
    while high - low > _RESOLUTION_M:
        middle = 0.5 * (low + high)
        low, high = (low, middle) if excess(middle, middle) <= 0 else (middle, high)
    return high, bool(good[first:].all())
