"""What is no straight line in the antenna heights: diffraction loss, fade margin and objective, at any pair of them."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache, partial

from profiler.heights import LimitHeights, heights_within, loss_excess
from profiler.models import Hop
from profiler.remarks import Remark
from profiler.study.link import Link, air_along, link, losses_at
from profiler.study.outage import ModeOutage
from profiler.study.requirements import lower_antennas, spacing_of
from profiler.study.result import Study

__all__ = ["Excess", "LinkLimits", "for_loss", "for_objective", "link_limits", "loss_limit"]

Excess = Callable[[float, float], float]
"""By how many dB antenna heights A and B exceed a limit; 0 or less is good, infinity has no value."""


@dataclass(frozen=True, slots=True)
class LinkLimits:
    """What budget and outage ask of a pair of heights; None where the hop file gives too little, or asks for nothing.

    ``margin`` is the shortage of fade margin against 0 dB, ``objective`` that against the objective. ``unjudged`` says
    why an objective that is set cannot be judged at any height.
    """

    margin: Excess | None
    objective: Excess | None
    unjudged: tuple[Remark, ...] = ()


def link_limits(study: Study) -> LinkLimits:
    """Prepare the judgement of pairs of heights by the budget and the objective, as a study of them would judge.

    Every pair is put through losses, budget and outage once, however often it is asked about.

    Parameters
    ----------
    study
        The study, with or without losses.

    Returns
    -------
    LinkLimits
    """
    hop = study.hop
    if hop.radio is None:
        why = ("the availability objective cannot be judged: the hop file gives no radio",) if hop.has_objective else ()
        return LinkLimits(None, None, why)
    above_m = max(float(study.profile.surface_m.max()), study.centre_a_m, study.centre_b_m)
    cell_m = study.terrain.finest_cell_m
    probe = link(hop, study.profile, study.climate, study.air, above_m, above_m, cell_m=cell_m)
    asked = probe.outage.asked
    with_margin = _margin(probe) is not None
    # the search asks often: only the modes that are judged, and only the k that counts
    judged = {mode.mode for mode in (*probe.outage.modes[:1], *asked)}
    modes = tuple(mode for i, mode in enumerate(hop.radio.modes) if i == 0 or mode.name in judged)
    lean = replace(hop, radio=replace(hop.radio, modes=modes), rules=(min(hop.rules, key=lambda rule: rule.k),))
    at = cache(lambda a, b: _link_at(study, lean, a, b))
    margin = (lambda a, b: _margin_missing_db(at(a, b))) if with_margin else None
    if not hop.has_objective:
        return LinkLimits(margin, None)
    if not asked or probe.outage.unjudged:
        return LinkLimits(margin, None, probe.outage.warnings[-1:] or ("the availability objective cannot be judged",))
    open_for_good = tuple(reason for mode in asked for reason in _reasons_open(mode))
    if open_for_good:
        return LinkLimits(margin, None, tuple(dict.fromkeys(open_for_good)))
    return LinkLimits(margin, lambda a, b: _objective_missing_db(at(a, b)))


def _link_at(study: Study, hop: Hop, antenna_a_m: float, antenna_b_m: float) -> Link | None:
    """Losses, budget and outage of one pair; None where an antenna, or a lower one, stands in its own cover."""
    profile, down_m, median_k = study.profile, spacing_of(hop), study.climate.median_k
    for antenna_m, cover_m in ((antenna_a_m, profile.cover_m[0]), (antenna_b_m, profile.cover_m[-1])):
        if antenna_m - down_m <= cover_m:
            return None
    centres = float(profile.ground_m[0]) + antenna_a_m, float(profile.ground_m[-1]) + antenna_b_m
    raised = replace(
        hop,
        site_a=replace(hop.site_a, antenna_m=antenna_a_m),
        site_b=replace(hop.site_b, antenna_m=antenna_b_m),
    )
    lower = lower_antennas(study.hop, study.lower_regions, antenna_a_m=antenna_a_m, antenna_b_m=antenna_b_m)
    clears = (lower[0].clears, lower[1].clears) if lower else (True, True)
    air = air_along(raised, profile, median_k, *centres)
    cell_m = study.terrain.finest_cell_m
    return link(raised, profile, study.climate, air, *centres, cell_m=cell_m, lower_clears=clears)


def _margin(found: Link) -> float | None:
    """Fade margin of the first mode in the direction that has less, as the study's verdict takes it."""
    return None if found.budget is None else found.budget.weaker()[1].fade_margin_db


def _margin_missing_db(found: Link | None) -> float:
    margin_db = None if found is None else _margin(found)
    return math.inf if margin_db is None else -margin_db


def _objective_missing_db(found: Link | None) -> float:
    """How much fade margin is missing to meet every objective for sure; infinite where no margin would do."""
    return math.inf if found is None else max(map(_missing_db, found.outage.asked), default=math.inf)


def _missing_db(mode: ModeOutage) -> float:
    """How much fade margin one mode lacks to meet its objective for sure; infinite where no margin would do."""
    if mode.objective is None or mode.objective.required_margin_db is None:
        return math.inf
    missing_db = mode.objective.required_margin_db - mode.fade_margin_db
    return missing_db if mode.met is True or missing_db > 0 else math.inf


def _reasons_open(mode: ModeOutage) -> tuple[Remark, ...]:
    """Say what leaves a mode's objective open although its fade margin is the one it takes: no height mends that."""
    objective = mode.objective
    if objective is None or objective.met is not None or objective.required_margin_db is None:
        return ()
    return objective.undecided if mode.fade_margin_db >= objective.required_margin_db else ()


def loss_limit(study: Study) -> Excess | None:
    """Diffraction loss over its limit at the stated k, or None where the hop file sets no limit."""
    limit_db, profile = study.hop.heights.loss_limit_db, study.profile
    if limit_db is None:
        return None
    ground, surface = profile.ground_m, profile.surface_m
    return cache(
        loss_excess(
            partial(_loss_db, study),
            limit_db,
            grounds_m=(float(ground[0]), float(ground[-1])),
            surfaces_m=(float(surface[0]), float(surface[-1])),
        )
    )


def _loss_db(study: Study, centre_a_m: float, centre_b_m: float) -> float:
    k = study.hop.heights.loss_k
    cell_m = study.terrain.finest_cell_m
    return losses_at(study.hop, study.profile, [k], centre_a_m, centre_b_m, cell_m=cell_m)[k].loss_db


def for_loss(study: Study, excess: Excess | None) -> LimitHeights | None:
    """Least heights that keep the diffraction loss at the stated k within its limit; None where there is none."""
    towers = study.hop.heights
    if excess is None:
        return None
    return heights_within(excess, towers.tower_a, towers.tower_b, spacing_m=spacing_of(study.hop))


def for_objective(study: Study, excess: Excess | None) -> LimitHeights | None:
    """Least heights that meet the availability objective; None where there is none to judge."""
    towers, spacing_m = study.hop.heights, spacing_of(study.hop)
    if excess is None:
        return None
    return heights_within(
        excess, towers.tower_a, towers.tower_b, spacing_m=spacing_m, what="shortage of fade margin", unit="dB"
    )
