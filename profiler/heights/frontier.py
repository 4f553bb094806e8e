"""The frontier of a clearing region, stretch by stretch: what a table lists and a figure draws."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from profiler.checks import not_negative
from profiler.heights.region import ClearingRegion
from profiler.models import frozen_array
from profiler.units import Float

__all__ = ["Stretch", "frontier_stretches"]


@dataclass(frozen=True, slots=True, eq=False)
class Stretch:
    """One stretch of the frontier, governed by one obstacle under one rule.

    ``corners_m`` (c, 2) run along the stretch, A rising and B falling. The obstacle reaches ``from_m`` to ``to_m``
    along the path; ``point`` is the index of the point in it that governs most of the stretch, ``distance_m`` where
    it is and ``least_ray_m`` the height of the ray that it asks for. ``rule`` is an index, -1 for the bare ground of a
    site.
    """

    corners_m: Float
    point: int
    distance_m: float
    least_ray_m: float
    from_m: float
    to_m: float
    rule: int


def frontier_stretches(
    region: ClearingRegion, *, highest_a_m: float = math.inf, highest_b_m: float = math.inf, join_m: float
) -> tuple[Stretch, ...]:
    """List the stretches of the frontier from low A and high B to high A and low B.

    Parameters
    ----------
    region
        From `profiler.heights.clearing_region`.
    highest_a_m, highest_b_m
        Leave out what lies above these heights. Without them the first and the last stretch run to infinity.
    join_m
        Neighbouring points of the frontier under one rule that stand no further apart than this along the path are one
        obstacle; 0 keeps every point apart. A fiftieth of the path makes a table that a person can read.

    Returns
    -------
    tuple of Stretch
        Empty when no pair under the two heights clears.

    Raises
    ------
    InputError
        If ``join_m`` is negative.

    Examples
    --------
    >>> from profiler.heights import clearing_region
    >>> region = clearing_region([0, 2e3, 8e3, 10e3], [100, 160, 160, 100], 100, 100)
    >>> for stretch in frontier_stretches(region, highest_a_m=90, highest_b_m=90, join_m=0):
    ...     print(stretch.distance_m, stretch.corners_m.round(1).tolist())
    2000.0 [[52.5, 90.0], [60.0, 60.0]]
    8000.0 [[60.0, 60.0], [90.0, 52.5]]
    """
    not_negative("join_m", join_m, "m")
    vertices = region.vertices_m
    start = np.array([[vertices[0, 0], max(highest_b_m, vertices[0, 1])]])
    end = np.array([[max(highest_a_m, vertices[-1, 0]), vertices[-1, 1]]])
    line = np.concatenate((start, vertices, end))
    groups: list[list[tuple[int, Float]]] = []
    for index, point in enumerate(region.governing_point):
        piece = _clipped(line[index], line[index + 1], highest_a_m, highest_b_m)
        if piece is None:
            continue
        if groups and _same_obstacle(region, groups[-1][-1][0], int(point), join_m):
            groups[-1].append((int(point), piece))
        else:
            groups.append([(int(point), piece)])
    return tuple(_stretch(region, group) for group in groups)


def _clipped(start: Float, end: Float, highest_a: float, highest_b: float) -> Float | None:
    """Part of one straight piece (A rising, B falling) under both heights, (2, 2), or None when nothing is."""
    if end[1] > highest_b or start[0] > highest_a:
        return None
    if start[1] > highest_b:
        share = (start[1] - highest_b) / (start[1] - end[1])
        start = np.array([start[0] + share * (end[0] - start[0]), highest_b])
        if start[0] > highest_a:
            return None
    if end[0] > highest_a:
        share = (highest_a - start[0]) / (end[0] - start[0])
        end = np.array([highest_a, start[1] + share * (end[1] - start[1])])
    return np.array([start, end])


def _same_obstacle(region: ClearingRegion, left: int, right: int, join_m: float) -> bool:
    near = region.distance_m[right] - region.distance_m[left] <= join_m
    return bool(near and region.rule[left] == region.rule[right])


def _stretch(region: ClearingRegion, group: list[tuple[int, Float]]) -> Stretch:
    """Join the pieces of one obstacle."""
    lengths = [float(np.hypot(*(piece[1] - piece[0]))) for _, piece in group]
    point = group[int(np.argmax(lengths))][0]
    return Stretch(
        corners_m=frozen_array([group[0][1][0], *(piece[1] for _, piece in group)]),
        point=point,
        distance_m=float(region.distance_m[point]),
        least_ray_m=float(region.least_ray_m[point]),
        from_m=float(region.distance_m[group[0][0]]),
        to_m=float(region.distance_m[group[-1][0]]),
        rule=int(region.rule[point]),
    )
