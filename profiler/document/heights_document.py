"""A heights plan as one plain document, ready for JSON: the keys that other people script against."""

from __future__ import annotations

from typing import Any

from profiler.document.plain_values import plain
from profiler.heights import Choice, Least, MountingSheet, NoPair, Stretch
from profiler.plan.cheapest_answer import Answer, SurePair
from profiler.plan.compose import HeightsPlan
from profiler.words import METRES, remedies_words

__all__ = ["heights_document"]

_SCHEMA = "hopwright-heights/1"


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
        Wherever a height is asked for, the place that asks is there with its position, ground and ``rule``, an index
        into ``rules`` (-1: the bare ground of a site).
    """
    choice = plan.cheapest
    return {
        "schema": _SCHEMA,
        "hop": plan.study.hop.name,
        "least_equal_m": plan.least_equal.height_m,
        "least_equal_for": _source(plan, plan.least_equal),
        "frontier_m": plain(plan.region.vertices_m),
        "cheapest_m": _pair(choice),
        "feasible": plan.feasible,
        "cost": choice.cost if isinstance(choice, Choice) else None,
        "cheapest_chance": plain(plan.cheapest_chance),
        "why_not": _why_not(plan, choice),
        "answer_m": _pair(plan.answer.pair),
        "answer": _answer(plan, plan.answer),
        "rules": [{"label": rule.label, **plain(rule)} for rule in plan.rules],
        "stretches": [{**plain(stretch), **_source(plan, stretch)} for stretch in plan.stretches],
        "least_a_m": plan.least_a.height_m if isinstance(plan.least_a, Least) else None,
        "least_a_for": _source(plan, plan.least_a) if isinstance(plan.least_a, Least) else None,
        "least_b_m": plan.least_b.height_m if isinstance(plan.least_b, Least) else None,
        "least_b_for": _source(plan, plan.least_b) if isinstance(plan.least_b, Least) else None,
        "sheet": None if plan.sheet is None else _sheet(plan.sheet),
        "diversity": [{**plain(end), "clears": end.clears, "notes": list(end.notes)} for end in plan.diversity],
        "for_loss": plain(plan.for_loss),
        "for_objective": plain(plan.for_objective),
        "sure": [_sure(plan, each) for each in plan.sure] or None,
        "assumptions": plain(plan.assumptions),
        "provenance": plain(plan.study.provenance),
    }


def _pair(choice: Choice | NoPair) -> list[float] | None:
    return [choice.antenna_a_m, choice.antenna_b_m] if isinstance(choice, Choice) else None


def _source(plan: HeightsPlan, asked: Least | Stretch) -> dict[str, Any]:
    """Give the place that asks for a height."""
    return {**plain(plan.source(asked.point, asked.rule)), "rule": asked.rule}


def _why_not(plan: HeightsPlan, choice: Choice | NoPair) -> dict[str, Any] | None:
    """Give why there is no pair and what would have to change, each place that stands too high with its position."""
    if isinstance(choice, Choice):
        return None
    lower = [{**plain(each), **plain(plan.source(each.point, each.rule))} for each in choice.lower]
    return {**plain(choice), "lower": lower, "remedies": remedies_words(plan, choice, METRES)}


def _answer(plan: HeightsPlan, answer: Answer) -> dict[str, Any]:
    """Give the pair that meets everything at once, with what that is."""
    pair = answer.pair
    return {
        "cost": pair.cost if isinstance(pair, Choice) else None,
        "why_not": _why_not(plan, pair),
        "asked": list(answer.asked),
        "unjudged": list(answer.unjudged),
        "asked_chance": answer.asked_chance,
        "chance": plain(answer.chance),
        "by_trial": answer.by_trial,
        "cheaper_by_at_most": answer.cheaper_by_at_most,
    }


def _sure(plan: HeightsPlan, found: SurePair) -> dict[str, Any]:
    """Give the cheapest pair that clears with a chance."""
    pair = found.pair
    return {
        "asked_chance": found.asked,
        "pair_m": _pair(pair),
        "cost": pair.cost if isinstance(pair, Choice) else None,
        "chance": plain(found.chance),
        "why_not": _why_not(plan, pair),
    }


def _sheet(sheet: MountingSheet) -> dict[str, Any]:
    """Give both ends' mounted heights in both unit systems, and how every rule fares with them."""
    ends: dict[str, Any] = {}
    for end in (sheet.end_a, sheet.end_b):
        names = ("antenna_m", "lower_m", "ground_m", "centre_m", "antenna_ft", "ground_ft", "centre_ft")
        ends[end.end] = {name: getattr(end, name) for name in names}
    held = [
        {
            "ray": each.ray,
            **plain(each.held.check.rule),
            "surplus_m": each.held.surplus_m,
            "beside_the_path_too": each.held.half_width_m > 0.0,
            "passes": each.held.passes,
        }
        for each in sheet.rays
    ]
    return {**ends, "held": held, "passes": sheet.passes}
