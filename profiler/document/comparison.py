"""Hops or variants of one hop side by side: what decides between them, as plain values."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from profiler.document.plain_values import plain
from profiler.heights import Choice
from profiler.plan import HeightsPlan
from profiler.study import Study

__all__ = ["Side", "comparison_document"]

_SCHEMA = "hopwright-compare/1"


@dataclass(frozen=True, slots=True, eq=False)
class Side:
    """One of the hops that stand side by side: what it is called here, its study and its heights plan."""

    title: str
    study: Study
    plan: HeightsPlan

    @property
    def pair(self) -> Choice | None:
        """The cheapest pair of heights that does all that is asked."""
        return self.plan.answer.pair if isinstance(self.plan.answer.pair, Choice) else None

    @property
    def margin_db(self) -> float | None:
        """Fade margin of the weaker direction."""
        budget = self.study.budget
        return None if budget is None else budget.weaker()[1].fade_margin_db

    @property
    def year_minutes(self) -> float | None:
        """Outage of the year, by propagation alone."""
        outage = self.study.outage.availability
        return None if outage is None else outage.year_minutes


def comparison_document(sides: tuple[Side, ...]) -> dict[str, Any]:
    """Give the comparison as a dictionary of plain values, for ``hopwright compare --json``.

    Parameters
    ----------
    sides
        What stands side by side, in order.

    Returns
    -------
    dict
        ``schema`` and ``variants``; what a hop gives no data for is None.
    """
    return {"schema": _SCHEMA, "variants": [_variant(side) for side in sides]}


def _variant(side: Side) -> dict[str, Any]:
    study, plan, place = side.study, side.plan, side.study.governing.critical
    verdict, pair = study.verdict, side.pair
    return {
        "title": side.title,
        "hop": study.hop.name,
        "source": study.hop.source,
        "overrides": plain(study.hop.overrides),
        "outcome": verdict.outcome,
        "chance": None if verdict.chance is None else verdict.chance.value,
        "surplus_m": place.surplus_m,
        "surplus_at_m": place.distance_m,
        "antenna_m": [study.hop.site_a.antenna_m, study.hop.site_b.antenna_m],
        "least_equal_m": plan.least_equal.height_m,
        "cheapest_m": None if pair is None else [pair.antenna_a_m, pair.antenna_b_m],
        "cost": None if pair is None else pair.cost,
        "fade_margin_db": side.margin_db,
        "year_minutes": side.year_minutes,
        "meets_objective": verdict.meets_objective,
    }
