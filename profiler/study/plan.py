"""The heights plan of a hop: the exact region that clears, the choice in it, and what loss and objective ask for."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import partial
from typing import Any

import numpy as np

from profiler.geometry import corridor_need
from profiler.heights import (
    Choice,
    ClearingRegion,
    DiversityEnd,
    Least,
    LimitHeights,
    MountingSheet,
    NoPair,
    Stretch,
    cheapest,
    check_diversity,
    clearing_region,
    frontier_stretches,
    heights_for_loss,
    heights_within,
    least_equal,
    least_other,
    least_ray,
    mounting_sheet,
)
from profiler.models import Hop
from profiler.study.document import SCHEMA_HEIGHTS, plain
from profiler.study.link import link, losses_at
from profiler.study.result import Study

__all__ = ["HeightsPlan", "heights_document", "plan_heights"]

_JOIN_M = 100.0


@dataclass(frozen=True, slots=True, eq=False)
class HeightsPlan:
    """Antenna heights for one hop, all above ground.

    ``least_a`` and ``least_b`` are the least height at one end with the other as the hop file has it. ``sheet`` is the
    cheapest pair mounted and re-checked, None where there is no pair. ``for_loss`` and ``for_objective`` are None where
    the hop file sets no such limit. ``diversity`` is empty without a diversity pair.
    """

    study: Study
    region: ClearingRegion
    stretches: tuple[Stretch, ...]
    least_equal: Least
    least_a: Least | NoPair
    least_b: Least | NoPair
    cheapest: Choice | NoPair
    sheet: MountingSheet | None
    diversity: tuple[DiversityEnd, ...]
    for_loss: LimitHeights | None
    for_objective: LimitHeights | None

    @property
    def feasible(self) -> bool:
        """Whether a pair of free positions clears every rule."""
        return isinstance(self.cheapest, Choice)


def plan_heights(study: Study) -> HeightsPlan:
    """Find the antenna heights for a hop that has been studied.

    Parameters
    ----------
    study
        The study; its antenna heights only serve as the fixed end of the one-ended answers and for the diversity pair.

    Returns
    -------
    HeightsPlan

    Raises
    ------
    InputError
        For limits that hold no position at all.
    """
    hop, profile = study.hop, study.profile
    ground_a_m, ground_b_m = float(profile.ground_m[0]), float(profile.ground_m[-1])
    region = clearing_region(profile.distance_m, _least_rays(study), ground_a_m, ground_b_m)
    choice = cheapest(region, hop.heights.tower_a, hop.heights.tower_b)
    path = (profile.distance_m, profile.surface_m, ground_a_m, ground_b_m, hop.frequency_hz)
    sheet = None
    if isinstance(choice, Choice):
        mounted = mounting_sheet(
            *path,
            hop.rules,
            antenna_a_m=choice.antenna_a_m,
            antenna_b_m=choice.antenna_b_m,
            tower_a=hop.heights.tower_a,
            tower_b=hop.heights.tower_b,
        )
        sheet = mounted if isinstance(mounted, MountingSheet) else None
    return HeightsPlan(
        study=study,
        region=region,
        stretches=tuple(
            frontier_stretches(
                region,
                highest_a_m=hop.heights.tower_a.highest_m,
                highest_b_m=hop.heights.tower_b.highest_m,
                join_m=_JOIN_M,
            )
        ),
        least_equal=least_equal(region),
        least_a=least_other(region, fixed_b_m=hop.site_b.antenna_m),
        least_b=least_other(region, fixed_a_m=hop.site_a.antenna_m),
        cheapest=choice,
        sheet=sheet,
        diversity=_diversity(study, path, choice),
        for_loss=_for_loss(study),
        for_objective=_for_objective(study),
    )


def _least_rays(study: Study) -> np.ndarray:
    """Least ray height under each rule, (rules, n), raised where ground beside the path asks for more."""
    hop, profile, corridor = study.hop, study.profile, study.corridor
    rays = least_ray(profile.distance_m, profile.surface_m, hop.frequency_hz, hop.rules)
    if corridor is None:
        return rays
    for row, rule in zip(rays, hop.rules, strict=True):
        beside = (profile.distance_m, corridor.offset_m, corridor.surface_m, hop.frequency_hz)
        np.maximum(row, corridor_need(*beside, rule).least_ray_m, out=row)
    return rays


def _diversity(study: Study, path: tuple[Any, ...], choice: Choice | NoPair) -> tuple[DiversityEnd, ...]:
    """Check the lower antennas of a diversity pair, below the chosen pair where there is one."""
    hop = study.hop
    pair = None if hop.availability is None else hop.availability.diversity
    if pair is None:
        return ()
    heights = (hop.site_a.antenna_m, hop.site_b.antenna_m)
    if isinstance(choice, Choice):
        heights = (choice.antenna_a_m, choice.antenna_b_m)
    return tuple(
        check_diversity(
            *path,
            antenna_a_m=heights[0],
            antenna_b_m=heights[1],
            spacing_m=pair.spacing_m,
            obstruction=hop.heights.diversity_obstruction,
            median_k=study.climate.median_k,
        )
    )


def _for_loss(study: Study) -> LimitHeights | None:
    """Least heights that keep the diffraction loss at the stated k within its limit."""
    hop, profile = study.hop, study.profile
    if hop.heights.loss_limit_db is None:
        return None

    def loss_db(centre_a_m: float, centre_b_m: float) -> float:
        k = hop.heights.loss_k
        return losses_at(hop, profile, [k], centre_a_m, centre_b_m)[k].loss_db

    return heights_for_loss(
        loss_db,
        hop.heights.loss_limit_db,
        grounds_m=(float(profile.ground_m[0]), float(profile.ground_m[-1])),
        surfaces_m=(float(profile.surface_m[0]), float(profile.surface_m[-1])),
        tower_a=hop.heights.tower_a,
        tower_b=hop.heights.tower_b,
    )


def _for_objective(study: Study) -> LimitHeights | None:
    """Least heights that meet the availability objective, through losses, budget and outage at each pair tried."""
    hop = study.hop
    if hop.radio is None or not hop.has_objective:
        return None
    # the search asks hundreds of times: only the mode that is judged, and only the k that counts
    lowest = min(hop.rules, key=lambda rule: rule.k)
    judged = replace(hop, radio=replace(hop.radio, modes=hop.radio.modes[:1]), rules=(lowest,))
    above_m = max(float(study.profile.surface_m.max()), study.centre_a_m, study.centre_b_m)
    if link(judged, study.profile, study.climate, study.air, above_m, above_m).outage.availability is None:
        return None  # no threshold, or no climate to predict from: that is so at any height
    excess = partial(_margin_missing_db, study, judged)
    return heights_within(excess, hop.heights.tower_a, hop.heights.tower_b, what="shortage of fade margin", unit="dB")


def _margin_missing_db(study: Study, hop: Hop, antenna_a_m: float, antenna_b_m: float) -> float:
    """How much fade margin a pair of heights lacks to meet the objective, dB; infinite inside a site's own cover."""
    profile = study.profile
    centres = float(profile.ground_m[0]) + antenna_a_m, float(profile.ground_m[-1]) + antenna_b_m
    if centres[0] < profile.surface_m[0] or centres[1] < profile.surface_m[-1]:
        return math.inf
    found = link(hop, profile, study.climate, study.air, *centres).outage.availability
    if found is None or found.objective is None or found.objective.required_margin_db is None:
        return math.inf
    return found.objective.required_margin_db - found.fade_margin_db


def heights_document(plan: HeightsPlan) -> dict[str, Any]:
    """Give the plan as a dictionary of plain values, under the stable keys of ``hopwright heights --json``.

    Parameters
    ----------
    plan
        The plan.

    Returns
    -------
    dict
        ``least_equal_m``, ``frontier_m``, ``cheapest_m``, ``feasible`` and the rest; a part not asked for is None.
    """
    choice = plan.cheapest
    rules = [{"label": rule.label, **plain(rule)} for rule in plan.study.hop.rules]
    return {
        "schema": SCHEMA_HEIGHTS,
        "hop": plan.study.hop.name,
        "least_equal_m": plan.least_equal.height_m,
        "frontier_m": plain(plan.region.vertices_m),
        "cheapest_m": [choice.antenna_a_m, choice.antenna_b_m] if isinstance(choice, Choice) else None,
        "feasible": plan.feasible,
        "cost": choice.cost if isinstance(choice, Choice) else None,
        "why_not": None if isinstance(choice, Choice) else {**plain(choice), "remedies": list(choice.remedies)},
        "rules": rules,
        "stretches": plain(plan.stretches),
        "least_a_m": plan.least_a.height_m if isinstance(plan.least_a, Least) else None,
        "least_b_m": plan.least_b.height_m if isinstance(plan.least_b, Least) else None,
        "sheet": None if plan.sheet is None else _sheet(plan.sheet),
        "diversity": plain(plan.diversity),
        "for_loss": plain(plan.for_loss),
        "for_objective": plain(plan.for_objective),
        "sure": None if plan.study.confidence is None else plain(plan.study.confidence.sure),
        "assumptions": list(plan.study.assumptions),
        "provenance": plain(plan.study.provenance),
    }


def _sheet(sheet: MountingSheet) -> dict[str, Any]:
    """Give both ends' mounted heights in both unit systems."""
    ends: dict[str, Any] = {}
    for end in (sheet.end_a, sheet.end_b):
        names = ("antenna_m", "ground_m", "centre_m", "antenna_ft", "ground_ft", "centre_ft")
        ends[end.end] = {name: getattr(end, name) for name in names}
    return {**ends, "passes": sheet.passes}
