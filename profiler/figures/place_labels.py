"""The places that a reader must find on the figure: where each rule is tightest, on the path or beside it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from profiler.figures.scale import Scale, position_text
from profiler.units import Float

if TYPE_CHECKING:
    from profiler.study.result import Place, RuleResult, Study

__all__ = [
    "place_words",
    "rule_position",
    "rules_by_surplus",
    "spread",
    "surplus_drawn",
]


def rules_by_surplus(study: Study) -> tuple[RuleResult, ...]:
    """Rules in the order in which figures list them, the governing one first."""
    return tuple(sorted(study.rules, key=lambda result: result.critical.surplus_m))


def rule_position(study: Study, result: RuleResult) -> int:
    """Place of a rule among the rules as the hop file gives them."""
    return next(i for i, each in enumerate(study.rules) if each is result)


def surplus_drawn(result: RuleResult) -> Float:
    """Surplus along the path as drawn: the least over the width of the zone where that was checked."""
    if result.corridor is None:
        return result.check.surplus_m
    return np.minimum(result.check.surplus_m, result.corridor.least_surplus_m)


def place_words(place: Place, scale: Scale) -> str:
    """Where a place is and what stands there, in words."""
    side = f", {scale.height_text(abs(place.offset_m))} {place.side} of the path" if round(place.offset_m) else ""
    stands = f"ground {scale.height_text(place.ground_m)}" + (" (interpolated)" if place.filled else "")
    if place.cover_m > 0:
        stands += f" + cover {scale.height_text(place.cover_m)}"
    position = position_text(place.longitude, place.latitude)
    return f"{scale.distance_text(place.distance_m)} from A{side} ({position}), {stands}"


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
