"""The heights plan of a hop: the exact region that clears, the choice in it, and what loss and objective ask for."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from profiler.geometry import hold_rules
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
    frontier_stretches,
    least_equal,
    least_other,
    lower_rules,
    mounting_sheet,
)
from profiler.models import Rule, TowerChoice
from profiler.plan.cheapest_answer import (
    Answer,
    SurePair,
    asked_chance,
    chance_of_pair,
    draw_regions,
    find_answer,
    sure_pairs,
)
from profiler.plan.link_limits import for_loss, for_objective, link_limits, loss_limit
from profiler.remarks import Length, Note, note
from profiler.study.places import places_at
from profiler.study.reasons import Outcome
from profiler.study.requirements import Requirements, lower_antennas, requirements, spacing_of
from profiler.study.result import Place, Study

if TYPE_CHECKING:
    from profiler.confidence import Chance

__all__ = ["HeightsPlan", "plan_heights"]

_JOIN_M = 100.0


@dataclass(frozen=True, slots=True, eq=False)
class HeightsPlan:
    """Antenna heights for one hop, all above ground.

    ``stretches`` are the frontier within the towers' limits, ``beyond`` what lies above them where nothing under them
    clears, up to somewhat over the least equal heights. ``cheapest`` is the cheapest pair that clears every rule and
    holds the lower antennas of a diversity pair clear; ``answer`` is the one that meets everything else too.
    ``least_a`` and ``least_b`` are the least height at one end with the other as the hop file has it. ``sheet`` is the
    answer's pair, or failing that the cheapest, mounted and re-checked; None where there is no pair. ``for_loss`` and
    ``for_objective`` are None where the hop file sets no such limit, ``diversity`` is empty where it asks for none.
    Where the hop file says how wrong the ground may be, ``cheapest_chance`` is the chance that the merely clearing pair
    has, and ``sure`` the cheapest pairs for chances of 90 and 95 %; else None and empty.
    """

    study: Study
    needs: Requirements
    region: ClearingRegion
    stretches: tuple[Stretch, ...]
    beyond: tuple[Stretch, ...]
    least_equal: Least
    least_a: Least | NoPair
    least_b: Least | NoPair
    cheapest: Choice | NoPair
    cheapest_chance: Chance | None
    answer: Answer
    sheet: MountingSheet | None
    diversity: tuple[DiversityEnd, ...]
    for_loss: LimitHeights | None
    for_objective: LimitHeights | None
    sure: tuple[SurePair, ...]

    @property
    def feasible(self) -> bool:
        """Whether a pair of free positions clears every rule, lower antennas of a diversity pair included."""
        return isinstance(self.cheapest, Choice)

    @property
    def outcome(self) -> Outcome:
        """Whether a hop with the answer's pair passes, as a study of it would say."""
        if isinstance(self.answer.pair, NoPair):
            return "fails"
        doubt, chance = self.study.hop.confidence, self.answer.chance
        too_small = chance is not None and doubt is not None and chance.value < doubt.minimum_chance
        return "not_sure" if too_small or self.answer.unjudged else "passes"

    @property
    def rules(self) -> tuple[Rule, ...]:
        """What ``rule`` counts in stretches, least heights and lowerings: the hop's rules, then the lower antennas'."""
        return self.needs.rules

    @property
    def assumptions(self) -> tuple[Note | str, ...]:
        """What the study assumed, and what was taken of the towers."""
        towers = self.study.hop.heights
        return (*self.study.assumptions, _taken("A", towers.tower_a), _taken("B", towers.tower_b))

    @property
    def spacing_m(self) -> float:
        """Spacing of the diversity pairs; 0 without."""
        return spacing_of(self.study.hop)

    def source(self, point: int, rule: int) -> Place:
        """Describe the place that asks for a height, by its point and its rule (-1: a site's own ground).

        Its surplus and clearance are those that the ray has which it asks for.
        """
        study, needs = self.study, self.needs
        if rule >= 0:
            offset_m, surface_m, cover_m = (
                each[rule, [point]] for each in (needs.offset_m, needs.surface_m, needs.cover_m)
            )
        else:
            ground_m = study.profile.ground_m[[0 if point == 0 else -1]]
            offset_m, surface_m, cover_m = 0.0 * ground_m, ground_m, 0.0 * ground_m
        return places_at(
            needs.distance_m[[point]],
            offset_m,
            surface_m,
            cover_m,
            np.zeros(1),
            profile=study.profile,
            line=study.line,
            frequency_hz=study.hop.frequency_hz,
            rule=needs.rules[rule] if rule >= 0 else None,
        )[0]


def plan_heights(study: Study, *, sure: float | None = None) -> HeightsPlan:
    """Find the antenna heights for a hop that has been studied.

    Parameters
    ----------
    study
        The study; its antenna heights only serve as the fixed end of the one-ended answers, and for the diversity pair
        where no pair clears.
    sure
        Chance of clearing that the answer must have, 0.5 to 0.999. None is the least with which a hop passes, that of
        the hop file's ``[confidence]``; without one the ground is taken as given.

    Returns
    -------
    HeightsPlan

    Raises
    ------
    InputError
        For limits that hold no position at all or far too many, a diversity spacing that is no whole number of steps,
        or a chance without a ``[confidence]`` to draw from.
    """
    hop, profile = study.hop, study.profile
    towers, spacing_m = hop.heights, spacing_of(study.hop)
    needs = requirements(hop, profile, study.surface, study.climate.median_k)
    region = needs.region(profile)
    clearing = cheapest(region, towers.tower_a, towers.tower_b, spacing_m=spacing_m)
    asked, drawn = asked_chance(study, sure), draw_regions(study, region)
    by_link, by_loss = link_limits(study), loss_limit(study)
    limits = {
        "keep a fade margin": by_link.margin,
        "meet the availability objective": by_link.objective,
        f"keep the diffraction loss within {towers.loss_limit_db or 0.0:g} dB": by_loss,
    }
    answer = find_answer(
        study,
        region,
        clearing,
        {words: excess for words, excess in limits.items() if excess is not None},
        unjudged=by_link.unjudged,
        drawn=drawn,
        sure=asked,
    )
    chances = () if study.confidence is None else tuple(each.chance for each in study.confidence.sure)
    pair = answer.pair if isinstance(answer.pair, Choice) else clearing
    stretches = frontier_stretches(
        region, highest_a_m=towers.tower_a.highest_m, highest_b_m=towers.tower_b.highest_m, join_m=_JOIN_M
    )
    equal = least_equal(region)
    above = max(towers.tower_a.highest_m, towers.tower_b.highest_m, 1.25 * equal.height_m)
    return HeightsPlan(
        study=study,
        needs=needs,
        region=region,
        stretches=stretches,
        beyond=() if stretches else frontier_stretches(region, highest_a_m=above, highest_b_m=above, join_m=_JOIN_M),
        least_equal=equal,
        least_a=least_other(region, fixed_b_m=hop.site_b.antenna_m),
        least_b=least_other(region, fixed_a_m=hop.site_a.antenna_m),
        cheapest=clearing,
        cheapest_chance=chance_of_pair(drawn, clearing),
        answer=answer,
        sheet=_sheet(study, pair) if isinstance(pair, Choice) else None,
        diversity=_diversity(study, pair),
        for_loss=for_loss(study, by_loss),
        for_objective=for_objective(study, by_link.objective),
        sure=() if drawn is None else sure_pairs(study, region, clearing, drawn, chances),
    )


def _taken(end: str, tower: TowerChoice) -> Note:
    """Say which positions and costs of a tower were taken; where the hop file is silent, that it is."""
    silent = "the hop file says nothing of it, taken: " if tower == TowerChoice() else ""
    if tower.lowest_m == tower.highest_m:
        words, lengths = "one position at {}", [Length(tower.lowest_m)]
    else:
        words, lengths = (
            "positions from {} to {} every {}",
            [Length(each) for each in (tower.lowest_m, tower.highest_m, tower.step_m)],
        )
    cost = f"cost {tower.cost_per_m:g} a metre"
    if tower.threshold_m is not None:
        cost, lengths = f"{cost} and {tower.threshold_cost:g} more above {{}}", [*lengths, Length(tower.threshold_m)]
    return note("heights", f"tower {end}: {silent}{words}, {cost}", *lengths)


def _sheet(study: Study, pair: Choice) -> MountingSheet | None:
    """Mount a pair of free positions and hold every rule against it, on the path and beside it."""
    hop, profile, spacing_m = study.hop, study.profile, spacing_of(study.hop)
    mounted = mounting_sheet(
        partial(hold_rules, study.surface, frequency_hz=hop.frequency_hz),
        float(profile.ground_m[0]),
        float(profile.ground_m[-1]),
        hop.rules,
        antenna_a_m=pair.antenna_a_m,
        antenna_b_m=pair.antenna_b_m,
        tower_a=hop.heights.tower_a,
        tower_b=hop.heights.tower_b,
        spacing_m=spacing_m,
        lower_rule=lower_rules(hop.heights.diversity_obstruction, study.climate.median_k)[0] if spacing_m else None,
    )
    return mounted if isinstance(mounted, MountingSheet) else None


def _diversity(study: Study, pair: Choice | NoPair) -> tuple[DiversityEnd, ...]:
    """Check the lower antennas of a diversity pair, below the chosen pair where there is one."""
    hop = study.hop
    heights = hop.site_a.antenna_m, hop.site_b.antenna_m
    if isinstance(pair, Choice):
        heights = pair.antenna_a_m, pair.antenna_b_m
    return lower_antennas(
        hop,
        study.lower_regions,
        antenna_a_m=heights[0],
        antenna_b_m=heights[1],
        lowest_m=(hop.heights.tower_a.lowest_m, hop.heights.tower_b.lowest_m),
    )
