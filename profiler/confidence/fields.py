"""Random draws: a correlated Gaussian error along a path, and k by its percentiles.

Draws are float32 and lie along the last axis, so that a point's draws are contiguous: rows (n, draws).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.errors import InputError
from profiler.units import Float

__all__ = ["Covariance", "Draws", "correlation", "draw_field", "draw_inverse_k"]

Covariance = Literal["exponential", "gaussian"]
Draws = NDArray[np.float32]

_DECAY = 3.0
"""exp(-3) = 5 %: what is left of the correlation at the practical range."""

_NODE_STEP = 0.6
"""Step of the white noise under the Gaussian kernel, in kernel lengths: ripple of the covariance 2e-6."""

_KERNEL_REACH = 3.0
"""Kernel lengths after which the kernel (1e-4 of its peak) is cut off."""


def correlation(lag_m: ArrayLike, correlation_m: float, covariance: Covariance = "exponential") -> Float:
    """Correlation of the error at two points: exp(-3h/r) (exponential) or exp(-3h²/r²) (gaussian).

    Parameters
    ----------
    lag_m
        Distance h between the points, 0 m or more.
    correlation_m
        Practical range r, 0 m or more; 0 is no correlation, infinity is full correlation.
    covariance
        The model.

    Examples
    --------
    >>> correlation([0.0, 100.0], 100.0).round(3).tolist()
    [1.0, 0.05]

    Notes
    -----
    The exponential and Gaussian models with a practical range are the usual ones of geostatistics (Oksanen and
    Sarjakoski, Computers & Geosciences 31(8), 2005; the 5 % convention from memory).
    """
    lag = np.asarray(lag_m, dtype=float)
    if correlation_m == 0:
        return np.where(lag == 0, 1.0, 0.0)
    share = lag / correlation_m
    return np.asarray(np.exp(-_DECAY * (share if covariance == "exponential" else share**2)))


def draw_field(
    distance_m: ArrayLike, correlation_m: float, covariance: Covariance, draws: int, rng: np.random.Generator
) -> Draws:
    """Draw a stationary Gaussian field of mean 0 and variance 1 at points along a line.

    The exponential model is Markov, so each point follows exactly from the one before: e = ρ·e' + sqrt(1 - ρ²)·z. The
    Gaussian model is white noise on a fine grid under a Gaussian kernel, each point scaled to variance 1.

    Parameters
    ----------
    distance_m
        Points, (n,), ascending, at any spacing.
    correlation_m
        Practical range, as in `correlation`.
    covariance
        ``"exponential"`` or ``"gaussian"``.
    draws
        How many, 1 or more.
    rng
        Source of randomness.

    Returns
    -------
    ndarray
        float32, (n, draws).

    Examples
    --------
    >>> field = draw_field([0.0, 50.0, 500.0], 100.0, "gaussian", 4000, np.random.default_rng(1))
    >>> round(float(np.corrcoef(field[0], field[1])[0, 1]), 1)  # exp(-3/4) = 0.47
    0.5

    Notes
    -----
    Source: Gauss-Markov (Ornstein-Uhlenbeck) process and process convolution, textbook results (from memory).
    """
    distance = np.asarray(distance_m, dtype=float)
    if correlation_m == np.inf:
        return np.repeat(rng.standard_normal((1, draws), dtype=np.float32), distance.size, axis=0)
    if correlation_m > 0 and covariance == "gaussian":
        return _kernel_field(distance, correlation_m, draws, rng)
    field = rng.standard_normal((distance.size, draws), dtype=np.float32)
    if correlation_m > 0:
        decay = _DECAY * np.diff(distance) / correlation_m
        kept, fresh = np.exp(-decay).astype(np.float32), np.sqrt(-np.expm1(-2.0 * decay)).astype(np.float32)
        for i in range(1, distance.size):
            field[i] *= fresh[i - 1]
            field[i] += kept[i - 1] * field[i - 1]
    return field


def _kernel_field(distance: Float, correlation_m: float, draws: int, rng: np.random.Generator) -> Draws:
    """White noise under the kernel exp(-x²/L²), whose autocorrelation is exp(-x²/(2L²)): L = r/sqrt(6).

    Only the nodes within reach of the next point are held, so a short range on a long path costs no more.
    """
    length = correlation_m / np.sqrt(2.0 * _DECAY)
    position = distance / (length * _NODE_STEP)
    reach = int(np.ceil(_KERNEL_REACH / _NODE_STEP))
    first = np.floor(position).astype(np.int64) - reach
    width = 2 * reach + 2
    offset = position[:, None] - (first[:, None] + np.arange(width))
    weight = np.exp(-((offset * _NODE_STEP) ** 2))
    weight = (weight / np.linalg.norm(weight, axis=1, keepdims=True)).astype(np.float32)
    noise = rng.standard_normal((width, draws), dtype=np.float32)
    field = np.empty((distance.size, draws), dtype=np.float32)
    for i in range(distance.size):
        step = width if i == 0 else min(width, int(first[i] - first[i - 1]))
        if i and step:
            noise = np.concatenate((noise[step:], rng.standard_normal((step, draws), dtype=np.float32)))
        np.matmul(weight[i], noise, out=field[i])
    return field


def draw_inverse_k(k_percentiles: Sequence[tuple[float, float]], draws: int, rng: np.random.Generator) -> Draws:
    """Draw 1/k from percentiles of k: a value for the whole path at a random moment.

    1/k is linear in the refractivity gradient. Between the pairs it runs linearly with the normal score of the
    percentage, so that three pairs of a Gaussian gradient give that Gaussian. Beyond the outermost pairs k is held.

    Parameters
    ----------
    k_percentiles
        (percent of the time that k is not exceeded, k) pairs, two or more, both ascending; percent above 0 and below
        100, k above 0.
    draws
        How many.
    rng
        Source of randomness.

    Returns
    -------
    ndarray
        1/k, float32, (draws,).

    Raises
    ------
    InputError
        For fewer than two pairs, or pairs out of order or range.

    Examples
    --------
    >>> inverse = draw_inverse_k([(1, 0.8), (50, 4 / 3), (99, 4.0)], 9999, np.random.default_rng(1))
    >>> round(float(np.median(inverse)), 2), round(float(inverse.max()), 2)
    (0.75, 1.25)
    """
    from scipy.special import ndtri

    pairs = np.asarray(k_percentiles, dtype=float)
    if pairs.ndim != 2 or pairs.shape[0] < 2 or pairs.shape[1] != 2:
        raise InputError(f"k_percentiles = {k_percentiles!r}: must be two or more pairs (percent not exceeded, k)")
    percent, k = pairs.T
    if not (np.all(np.diff(percent) > 0) and percent[0] > 0 and percent[-1] < 100):
        raise InputError(f"k_percentiles: percent = {percent.tolist()}: must ascend, above 0 and below 100")
    if not (np.all(np.diff(k) >= 0) and k[0] > 0):
        raise InputError(f"k_percentiles: k = {k.tolist()}: must be above 0 and not fall as the percentage rises")
    score = rng.standard_normal(draws)
    inverse_k: Draws = np.interp(score, ndtri(percent / 100.0), 1.0 / k).astype(np.float32)
    return inverse_k
