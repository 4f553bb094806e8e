"""A heights plan in words: the pair, why there is none, what asks for a height."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.remarks import chance_text, cost_text, listed
from profiler.words.next_step_words import step_words
from profiler.words.places import place_text, rule_text
from profiler.words.scale import Scale
from profiler.words.verdict_words import chance_words, outcome_word

if TYPE_CHECKING:
    from profiler.heights import Choice, Least, NoPair
    from profiler.models import TowerChoice
    from profiler.plan import HeightsPlan

__all__ = [
    "least_words",
    "pair_text",
    "pair_words",
    "plan_verdict_words",
    "remedies_words",
    "requirement_text",
    "slack_words",
    "sure_words",
]


def plan_verdict_words(plan: HeightsPlan) -> str:
    """Give the verdict on the plan's pair with its chance."""
    answer = plan.answer
    chance = f", {chance_words(answer.chance, answer.asked_chance)}" if answer.chance or plan.outcome != "fails" else ""
    return f"{outcome_word(plan.outcome)}{chance}"


def pair_text(pair: Choice, scale: Scale) -> str:
    """Give a pair of heights and its cost."""
    a, b = scale.height_text(pair.antenna_a_m), scale.height_text(pair.antenna_b_m)
    return f"A {a} and B {b} above ground, cost {cost_text(pair.cost)}"


def pair_words(plan: HeightsPlan, scale: Scale) -> str:
    """Say which pair to build and what it does, or why there is none."""
    from profiler.heights import NoPair

    pair = plan.answer.pair
    if isinstance(pair, NoPair):
        reason = scale.text(pair.reason)
        return f"{reason[0].upper()}{reason[1:]}"
    a, b = scale.height_text(pair.antenna_a_m), scale.height_text(pair.antenna_b_m)
    return f"Antennas at A {a} and B {b} above ground {listed(list(plan.answer.asked))}, cost {cost_text(pair.cost)}"


def remedies_words(plan: HeightsPlan, found: NoPair, scale: Scale) -> list[str]:
    """Say what would have to change where there is no pair; any one of the lines does."""
    from profiler.plan import remedies

    return [step_words(step, plan.study, scale) for step in remedies(plan, found)]


def requirement_text(plan: HeightsPlan, number: int, scale: Scale) -> str:
    """Say what a requirement of the plan asks for, by its index; -1 is the bare ground of a site."""
    if number < 0:
        return "the site's own ground"
    rule = plan.rules[number]
    lower = f", {rule.label}" if number >= len(plan.study.hop.rules) else ""
    return f"{rule_text(rule, scale)}{lower}"


def least_words(plan: HeightsPlan, least: Least, scale: Scale, ends: str) -> str:
    """Give a least height, the positions that it takes on the towers of ``ends``, and what asks for it."""
    towers = {"A": plan.study.hop.heights.tower_a, "B": plan.study.hop.heights.tower_b}
    positions = listed([f"{end} {_position_text(plan, least.height_m, towers[end], scale)}" for end in ends])
    place = place_text(plan.source(least.point, least.rule), scale)
    asks = requirement_text(plan, least.rule, scale)
    return f"{scale.height_text(least.height_m, 2)} ({positions}), asked for by {place}, under {asks}"


def _position_text(plan: HeightsPlan, height_m: float, tower: TowerChoice, scale: Scale) -> str:
    """Give the position that a height takes on a tower, or why there is none."""
    from profiler.heights import round_up

    position_m = round_up(height_m, tower, spacing_m=plan.spacing_m)
    if position_m is not None:
        return f"at {scale.height_text(position_m)}"
    if height_m > tower.highest_m:
        return f"above the tower's {scale.height_text(tower.highest_m)}"
    return f"without a free position from {scale.height_text(height_m)} up"


def slack_words(cheaper_by_at_most: float) -> str:
    """Say how much cheaper a pair can be that a search did not find."""
    return f"none is cheaper by more than {cheaper_by_at_most:.3g}" if cheaper_by_at_most > 1e-6 else "none is cheaper"


def sure_words(plan: HeightsPlan, scale: Scale) -> list[str]:
    """Give the chance of the pair that merely clears the map, and the cheapest pairs that are sure enough."""
    from profiler.heights import Choice

    said = []
    clearing, chance = plan.cheapest, plan.cheapest_chance
    if chance is not None and isinstance(clearing, Choice) and clearing != plan.answer.pair:
        how_sure = f"with a chance of {chance_text(chance.value)}"
        said.append(f"On the map as it is {pair_text(clearing, scale)}, would clear: {how_sure}.")
    for each in plan.sure if plan.feasible else ():
        found = scale.text(each.pair.reason) if not isinstance(each.pair, Choice) else pair_text(each.pair, scale)
        said.append(f"{chance_text(each.asked)} sure of every rule: {found}.")
    return said
