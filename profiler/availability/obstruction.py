"""Obstruction fading: how long the bending of the ray puts more diffraction loss on the path than it has margin."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative
from profiler.errors import InputError
from profiler.units import Float

__all__ = ["obstruction_percent", "unknown_percent"]

_MEDIAN_PERCENT = 50.0


def _statistics(k_percent: ArrayLike, excess_loss_db: ArrayLike) -> tuple[Float, Float]:
    """Both arrays checked, and closed with no excess at the median where they end below it."""
    percent, excess = np.atleast_1d(np.asarray(k_percent, dtype=float), np.asarray(excess_loss_db, dtype=float))
    if percent.ndim != 1 or percent.shape != excess.shape or percent.size == 0:
        raise InputError(
            f"excess_loss_db of shape {excess.shape}: must be one value for each of the {percent.size} k_percent"
        )
    if not (np.diff(percent) > 0).all() or not ((percent > 0) & (percent < 100)).all():
        raise InputError(f"k_percent = {percent.tolist()}: must ascend within 0 to 100 %, ends excluded")
    if not np.isfinite(excess).all():
        raise InputError(f"excess_loss_db = {excess.tolist()}: must be finite dB")
    if percent[-1] < _MEDIAN_PERCENT:
        percent, excess = np.append(percent, _MEDIAN_PERCENT), np.append(excess, 0.0)
    return percent, excess


def obstruction_percent(k_percent: ArrayLike, excess_loss_db: ArrayLike, fade_db: ArrayLike) -> Float:
    """Percent of time that diffraction takes more than the margin, from the statistics of k.

    Between two percentiles of k the loss is taken as linear in the normal quantile of the percentage. Below the lowest
    percentile it counts as the loss there: if that is not blocked the answer is 0, and the truth may be anything up to
    the lowest percentage. Above the highest it counts as the loss there; statistics that end below the median are
    closed with no excess at 50 %, as the loss in the budget holds at the median k.

    Parameters
    ----------
    k_percent
        Percent of time that k is not exceeded, (n,), ascending, between 0 and 100.
    excess_loss_db
        Diffraction loss at each k over what the budget already counts, dB, (n,); negative where k is above the median.
    fade_db
        Fade margin, 0 dB or more, any shape.

    Returns
    -------
    ndarray
        Percent of the period that ``k_percent`` is for, the shape of ``fade_db``.

    Raises
    ------
    InputError
        If the two arrays do not match, the percentages do not ascend between 0 and 100, or a loss is not finite.

    Examples
    --------
    >>> obstruction_percent([0.1, 1.0, 50.0], [40.0, 20.0, 0.0], [10.0, 20.0, 50.0]).round(3).tolist()
    [12.238, 1.0, 0.0]

    Notes
    -----
    The principle, diffraction fading by the variation of the refractivity gradient, is that of Rec. ITU-R P.530-18
    §2.2; the interpolation is this project's own.
    """
    from scipy.special import ndtr, ndtri

    percent, excess = _statistics(k_percent, excess_loss_db)
    margin = not_negative("fade_db", fade_db, "dB")[..., np.newaxis]
    blocked = excess > margin
    first, last = excess[:-1], excess[1:]
    crosses = blocked[..., :-1] != blocked[..., 1:]
    share = np.where(crosses, (first - margin) / np.where(first == last, 1.0, first - last), 0.0)
    quantile = ndtri(percent / 100.0)
    crossing = 100.0 * ndtr(quantile[:-1] + share * np.diff(quantile))
    start = np.where(blocked[..., :-1], percent[:-1], crossing)
    stop = np.where(blocked[..., 1:], percent[1:], crossing)
    within = np.where(blocked[..., :-1] | blocked[..., 1:], stop - start, 0.0).sum(axis=-1)
    tails = blocked[..., 0] * percent[0] + blocked[..., -1] * (100.0 - percent[-1])
    return np.asarray(within + tails)


def unknown_percent(
    k_percent: ArrayLike, excess_loss_db: ArrayLike, fade_db: ArrayLike, *, beyond_db: float | None = None
) -> Float:
    """Percent of time that may be lost below the lowest percentile of k, besides what `obstruction_percent` counts.

    That is the whole of the lowest percentage where the hop is not cut off at its k, as nothing is known of the k below
    it; and nothing where the hop is not cut off at a lower k either, the one that it was designed for.

    Parameters
    ----------
    k_percent, excess_loss_db, fade_db
        As for `obstruction_percent`.
    beyond_db
        Diffraction loss over the budget's at a k below all of the statistics; None if no such k was looked at.

    Returns
    -------
    ndarray
        Percent of the period that ``k_percent`` is for, the shape of ``fade_db``.

    Examples
    --------
    >>> unknown_percent([0.1, 1.0, 50.0], [40.0, 20.0, 0.0], [30.0, 45.0]).tolist()
    [0.0, 0.1]
    >>> unknown_percent([0.1, 1.0, 50.0], [40.0, 20.0, 0.0], [45.0, 60.0], beyond_db=50.0).tolist()
    [0.1, 0.0]

    Notes
    -----
    That a path which is clear at the low k of its rules counts as free of obstruction is how Rec. ITU-R P.530-18 §2.2
    plans antenna heights.
    """
    percent, excess = _statistics(k_percent, excess_loss_db)
    margin = not_negative("fade_db", fade_db, "dB")
    unknown = excess[0] <= margin
    if beyond_db is not None:
        unknown &= beyond_db > margin
    return np.where(unknown, percent[0], 0.0)
