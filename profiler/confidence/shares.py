"""Split the variance of the least surplus among its causes, fairly where they interact."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import combinations
from math import comb

import numpy as np

from profiler.confidence.fields import Draws

__all__ = ["NO_VARIANCE_M2", "shapley_shares"]

NO_VARIANCE_M2 = 1e-6
"""A variance of the least surplus that is rounding of single precision, not doubt: (1 mm)²."""


def shapley_shares(least: Draws, mixed: Mapping[str, Draws]) -> dict[str, float]:
    """Shapley effects: each cause's share of a result's variance, adding up to 1.

    The value of a set S of causes is what they explain together, v(S) = Var E[Y | S]. A cause's share is the mean, over
    all orders in which the causes could be learned, of what it adds to v. For independent causes that simply add,
    it is the ratio of variances. v is estimated by pick-freeze: in ``mixed[c]`` every draw takes cause c from the next
    draw and the rest from its own. With its own draw it shares all causes but c, with the next draw only c, and half
    the mean squared difference of two results that share S is Var Y - v(S).

    Parameters
    ----------
    least
        The result Y of each draw, (draws,).
    mixed
        For each cause, one to three of them, Y with that cause taken from the next draw, (draws - 1,).

    Returns
    -------
    dict
        Share of each cause; a sampling error of a few percent of the whole is left at 2 000 draws, estimates below 0
        are set to 0. All are 0 if Y does not vary.

    Examples
    --------
    Two independent causes that add, of variances 4 and 1:

    >>> a, b = 2 * np.random.default_rng(1).standard_normal(20001), np.random.default_rng(2).standard_normal(20001)
    >>> shares = shapley_shares(a + b, {"a": a[1:] + b[:-1], "b": a[:-1] + b[1:]})
    >>> round(shares["a"], 1), round(shares["b"], 1)
    (0.8, 0.2)

    Notes
    -----
    Source: Owen, SIAM/ASA Journal on Uncertainty Quantification 2(1), 2014; the estimator of half squared differences
    is Jansen's (Computer Physics Communications 117, 1999); both from memory.
    """
    causes = sorted(mixed)
    result = least.astype(float)
    variance = float(result.var())
    if not causes or variance < NO_VARIANCE_M2:
        return dict.fromkeys(causes, 0.0)
    explained = {frozenset[str](): 0.0, frozenset(causes): variance}
    for cause in causes:
        # with two causes each set is seen twice; either estimate will do
        explained.setdefault(frozenset({cause}), variance - _half_square(mixed[cause], result[1:]))
        explained.setdefault(frozenset(causes) - {cause}, variance - _half_square(mixed[cause], result[:-1]))
    raw = {cause: max(0.0, _mean_gain(cause, causes, explained)) for cause in causes}
    total = sum(raw.values())
    return {cause: value / total for cause, value in raw.items()}


def _half_square(one: Draws, other: np.ndarray) -> float:
    return float(0.5 * np.mean((one - other) ** 2))


def _mean_gain(cause: str, causes: list[str], explained: Mapping[frozenset[str], float]) -> float:
    """Mean of what a cause adds to the explained variance, over the orders of learning."""
    others = [other for other in causes if other != cause]
    gain = 0.0
    for size in range(len(causes)):
        for before in combinations(others, size):
            step = explained[frozenset(before) | {cause}] - explained[frozenset(before)]
            gain += step / (len(causes) * comb(len(causes) - 1, size))
    return gain
