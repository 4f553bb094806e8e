"""The pairs of antenna heights that clear a profile: an exact convex region, found without trial.

With t = d/D, a requirement at a point is (1-t)·(g_A + a) + t·(g_B + b) >= c: a half-plane in the heights a and b. The
ray must lie on or above all points (t, c), so the least rays are the edges of their upper convex hull. Each hull point
governs one stretch of the frontier; each hull edge, carried on to both ends, is one corner of it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.checks import check_profile
from profiler.errors import InputError, MissingGroundError
from profiler.geometry import ROUNDING_M, earth_bulge, fresnel_radius
from profiler.models import Rule, frozen_array
from profiler.units import Float

__all__ = [
    "ClearingRegion",
    "Least",
    "clearing_region",
    "least_a_for",
    "least_b_for",
    "least_equal",
    "least_ray",
    "surplus",
]

Index = NDArray[np.intp]


@dataclass(frozen=True, slots=True, eq=False)
class ClearingRegion:
    """All pairs (antenna A, antenna B), in metres above ground, that clear every point under every rule.

    ``least_ray_m`` (n,) is the least height of the ray above the datum at each point, and ``rule`` (n,) the index of
    the rule that asks for it; -1 at an end where the ground itself asks for more than the rules do.
    ``vertices_m`` (v, 2) are the corners of the frontier, from lowest A with highest B to highest A with lowest B.
    ``governing_point`` (v + 1,) are the points whose requirement is each stretch of the frontier: the first lies above
    the first corner (A at its lowest, B without end), the last to the right of the last corner.
    """

    distance_m: Float
    least_ray_m: Float
    rule: Index
    ground_a_m: float
    ground_b_m: float
    vertices_m: Float
    governing_point: Index

    @property
    def lowest_a_m(self) -> float:
        """Lowest antenna A that can clear with some antenna B: what the point at site A asks for."""
        return float(self.least_ray_m[0] - self.ground_a_m)

    @property
    def lowest_b_m(self) -> float:
        """Lowest antenna B that can clear with some antenna A: what the point at site B asks for."""
        return float(self.least_ray_m[-1] - self.ground_b_m)


@dataclass(frozen=True, slots=True)
class Least:
    """A least antenna height, and the point and rule that ask for it."""

    height_m: float
    point: int
    distance_m: float
    rule: int


def least_ray(distance_m: ArrayLike, surface_m: ArrayLike, frequency_hz: float, rules: Sequence[Rule]) -> Float:
    """Least height of the ray above the datum at each point under each rule: surface + bulge(k) + fraction·F1 + margin.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), ascending from 0; the last is B.
    surface_m
        Ground plus cover above the datum, (n,), no gaps.
    frequency_hz
        Frequency, more than 0 Hz.
    rules
        One or more clearance rules.

    Returns
    -------
    ndarray
        (rules, n), metres above the datum.

    Raises
    ------
    InputError
        If the profile is too short, its distances do not ascend from 0, or there is no rule.
    MissingGroundError
        If the surface has a gap.

    Examples
    --------
    >>> rules = [Rule(k=4 / 3, fresnel_fraction=1.0), Rule(k=2 / 3, fresnel_fraction=0.3)]
    >>> least_ray([0, 20e3, 40e3], [10, 10, 10], 6e9, rules).round(1).tolist()
    [[10.0, 55.9, 10.0], [10.0, 63.8, 10.0]]

    Notes
    -----
    The terms are the path clearance criteria of Rec. ITU-R P.530-18 §2.2.
    """
    distance, surface = check_profile(distance_m, surface_m)
    if not rules:
        raise InputError("rules: none given; give at least one rule")
    k, fraction, margin = np.array([(rule.k, rule.fresnel_fraction, rule.margin_m) for rule in rules]).T[:, :, None]
    remaining = distance[-1] - distance
    bulge = earth_bulge(distance, remaining, k)
    return np.asarray(surface + bulge + fraction * fresnel_radius(distance, remaining, frequency_hz) + margin)


def clearing_region(
    distance_m: ArrayLike, least_ray_m: ArrayLike, ground_a_m: float, ground_b_m: float
) -> ClearingRegion:
    """Find the exact region of antenna heights that clear a profile under all rules at once.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), ascending from 0; the last is B.
    least_ray_m
        Least height of the ray above the datum under each rule, (rules, n) or (n,), as `least_ray` gives it; raised
        where ground beside the path asks for more.
    ground_a_m, ground_b_m
        Ground at the two sites above the datum; antenna heights count from there.

    Returns
    -------
    ClearingRegion

    Raises
    ------
    InputError
        If the shapes do not fit, or the distances do not ascend from 0.
    MissingGroundError
        If a requirement is not a finite number.

    Examples
    --------
    One hill 60 m above both sites, halfway: the heights must sum to 120 m, and each antenna stand above its ground.

    >>> region = clearing_region([0, 5e3, 10e3], [100, 160, 100], 100, 100)
    >>> region.vertices_m.tolist()
    [[0.0, 120.0], [120.0, 0.0]]
    >>> region.distance_m[region.governing_point].tolist()
    [0.0, 5000.0, 10000.0]

    Notes
    -----
    The upper convex hull of points ordered by distance is exact up to rounding (monotone chain: Andrew, Information
    Processing Letters 9(5), 1979, from memory). Points on a hull edge within rounding are left out.
    """
    required = np.atleast_2d(np.asarray(least_ray_m, dtype=float))
    rule = required.argmax(axis=0)
    distance, greatest = check_profile(distance_m, required.max(axis=0))
    if not np.isfinite([ground_a_m, ground_b_m]).all():
        raise MissingGroundError(f"ground at the sites = {ground_a_m}, {ground_b_m} m: must be known")
    for end, ground in ((0, ground_a_m), (-1, ground_b_m)):
        if ground > greatest[end]:
            greatest[end], rule[end] = ground, -1
    hull = _upper_hull(distance, greatest)
    x, y = distance[hull], greatest[hull]
    slope = np.diff(y) / np.diff(x)
    at_a, at_b = y[:-1] - slope * x[:-1], y[1:] + slope * (x[-1] - x[1:])
    return ClearingRegion(
        distance_m=frozen_array(distance),
        least_ray_m=frozen_array(greatest),
        rule=frozen_array(rule, np.intp),
        ground_a_m=float(ground_a_m),
        ground_b_m=float(ground_b_m),
        vertices_m=frozen_array(np.column_stack((at_a - ground_a_m, at_b - ground_b_m))),
        governing_point=frozen_array(hull, np.intp),
    )


def surplus(region: ClearingRegion, antenna_a_m: ArrayLike, antenna_b_m: ArrayLike) -> Float:
    """Least surplus of the ray over all points and rules for pairs of antenna heights; 0 or more is clear.

    Parameters
    ----------
    region
        From `clearing_region`.
    antenna_a_m, antenna_b_m
        Heights above ground; they broadcast.

    Returns
    -------
    ndarray
        Metres; negative is how much the ray is short at its worst point.

    Examples
    --------
    >>> region = clearing_region([0, 5e3, 10e3], [100, 160, 100], 100, 100)
    >>> surplus(region, [60.0, 60.0], [60.0, 40.0]).tolist()
    [0.0, -10.0]
    """
    share, required = _hull(region)
    at_a = region.ground_a_m + np.asarray(antenna_a_m, dtype=float)[..., None]
    at_b = region.ground_b_m + np.asarray(antenna_b_m, dtype=float)[..., None]
    return np.asarray(((1.0 - share) * at_a + share * at_b - required).min(axis=-1))


def least_equal(region: ClearingRegion) -> Least:
    """Least height that clears when both antennas stand equally high above their ground.

    Examples
    --------
    >>> region = clearing_region([0, 2.5e3, 10e3], [100, 160, 100], 100, 120)
    >>> least_equal(region)
    Least(height_m=55.0, point=1, distance_m=2500.0, rule=0)
    """
    share, required = _hull(region)
    needed = required - (1.0 - share) * region.ground_a_m - share * region.ground_b_m
    return _least(region, needed)


def least_b_for(region: ClearingRegion, antenna_a_m: ArrayLike) -> Float:
    """Least antenna B for given antennas A, any shape; infinite where A is so low that no B helps.

    Examples
    --------
    >>> region = clearing_region([0, 5e3, 10e3], [110, 160, 100], 100, 100)
    >>> least_b_for(region, [9.0, 10.0, 80.0, 200.0]).tolist()
    [inf, 110.0, 40.0, 0.0]
    """
    share, required = _hull(region)
    at_a = region.ground_a_m + np.asarray(antenna_a_m, dtype=float)[..., None]
    needed = (required[1:] - (1.0 - share[1:]) * at_a) / share[1:] - region.ground_b_m
    return np.where(at_a[..., 0] < region.least_ray_m[0] - ROUNDING_M, np.inf, needed.max(axis=-1))


def least_a_for(region: ClearingRegion, antenna_b_m: ArrayLike) -> Float:
    """Least antenna A for given antennas B, any shape; infinite where B is so low that no A helps.

    Examples
    --------
    >>> region = clearing_region([0, 5e3, 10e3], [110, 160, 100], 100, 100)
    >>> least_a_for(region, [-1.0, 0.0, 110.0]).tolist()
    [inf, 120.0, 10.0]
    """
    share, required = _hull(region)
    at_b = region.ground_b_m + np.asarray(antenna_b_m, dtype=float)[..., None]
    needed = (required[:-1] - share[:-1] * at_b) / (1.0 - share[:-1]) - region.ground_a_m
    return np.where(at_b[..., 0] < region.least_ray_m[-1] - ROUNDING_M, np.inf, needed.max(axis=-1))


def _least(region: ClearingRegion, needed: Float) -> Least:
    """Pack the greatest of what the governing points ask for."""
    point = int(region.governing_point[int(needed.argmax())])
    return Least(float(needed.max()), point, float(region.distance_m[point]), int(region.rule[point]))


def _hull(region: ClearingRegion) -> tuple[Float, Float]:
    """Share of the path from A and least ray of the governing points; no other point can be the tightest."""
    chosen = region.governing_point
    return region.distance_m[chosen] / region.distance_m[-1], region.least_ray_m[chosen]


def _upper_hull(x: Float, y: Float) -> Index:
    """Find the corners of the upper convex hull, x ascending, both ends among them, as indices: the monotone chain."""
    hull: list[int] = []
    along, up = x.tolist(), y.tolist()  # plain numbers: a loop over arrays takes many times as long
    for i in range(len(along)):
        while len(hull) >= 2:
            p, q = hull[-2], hull[-1]
            if (up[q] - up[p]) * (along[i] - along[q]) > (up[i] - up[q]) * (along[q] - along[p]):
                break
            hull.pop()
        hull.append(i)
    return np.array(hull, dtype=np.intp)
