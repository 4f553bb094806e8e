"""Numbers beside a drawing, moved apart where they stand close, and which rule of the hop file is which."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from profiler.study.result import RuleResult, Study

__all__ = ["rule_position", "spread"]


def rule_position(study: Study, result: RuleResult) -> int:
    """Place of a rule among the rules as the hop file gives them."""
    return next(i for i, each in enumerate(study.rules) if each is result)


def spread(at: list[float], apart: float, low: float, high: float) -> list[float]:
    """Move places apart along a line so that none stands closer than ``apart``, each as little as need be.

    With i·apart taken from the i-th place, places in order must not descend: that is isotonic regression, which joins
    neighbours that would into groups at their mean (from memory of the pool-adjacent-violators algorithm).

    Examples
    --------
    >>> [round(x, 2) for x in spread([1.0, 1.02, 3.0], 0.2, 0.0, 4.0)]
    [0.91, 1.11, 3.0]
    """
    order = [int(i) for i in np.argsort(at, kind="stable")]
    groups: list[list[float]] = []
    for rank, i in enumerate(order):
        groups.append([at[i] - rank * apart])
        while len(groups) > 1 and _mean(groups[-2]) > _mean(groups[-1]):
            last = groups.pop()
            groups[-1] += last
    level = [_mean(group) for group in groups for _ in group]
    moved = [0.0] * len(at)
    for rank, i in enumerate(order):
        moved[i] = min(max(level[rank], low), high - (len(at) - 1) * apart) + rank * apart
    return moved


def _mean(values: list[float]) -> float:
    return sum(values) / len(values)
