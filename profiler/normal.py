"""The Gaussian tail and its inverse, from the standard library.

SciPy's are as exact, but loading them takes longer than studying a hop.
"""

from __future__ import annotations

import math
from statistics import NormalDist

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.units import Float

__all__ = ["normal_quantile", "normal_tail"]

_erfc = np.frompyfunc(math.erfc, 1, 1)
_inverse_cdf = np.frompyfunc(NormalDist().inv_cdf, 1, 1)


def normal_tail(score: ArrayLike) -> Float:
    """Probability that a standard Gaussian number is above a score: Q(x) = erfc(x/√2)/2.

    Parameters
    ----------
    score
        Any shape.

    Returns
    -------
    ndarray
        0 to 1, the shape of ``score``.

    Examples
    --------
    >>> normal_tail([-np.inf, 0.0, 1.0]).round(6).tolist()
    [1.0, 0.5, 0.158655]

    Notes
    -----
    The C library's erfc, to its last digits. NIST Digital Library of Mathematical Functions, §7.18(iv).
    """
    return np.asarray(0.5 * np.asarray(_erfc(np.asarray(score, dtype=float) / math.sqrt(2.0)), dtype=float))


def normal_quantile(probability: ArrayLike) -> Float:
    """Score that a standard Gaussian number stays below with a given probability.

    Parameters
    ----------
    probability
        Above 0 and below 1, any shape.

    Returns
    -------
    ndarray
        The shape of ``probability``.

    Raises
    ------
    InputError
        For a probability outside the range.

    Examples
    --------
    >>> normal_quantile([0.05, 0.5]).round(6).tolist()
    [-1.644854, 0.0]
    >>> normal_quantile(1.0)
    Traceback (most recent call last):
    ...
    profiler.errors.InputError: probability = 1.0: must be above 0 and below 1

    Notes
    -----
    Wichura's algorithm AS 241 (Applied Statistics 37, 1988), 16 digits, as Python's `statistics` has it.
    """
    given = np.asarray(probability, dtype=float)
    outside = ~((given > 0) & (given < 1))
    if outside.any():
        raise InputError(f"probability = {given[outside].flat[0]}: must be above 0 and below 1")
    return np.asarray(_inverse_cdf(given), dtype=float)
