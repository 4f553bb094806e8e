"""Whether a hop passes, and the one sentence that says why; what a reader must be warned of."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from profiler.models import Hop
from profiler.study.result import Place, RuleResult, TerrainUse, Verdict
from profiler.units import FOOT_M, STATUTE_MILE_M

if TYPE_CHECKING:
    from profiler.budget import Budget

__all__ = ["ground_warnings", "judge"]

_COARSE_CELL_M = 100.0
_LARGE_DIFFERENCE_M = 10.0


def judge(hop: Hop, rules: Sequence[RuleResult], budget: Budget | None, meets_objective: bool | None) -> Verdict:
    """Say whether the hop passes: every rule met, a fade margin where one is known, the objective met where one is set.

    Parameters
    ----------
    hop
        The hop.
    rules
        Every rule held against the ground.
    budget
        The link budget, or None.
    meets_objective
        Whether the objective is met; None where there is none, or where it cannot be told.

    Returns
    -------
    Verdict
    """
    clears = all(result.passes for result in rules)
    margin_db = None if budget is None else budget.weaker()[1].fade_margin_db
    works = None if margin_db is None else margin_db >= 0.0
    return Verdict(
        passes=clears and works is not False and (meets_objective is True or not hop.has_objective),
        clears=clears,
        has_margin=works,
        meets_objective=meets_objective,
        headline=_headline(hop, rules, margin_db, meets_objective, feet=False),
        headline_feet=_headline(hop, rules, margin_db, meets_objective, feet=True),
    )


def _headline(
    hop: Hop, rules: Sequence[RuleResult], margin_db: float | None, meets_objective: bool | None, *, feet: bool
) -> str:
    """Say in one sentence by how much, where and under which rule the hop clears or fails, and what else it lacks."""
    metre, unit = (FOOT_M, "ft") if feet else (1.0, "m")
    worst = min(rules, key=lambda result: result.critical.surplus_m)
    place, rule = worst.critical, worst.check.rule
    surplus = place.surplus_m / metre
    clearance = (
        f"clears, {surplus:.1f} {unit} to spare" if worst.passes else f"does not clear, {-surplus:.1f} {unit} short"
    )
    asks = f"{rule.fresnel_fraction:g} F1" + (f" + {rule.margin_m / metre:.1f} {unit}" if rule.margin_m else "")
    parts = [f"{clearance} {_where(hop, place, feet=feet)} (rule {asks} at k = {rule.k:.2f})"]
    if margin_db is not None and margin_db < 0.0:
        parts.append(f"no fade margin ({margin_db:.1f} dB)")
    if hop.has_objective:
        judged = {True: "meets", False: "misses", None: "cannot be held against"}[meets_objective]
        parts.append(f"{judged} the availability objective")
    return "; ".join(parts)


def _where(hop: Hop, place: Place, *, feet: bool) -> str:
    """Say where a place is, and if its ground is no measurement."""
    metre, unit, far_m, far = (FOOT_M, "ft", STATUTE_MILE_M, "mi") if feet else (1.0, "m", 1000.0, "km")
    aside_by = round(abs(place.offset_m) / metre)
    aside = f", {aside_by} {unit} {place.side} of the path" if aside_by else ""
    invented = ", where the ground is interpolated" if place.filled else ""
    return f"{place.distance_m / far_m:.2f} {far} from {hop.site_a.name}{aside}{invented}"


def ground_warnings(hop: Hop, terrain: TerrainUse, rules: Sequence[RuleResult]) -> tuple[str, ...]:
    """Warn of ground that is coarse, interpolated, far from a survey, or not seen.

    Parameters
    ----------
    hop
        The hop.
    terrain
        The terrain as it was used.
    rules
        Every rule held against it.

    Returns
    -------
    tuple of str
    """
    found = []
    if terrain.filled_points:
        found.append(
            f"ground is interpolated at {terrain.filled_points} points, {terrain.filled_share:.0%} of the path: what"
            " stands there is unknown"
        )
    if terrain.finest_cell_m > _COARSE_CELL_M:
        found.append(
            f"the finest terrain has cells of {terrain.finest_cell_m:.0f} m: hills narrower than that are not in it"
        )
    differences = ((hop.site_a, terrain.surveyed_difference_a_m), (hop.site_b, terrain.surveyed_difference_b_m))
    for site, difference_m in differences:
        if difference_m is not None and abs(difference_m) > _LARGE_DIFFERENCE_M:
            found.append(
                f"the surveyed ground at {site.name} is {abs(difference_m):.1f} m"
                f" {'above' if difference_m > 0 else 'below'} the terrain: check the survey, the position and the datum"
            )
    unseen = max((rule.corridor.need.missing_share for rule in rules if rule.corridor is not None), default=0.0)
    if unseen:
        found.append(f"beside the path {unseen:.1%} of the points in the zone have no height and were not checked")
    return tuple(found)
