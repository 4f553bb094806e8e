"""Choose antenna heights from a clearing region under limits and costs, or prove that no pair clears."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from profiler.errors import InputError
from profiler.geometry import ROUNDING_M, tight_places
from profiler.heights.region import ClearingRegion, Least, least_a_for, least_b_for, surplus
from profiler.heights.tower_positions import both_free, free_positions, height_cost
from profiler.models import TowerChoice
from profiler.remarks import Length, Note, note
from profiler.units import Float

__all__ = ["Choice", "Lowering", "NoPair", "cheapest", "cheapest_of", "least_other", "no_position"]

_TALLEST_M = 2000.0
"""Above this no antenna is mounted (the models refuse it), so it is no remedy."""


@dataclass(frozen=True, slots=True)
class Choice:
    """A pair of antenna heights above ground and what it costs."""

    antenna_a_m: float
    antenna_b_m: float
    cost: float


@dataclass(frozen=True, slots=True)
class Lowering:
    """One place that stands too high, and by how much; ``rule`` is an index, -1 for the bare ground of a site."""

    point: int
    distance_m: float
    rule: int
    by_m: float


@dataclass(frozen=True, slots=True)
class NoPair:
    """No pair of heights is good enough under the limits, why, and what would have to change.

    ``best_a_m`` and ``best_b_m`` are the highest pair there is: raising an antenna never lowers the ray, so when that
    pair is short, every pair is. NaN where a tower has no free position at all. Each of the following would do alone:
    lower all of ``lower`` (each is the top of a place, which may stand in the way beside its top too); let A stand at
    ``raise_a_to_m`` (None: no height of A alone would do), or B at ``raise_b_to_m``; raise both by ``raise_both_by_m``;
    with ``taken_to_blame`` free the taken positions.
    ``proven`` is False where the search was by trial, not by the region: then no pair was found.
    """

    reason: Note
    best_a_m: float
    best_b_m: float
    lower: tuple[Lowering, ...] = ()
    raise_a_to_m: float | None = None
    raise_b_to_m: float | None = None
    raise_both_by_m: float | None = None
    taken_to_blame: bool = False
    proven: bool = True


def least_other(
    region: ClearingRegion, *, fixed_a_m: float | None = None, fixed_b_m: float | None = None
) -> Least | NoPair:
    """Least height at one end with the antenna at the other end fixed.

    Parameters
    ----------
    region
        From `profiler.heights.clearing_region`.
    fixed_a_m, fixed_b_m
        Height above ground of the fixed antenna, more than 0 m; exactly one of the two.

    Returns
    -------
    Least or NoPair
        `NoPair` when the fixed antenna stands too low at its own site (in its own cover) for any height to help.

    Raises
    ------
    InputError
        If none or both are given, or the height is not above 0.

    Examples
    --------
    >>> from profiler.heights import clearing_region
    >>> region = clearing_region([0, 5e3, 10e3], [110, 160, 100], 100, 100)
    >>> least_other(region, fixed_a_m=40.0)
    Least(height_m=80.0, point=1, distance_m=5000.0, rule=0)
    >>> print(least_other(region, fixed_a_m=8.0).reason)
    no antenna B helps: antenna A at 8.0 m stands 2.0 m too low at its own site, where 10.0 m are needed
    """
    given = [height for height in (fixed_a_m, fixed_b_m) if height is not None]
    if len(given) != 1:
        raise InputError(f"fixed_a_m = {fixed_a_m}, fixed_b_m = {fixed_b_m}: must be exactly one height")
    fixed = given[0]
    if not 0 < fixed < math.inf:
        name = "fixed_b_m" if fixed_a_m is None else "fixed_a_m"
        raise InputError(f"{name} = {fixed}: must be more than 0 m above ground")
    at_a = fixed_a_m is not None
    lowest = region.lowest_a_m if at_a else region.lowest_b_m
    if fixed < lowest - ROUNDING_M:
        point = 0 if at_a else region.distance_m.size - 1
        place = Lowering(point, float(region.distance_m[point]), int(region.rule[point]), lowest - fixed)
        here, far = ("A", "B") if at_a else ("B", "A")
        return NoPair(
            reason=note(
                "heights",
                f"no antenna {far} helps: antenna {here} at {{}} stands {{}} too low at its own site, where {{}} are"
                " needed",
                *(Length(height) for height in (fixed, lowest - fixed, lowest)),
            ),
            best_a_m=fixed if at_a else math.inf,
            best_b_m=math.inf if at_a else fixed,
            lower=(place,),
            raise_a_to_m=lowest if at_a else None,
            raise_b_to_m=None if at_a else lowest,
        )
    height = float(least_b_for(region, fixed) if at_a else least_a_for(region, fixed))
    point = _tightest(region, fixed if at_a else height, height if at_a else fixed, at_a)
    return Least(height, point, float(region.distance_m[point]), int(region.rule[point]))


def cheapest(
    region: ClearingRegion, tower_a: TowerChoice, tower_b: TowerChoice, *, spacing_m: float = 0.0
) -> Choice | NoPair:
    """Find the cheapest pair of free positions that clears, or prove that none does.

    Every free position of A is taken with the least free position of B that clears with it; costs never fall with
    height, so the cheapest pair is among these. Of equally cheap pairs the one with the least sum is taken, then the
    one with the least taller antenna. A diversity pair costs what its main antenna does, which decides the tower.

    Parameters
    ----------
    region
        From `profiler.heights.clearing_region`.
    tower_a, tower_b
        Limits, steps, taken positions and costs.
    spacing_m
        How far each tower's lower antenna of a diversity pair is below the main one; it must stand on a free position
        too. What it must clear is the region's to say. 0: no diversity.

    Returns
    -------
    Choice or NoPair

    Raises
    ------
    InputError
        If a tower's limits hold no whole step, or the spacing is no whole number of steps.

    Examples
    --------
    The heights must sum to 120 m. A metre costs 3 at B, but an antenna A above 60 m costs 100 more:

    >>> from profiler.heights import clearing_region
    >>> region = clearing_region([0, 5e3, 10e3], [100, 160, 100], 100, 100)
    >>> tower_a, tower_b = TowerChoice(threshold_m=60, threshold_cost=100), TowerChoice(cost_per_m=3, highest_m=70)
    >>> cheapest(region, tower_a, tower_b)
    Choice(antenna_a_m=119.0, antenna_b_m=1.0, cost=222.0)
    >>> print(cheapest(region, TowerChoice(highest_m=40), tower_b).reason)
    no pair clears: at the highest there is, A 40.0 m and B 70.0 m, the ray is still 5.0 m short 5.00 km from A
    """
    free_a, free_b = both_free(tower_a, tower_b, spacing_m=spacing_m)
    if not (free_a.size and free_b.size):
        return no_position(tower_a, tower_b, free_a, free_b, spacing_m, region)
    # one micrometre of grace: a requirement that meets a position up to rounding is met
    index = np.searchsorted(free_b, least_b_for(region, free_a) - ROUNDING_M)
    found = index < free_b.size
    if not found.any():
        blame = _clears_without_taken(region, tower_a, tower_b, spacing_m)
        return _no_pair(region, float(free_a[-1]), float(free_b[-1]), taken_to_blame=blame)
    return cheapest_of(free_a[found], free_b[index[found]], tower_a, tower_b)


def cheapest_of(antenna_a_m: Float, antenna_b_m: Float, tower_a: TowerChoice, tower_b: TowerChoice) -> Choice:
    """Cheapest of some pairs that are good enough; of equals the least sum, then the least taller antenna.

    Examples
    --------
    >>> cheapest_of(np.array([10.0, 20.0, 30.0]), np.array([30.0, 20.0, 10.0]), TowerChoice(), TowerChoice())
    Choice(antenna_a_m=20.0, antenna_b_m=20.0, cost=40.0)
    """
    cost = height_cost(tower_a, antenna_a_m) + height_cost(tower_b, antenna_b_m)
    total, taller = antenna_a_m + antenna_b_m, np.maximum(antenna_a_m, antenna_b_m)
    # equal up to rounding is equal, or a rounding error would choose between mirrored pairs
    first = np.lexsort((taller, np.round(total, 6), np.round(cost, 6)))[0]
    return Choice(float(antenna_a_m[first]), float(antenna_b_m[first]), float(cost[first]))


def _tightest(region: ClearingRegion, antenna_a: float, antenna_b: float, at_a: bool) -> int:
    """Find the governing point that decides the height of the far antenna: the fixed end's own point is left out."""
    chosen = region.governing_point[1:] if at_a else region.governing_point[:-1]
    left = _ray(region, antenna_a, antenna_b)[chosen] - region.least_ray_m[chosen]
    return int(chosen[int(np.argmin(left))])


def _ray(region: ClearingRegion, antenna_a: float, antenna_b: float) -> Float:
    share = region.distance_m / region.distance_m[-1]
    return np.asarray((1 - share) * (region.ground_a_m + antenna_a) + share * (region.ground_b_m + antenna_b))


def _no_pair(region: ClearingRegion, best_a: float, best_b: float, *, taken_to_blame: bool = False) -> NoPair:
    """State why the highest pair falls short, and what would have to change."""
    left = _ray(region, best_a, best_b) - region.least_ray_m
    short = [i for i in tight_places(left, rise_m=2.0, places=left.size) if left[i] < -ROUNDING_M]
    lower = [Lowering(i, float(region.distance_m[i]), int(region.rule[i]), float(-left[i])) for i in short]
    worst = lower[0]
    to_a, to_b = float(least_a_for(region, best_b)), float(least_b_for(region, best_a))
    return NoPair(
        reason=note(
            "heights",
            "no pair clears: at the highest there is, A {} and B {}, the ray is still {} short {} from A",
            *(Length(height) for height in (best_a, best_b, worst.by_m)),
            Length(worst.distance_m, far=True),
        ),
        best_a_m=best_a,
        best_b_m=best_b,
        lower=tuple(lower),
        raise_a_to_m=to_a if to_a < _TALLEST_M else None,
        raise_b_to_m=to_b if to_b < _TALLEST_M else None,
        raise_both_by_m=worst.by_m,
        taken_to_blame=taken_to_blame,
    )


def no_position(
    tower_a: TowerChoice,
    tower_b: TowerChoice,
    free_a: Float,
    free_b: Float,
    spacing_m: float,
    region: ClearingRegion | None = None,
) -> NoPair:
    """State that a tower has no free position; with a region, whether its taken positions are to blame for no pair."""
    full = " and ".join(name for name, free in (("A", free_a), ("B", free_b)) if not free.size)
    narrow = [
        (f"tower {name} offers no two positions {{}} apart for the diversity pair, {{}} to {{}}", tower)
        for name, tower in (("A", tower_a), ("B", tower_b))
        if not _bare(tower, spacing_m).size
    ]
    lengths = [length_m for _, tower in narrow for length_m in (spacing_m, tower.lowest_m, tower.highest_m)]
    words = "; ".join(why for why, _ in narrow)
    if not narrow:
        words = f"every position of tower {full} is taken, or too close to a taken one"
        words, lengths = (f"{words}, or the one {{}} below it is", [spacing_m]) if spacing_m else (words, [])
    return NoPair(
        reason=note("heights", f"no pair: {words}", *(Length(length_m) for length_m in lengths)),
        best_a_m=float(free_a[-1]) if free_a.size else math.nan,
        best_b_m=float(free_b[-1]) if free_b.size else math.nan,
        taken_to_blame=region is not None and _clears_without_taken(region, tower_a, tower_b, spacing_m),
    )


def _bare(tower: TowerChoice, spacing_m: float) -> Float:
    """Positions of a tower if none were taken."""
    return free_positions(replace(tower, taken_m=()), spacing_m=spacing_m)


def _clears_without_taken(region: ClearingRegion, tower_a: TowerChoice, tower_b: TowerChoice, spacing_m: float) -> bool:
    """Tell whether the highest positions would clear if none were taken."""
    bare_a, bare_b = _bare(tower_a, spacing_m), _bare(tower_b, spacing_m)
    return bool(bare_a.size and bare_b.size and surplus(region, bare_a[-1], bare_b[-1]) >= -ROUNDING_M)
