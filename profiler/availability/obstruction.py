"""Obstruction fading: how long the bending of the ray puts more diffraction loss on the path than it has margin."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative
from profiler.errors import InputError
from profiler.models import frozen_array
from profiler.remarks import Remark
from profiler.units import Float

__all__ = ["KStatistics", "k_statistics", "obstruction_percent", "unknown_percent"]

_MEDIAN_PERCENT = 50.0

_SCORE_STEP = 0.1
"""Step of the normal score at which losses are looked at: halving it moves an outage by less than 1 % of itself."""


@dataclass(frozen=True, slots=True, eq=False)
class KStatistics:
    """Diffraction loss by the percent of the time, closely enough that a straight line between two entries will do.

    ``percent`` is the time that k is not exceeded, ascending within 0 to 100, ``excess_db`` the loss at that k over
    what the budget counts (negative where k is above the median), both (n,).
    """

    percent: Float
    excess_db: Float
    assumptions: tuple[Remark, ...] = ()

    def __post_init__(self) -> None:
        for name in ("percent", "excess_db"):
            object.__setattr__(self, name, frozen_array(np.atleast_1d(np.asarray(getattr(self, name), dtype=float))))
        percent, excess = self.percent, self.excess_db
        if percent.ndim != 1 or percent.shape != excess.shape or percent.size == 0:
            raise InputError(f"excess_db of shape {excess.shape}: must be one value for each of {percent.size} percent")
        if not (np.diff(percent) > 0).all() or not ((percent > 0) & (percent < 100)).all():
            raise InputError(f"percent = {percent.tolist()}: must ascend within 0 to 100 %, ends excluded")
        if not np.isfinite(excess).all():
            raise InputError(f"excess_db = {excess.tolist()}: must be finite dB")


def k_statistics(
    k_percentiles: Sequence[tuple[float, float]], median_k: float, excess_at: Callable[[Float], Float]
) -> KStatistics | None:
    """Diffraction loss by the percent of the time, at the k of the percentiles and at many between them.

    Between two percentiles 1/k, which is linear in the refractivity gradient, runs linearly with the normal score of
    the percentage; the loss is that of the k there. Percentiles that end below 50 % are closed by the median k.

    Parameters
    ----------
    k_percentiles
        (percent of the time that k is not exceeded, k) pairs, ascending; may be empty.
    median_k
        k at 50 %, above 0.
    excess_at
        Diffraction loss at each of an array of k over that of the budget, dB.

    Returns
    -------
    KStatistics or None
        None where there are no percentiles.

    Examples
    --------
    >>> found = k_statistics([(0.1, 0.5), (50.0, 4 / 3)], 4 / 3, lambda k: 40.0 * (1.0 / k - 0.75))
    >>> found.percent[0].item(), found.excess_db[[0, -1]].round(6).tolist()
    (0.1, [50.0, 0.0])

    Notes
    -----
    The same spread of k as in the confidence analysis. The distribution between percentiles is this project's own.
    """
    from scipy.special import ndtr, ndtri

    if not k_percentiles:
        return None
    percent, k = np.array(k_percentiles, dtype=float).T
    assumptions: tuple[Remark, ...] = ()
    if percent[-1] < _MEDIAN_PERCENT:
        closing = max(median_k, float(k[-1]))
        percent, k = np.append(percent, _MEDIAN_PERCENT), np.append(k, closing)
        assumptions = (f"obstruction fading: the k given end below 50 %; there k = {closing:.4g}, the median",)
    score = ndtri(percent / 100.0)
    if not np.isfinite(score).all():
        raise InputError(
            f"k_percentiles = {percent.tolist()} %: must be percentages that the normal distribution knows"
        )
    pieces = np.ceil(np.diff(score) / _SCORE_STEP).astype(int)
    knots = np.append(0, pieces.cumsum())
    fine = np.interp(np.arange(knots[-1] + 1), knots, score)
    fine_percent = 100.0 * ndtr(fine)
    fine_percent[knots] = percent
    return KStatistics(fine_percent, excess_at(1.0 / np.interp(fine, score, 1.0 / k)), assumptions)


def obstruction_percent(statistics: KStatistics, fade_db: ArrayLike) -> Float:
    """Percent of time that diffraction takes more than the margin, from the statistics of k.

    Between two entries the loss is taken as linear in the normal score of the percentage. Below the lowest percentage
    it counts as the loss there: if that is not blocked the answer is 0, and the truth may be anything up to the lowest
    percentage. Above the highest it counts as the loss there.

    Parameters
    ----------
    statistics
        Loss by percent of the time.
    fade_db
        Fade margin, 0 dB or more, any shape.

    Returns
    -------
    ndarray
        Percent of the period that the statistics are for, the shape of ``fade_db``.

    Examples
    --------
    >>> statistics = KStatistics([0.1, 1.0, 50.0], [40.0, 20.0, 0.0])
    >>> obstruction_percent(statistics, [10.0, 20.0, 50.0]).round(3).tolist()
    [12.238, 1.0, 0.0]

    Notes
    -----
    The principle, diffraction fading by the variation of the refractivity gradient, is that of Rec. ITU-R P.530-18
    §2.2; the interpolation is this project's own.
    """
    from scipy.special import ndtr, ndtri

    percent, excess = statistics.percent, statistics.excess_db
    margin = not_negative("fade_db", fade_db, "dB")[..., np.newaxis]
    blocked = excess > margin
    first, last = excess[:-1], excess[1:]
    crosses = blocked[..., :-1] != blocked[..., 1:]
    share = np.where(crosses, (first - margin) / np.where(first == last, 1.0, first - last), 0.0)
    score = ndtri(percent / 100.0)
    crossing = 100.0 * ndtr(score[:-1] + share * np.diff(score))
    start = np.where(blocked[..., :-1], percent[:-1], crossing)
    stop = np.where(blocked[..., 1:], percent[1:], crossing)
    within = np.where(blocked[..., :-1] | blocked[..., 1:], stop - start, 0.0).sum(axis=-1)
    tails = blocked[..., 0] * percent[0] + blocked[..., -1] * (100.0 - percent[-1])
    return np.asarray(within + tails)


def unknown_percent(statistics: KStatistics, fade_db: ArrayLike, *, beyond_db: float | None = None) -> Float:
    """Percent of time that may be lost below the lowest percentile of k, besides what `obstruction_percent` counts.

    That is the whole of the lowest percentage where the hop is not cut off at its k, as nothing is known of the k below
    it; and nothing where the hop is not cut off at a lower k either, the one that it was designed for.

    Parameters
    ----------
    statistics, fade_db
        As for `obstruction_percent`.
    beyond_db
        Diffraction loss over the budget's at a k below all of the statistics; None if no such k was looked at.

    Returns
    -------
    ndarray
        Percent of the period that the statistics are for, the shape of ``fade_db``.

    Examples
    --------
    >>> statistics = KStatistics([0.1, 1.0, 50.0], [40.0, 20.0, 0.0])
    >>> unknown_percent(statistics, [30.0, 45.0]).tolist()
    [0.0, 0.1]
    >>> unknown_percent(statistics, [45.0, 60.0], beyond_db=50.0).tolist()
    [0.1, 0.0]

    Notes
    -----
    That a path which is clear at the low k of its rules counts as free of obstruction is how Rec. ITU-R P.530-18 §2.2
    plans antenna heights.
    """
    margin = not_negative("fade_db", fade_db, "dB")
    unknown = statistics.excess_db[0] <= margin
    if beyond_db is not None:
        unknown &= beyond_db > margin
    return np.where(unknown, statistics.percent[0], 0.0)
