"""What would have to change where no pair of heights does: only what can be built within the towers' limits."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.study.next_step import CoverCut, FreePositions, GoElsewhere, LowerCover, Step

if TYPE_CHECKING:
    from profiler.heights import Lowering, NoPair
    from profiler.plan.compose import HeightsPlan

__all__ = ["remedies"]


def remedies(plan: HeightsPlan, found: NoPair) -> tuple[Step, ...]:
    """Give the ways out of having no pair; any one of them does.

    Cover is lowered only where cover is what stands in the way. No antenna is raised: no pair does, so the highest
    position that each tower offers is already too low.

    Parameters
    ----------
    plan, found
        The plan, and why it has no pair.

    Returns
    -------
    tuple
        A relay, another site or another band where nothing else helps.
    """
    lower = [(plan.source(each.point, each.rule), each) for each in found.lower]
    steps: list[Step] = []
    if lower and all(place.cover_m >= each.by_m for place, each in lower):
        steps.append(LowerCover(tuple(CoverCut(place.distance_m, place.offset_m, each.by_m) for place, each in lower)))
    if found.taken_to_blame:
        steps.append(FreePositions())
    return tuple(steps) or (
        GoElsewhere(band=bool(found.lower) and all(_only_the_zone(plan, each) for each in found.lower)),
    )


def _only_the_zone(plan: HeightsPlan, place: Lowering) -> bool:
    """Whether what is short at a place is less than the part of the zone that its rule asks for: the ray is free."""
    if not 0 <= place.rule < len(plan.study.rules):
        return False
    check = plan.study.rules[place.rule].check
    return place.by_m < check.rule.fresnel_fraction * plan.source(place.point, place.rule).f1_m
