"""Which places along a path are worth measuring, because the verdict hangs on their height."""

from __future__ import annotations

from typing import Literal

import numpy as np

from profiler.confidence.draws import Doubt
from profiler.confidence.fields import Draws
from profiler.confidence.findings import SurveyPlace
from profiler.confidence.shares import NO_VARIANCE_M2
from profiler.confidence.tally import DrawTally
from profiler.units import Float

__all__ = ["rank_points", "survey_places"]

_LEAST_SHARE = 0.02
_CHANCE_SHARE = 20.0
"""Over the number of draws: what the luckiest of 1 000 useless points may reach (a normal score of 4.5, squared)."""

_MOST_PLACES = 5
_MOST_POINTS = 15
_MOST_CANDIDATES = 300

_ONE_PLACE_M = (100.0, 500.0)
"""A crew that measures a point measures what is nearer than this with it: a correlation length, within these limits."""


def survey_places(
    distance_m: Float, doubt: Doubt, tally: DrawTally, *, correlation_m: float
) -> tuple[SurveyPlace, ...]:
    """Choose the places to survey, the most useful first: points that lie within one place of each other are one.

    Points that are critical in some draw, and the ground at the sites, are ranked by `rank_points`; a point within a
    correlation length of the first of a place, but 100 to 500 m, belongs to that place, and its share to the place's.

    Parameters
    ----------
    distance_m
        Points of the path, (n,).
    doubt, tally
        The draws, and what came of them.
    correlation_m
        Practical range of the terrain's error.

    Returns
    -------
    tuple of SurveyPlace
        Five at the most; the ones that remove less than 2 % of the variance, or no more than chance could show, are
        left out.
    """
    last = distance_m.size - 1
    critical = np.bincount(doubt.places.nearest[tally.critical], minlength=distance_m.size) / doubt.draws
    most_often = np.argsort(-critical, kind="stable")[: min(_MOST_CANDIDATES, np.count_nonzero(critical))]
    point = np.union1d(most_often, (0, last))
    error = doubt.surface_error(np.flatnonzero(doubt.places.own)[point])
    reach_m = float(np.clip(correlation_m, *_ONE_PLACE_M))
    members: dict[int, list[tuple[int, float]]] = {}
    for row, share in rank_points(error, tally.all_m):
        index = int(point[row])
        first = next((each for each in members if abs(distance_m[each] - distance_m[index]) <= reach_m), index)
        members.setdefault(first, []).append((index, share))
    places = []
    for first, found in members.items():
        at_m = [float(distance_m[index]) for index, _ in found]
        near = np.abs(distance_m - distance_m[first]) <= reach_m
        places.append(
            SurveyPlace(
                index=first,
                distance_m=float(distance_m[first]),
                from_m=min(at_m),
                to_m=max(at_m),
                site=_site({index for index, _ in found}, last),
                share_of_doubt=sum(share for _, share in found),
                chance_critical=float(critical[near].sum()),
            )
        )
    return tuple(places[:_MOST_PLACES])


def _site(points: set[int], last: int) -> Literal["A", "B"] | None:
    """Name the site whose own ground is among the points, if one is."""
    return "A" if 0 in points else "B" if last in points else None


def rank_points(error_m: Draws, least_m: Draws) -> list[tuple[int, float]]:
    """Choose points to survey, one after the other, by how much of the doubt their height removes.

    Measuring the error u at a point leaves Var(Y)·(1 - corr²(Y, u)) of the variance of the least surplus Y, by the best
    linear estimate. The first point has the greatest corr²; each next one the greatest *further* reduction, given the
    heights of those before it (partial correlation), so that neighbours with the same error are not listed twice.

    Parameters
    ----------
    error_m
        Error of the surface at each point, (n, draws); of the ground at the two ends.
    least_m
        Least surplus of each draw, (draws,).

    Returns
    -------
    list of (int, float)
        Row of the point, and the share of the variance that it removes once those before it are measured.

    Examples
    --------
    >>> u = np.random.default_rng(1).standard_normal((3, 4000), dtype=np.float32)
    >>> [(row, round(share, 1)) for row, share in rank_points(u, 3 * u[1] + u[2])]
    [(1, 0.9), (2, 0.1)]

    Notes
    -----
    The least surplus is not linear in the errors, so the shares are lower bounds of the variance that the measurement
    removes on average. Forward selection by partial correlation is a textbook method (from memory).
    """
    draws = least_m.size
    result = least_m - least_m.mean()
    variance = float(result @ result) / draws
    mean = error_m.mean(axis=1)
    left = np.einsum("ij,ij->i", error_m, error_m).astype(float) / draws - mean.astype(float) ** 2
    if variance < NO_VARIANCE_M2 or not left.max() > 0:
        return []
    shared = (error_m @ result).astype(float) / draws
    floor = 1e-6 * left.max()
    learned: list[Draws] = []
    found: list[tuple[int, float]] = []
    while len(found) < _MOST_POINTS:
        gain = np.where(left > floor, shared**2 / np.maximum(left, floor), 0.0) / variance
        row = int(np.argmax(gain))
        if gain[row] < max(_LEAST_SHARE, _CHANCE_SHARE / draws):
            break
        found.append((row, float(gain[row])))
        fresh = error_m[row] - mean[row]
        for known in learned:
            fresh = fresh - known * (known @ fresh / (known @ known))
        learned.append(fresh)
        spread = float(fresh @ fresh) / draws
        slope = (error_m @ fresh).astype(float) / draws / spread
        shared = shared - slope * (float(fresh @ result) / draws)
        left = left - slope**2 * spread
    return found
