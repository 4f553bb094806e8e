"""Which points along a path are worth measuring, because the verdict hangs on their height."""

from __future__ import annotations

import numpy as np

from profiler.confidence.fields import Draws
from profiler.confidence.findings import SurveyPoint
from profiler.confidence.shares import NO_VARIANCE_M2
from profiler.units import Float

__all__ = ["rank_points"]

_LEAST_SHARE = 0.02
_CHANCE_SHARE = 20.0
"""Over the number of draws: what the luckiest of 1 000 useless points may reach (a normal score of 4.5, squared)."""


def rank_points(
    distance_m: Float, error_m: Draws, least_m: Draws, chance_critical: Float, *, reach_m: float, places: int = 5
) -> tuple[SurveyPoint, ...]:
    """Choose points to survey, one after the other, by how much of the doubt their height removes.

    Measuring the error u at a point leaves Var(Y)·(1 - corr²(Y, u)) of the variance of the least surplus Y, by the best
    linear estimate. The first point has the greatest corr²; each next one the greatest *further* reduction, given the
    heights of those before it (partial correlation), so that neighbours with the same error are not listed twice.

    Parameters
    ----------
    distance_m
        Points of the path, (n,).
    error_m
        Error of the surface at each point, (n, draws); of the ground at the two ends.
    least_m
        Least surplus of each draw, (draws,).
    chance_critical
        Share of the draws in which a point is critical, (n,).
    reach_m
        How far from a point a critical point still counts as this place, metres.
    places
        The most points to list.

    Returns
    -------
    tuple of SurveyPoint
        The most useful first; those that remove less than 2 % of the variance, or no more than
        chance could show, are left out.

    Examples
    --------
    >>> u = np.random.default_rng(1).standard_normal((3, 4000), dtype=np.float32)
    >>> points = rank_points(np.array([0.0, 50.0, 100.0]), u, 3 * u[1] + u[2], np.array([0, 1, 0]), reach_m=10.0)
    >>> [(point.index, round(point.share_of_doubt, 1)) for point in points]
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
        return ()
    shared = (error_m @ result).astype(float) / draws
    floor = 1e-6 * left.max()
    learned: list[Draws] = []
    found: list[SurveyPoint] = []
    while len(found) < places:
        gain = np.where(left > floor, shared**2 / np.maximum(left, floor), 0.0) / variance
        index = int(np.argmax(gain))
        if gain[index] < max(_LEAST_SHARE, _CHANCE_SHARE / draws):
            break
        near = np.abs(distance_m - distance_m[index]) <= reach_m
        found.append(
            SurveyPoint(index, float(distance_m[index]), float(gain[index]), float(chance_critical[near].sum()))
        )
        fresh = error_m[index] - mean[index]
        for known in learned:
            fresh = fresh - known * (known @ fresh / (known @ known))
        learned.append(fresh)
        spread = float(fresh @ fresh) / draws
        slope = (error_m @ fresh).astype(float) / draws / spread
        shared = shared - slope * (float(fresh @ result) / draws)
        left = left - slope**2 * spread
    return tuple(found)
