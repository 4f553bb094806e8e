"""The places that a reader must find on the figure: where each rule is tightest, on the path or beside it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from profiler.figures.scale import Scale, position_text
from profiler.units import Float

if TYPE_CHECKING:
    from profiler.study.result import RuleResult, Study

__all__ = [
    "TightPlace",
    "critical_place",
    "numbered_places",
    "place_words",
    "rule_position",
    "rules_by_surplus",
    "spread",
    "surplus_drawn",
]


@dataclass(frozen=True, slots=True)
class TightPlace:
    """Where a rule is tight. ``offset_m`` is 0 on the path, positive to the right of A→B.

    ``surface_m`` is above the datum; ``cover_m`` is None beside the path, where only the surface is known.
    """

    index: int
    distance_m: float
    offset_m: float
    surface_m: float
    cover_m: float | None
    bulge_m: float
    f1_m: float
    required_m: float
    surplus_m: float

    @property
    def clearance_m(self) -> float:
        """Clearance of the ray, metres; negative where the surface stands above the ray."""
        return self.surplus_m + self.required_m


def critical_place(study: Study, result: RuleResult) -> TightPlace:
    """Place of least surplus of a rule, whether it lies on the path or beside it."""
    place = _on_path(study, result, result.check.critical)
    side = result.corridor
    if side is None or side.surplus_m >= place.surplus_m or side.offset_m == 0:
        return place
    check, index = result.check, side.distance_index
    radius = check.rule.fresnel_fraction * float(check.f1_m[index])
    return TightPlace(
        index=index,
        distance_m=float(study.profile.distance_m[index]),
        offset_m=side.offset_m,
        surface_m=side.surface_m,
        cover_m=None,
        bulge_m=float(check.bulge_m[index]),
        f1_m=float(check.f1_m[index]),
        required_m=float(np.sqrt(max(radius**2 - side.offset_m**2, 0.0))) + check.rule.margin_m,
        surplus_m=side.surplus_m,
    )


def _on_path(study: Study, result: RuleResult, index: int) -> TightPlace:
    check, profile = result.check, study.profile
    return TightPlace(
        index=index,
        distance_m=float(profile.distance_m[index]),
        offset_m=0.0,
        surface_m=float(profile.surface_m[index]),
        cover_m=float(profile.cover_m[index]),
        bulge_m=float(check.bulge_m[index]),
        f1_m=float(check.f1_m[index]),
        required_m=float(check.required_m[index]),
        surplus_m=float(check.surplus_m[index]),
    )


def numbered_places(study: Study) -> tuple[TightPlace, ...]:
    """Tight places of the governing rule, the critical one first: what the numbers on the figure count."""
    result = study.governing
    first = critical_place(study, result)
    slack_m = first.surplus_m + max(3.0 * float(result.check.f1_m.max()), 10.0, -first.surplus_m)
    others = [_on_path(study, result, index) for index in result.check.tight if index != first.index]
    others = [each for each in others if each.surplus_m <= slack_m]
    # the place on the path that a critical place beside the path stands next to is not another place
    reach_m = 0.02 * study.line.distance_m if first.offset_m else 0.0
    return (first, *(each for each in others if abs(each.distance_m - first.distance_m) > reach_m))


def rules_by_surplus(study: Study) -> tuple[RuleResult, ...]:
    """Rules in the order in which figures list them, the governing one first."""
    return tuple(sorted(study.rules, key=lambda result: critical_place(study, result).surplus_m))


def rule_position(study: Study, result: RuleResult) -> int:
    """Place of a rule among the rules as the hop file gives them."""
    return next(i for i, each in enumerate(study.rules) if each is result)


def surplus_drawn(result: RuleResult) -> Float:
    """Surplus along the path as drawn: the least over the width of the zone where that was checked."""
    if result.corridor is None:
        return result.check.surplus_m
    return np.minimum(result.check.surplus_m, result.corridor.least_surplus_m)


def place_words(study: Study, place: TightPlace, scale: Scale) -> str:
    """Where a place is and what stands there, in words."""
    spot = study.place(place.index)
    side = f", {scale.height_text(abs(place.offset_m))} to the {'right' if place.offset_m > 0 else 'left'} of the path"
    ground = place.surface_m - (place.cover_m or 0.0)
    if place.cover_m is None:
        stands = f"surface {scale.height_text(place.surface_m)}"
    elif place.cover_m > 0:
        stands = f"ground {scale.height_text(ground)} + cover {scale.height_text(place.cover_m)}"
    else:
        stands = f"ground {scale.height_text(ground)}"
    return (
        f"{scale.distance_text(place.distance_m)} from A{side if place.offset_m else ''} "
        f"({position_text(spot.longitude, spot.latitude)}), {stands}"
    )


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
