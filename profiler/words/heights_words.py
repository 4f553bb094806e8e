"""A heights plan in words: the pair, why there is none, what asks for a height."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.remarks import listed
from profiler.words.next_step_words import step_words
from profiler.words.scale import Scale

if TYPE_CHECKING:
    from profiler.heights import NoPair
    from profiler.plan import HeightsPlan

__all__ = ["pair_words", "remedies_words"]


def remedies_words(plan: HeightsPlan, found: NoPair, scale: Scale) -> list[str]:
    """Say what would have to change where there is no pair; any one of the lines does."""
    from profiler.plan import remedies

    return [step_words(step, plan.study, scale) for step in remedies(plan, found)]


def pair_words(plan: HeightsPlan, scale: Scale) -> str:
    """Say which pair to build and what it does, or why there is none."""
    from profiler.heights import NoPair

    pair = plan.answer.pair
    if isinstance(pair, NoPair):
        reason = scale.text(pair.reason)
        return f"{reason[0].upper()}{reason[1:]}"
    a, b = scale.height_text(pair.antenna_a_m), scale.height_text(pair.antenna_b_m)
    return f"Antenna A at {a} and antenna B at {b} above ground {listed(list(plan.answer.asked))}, cost {pair.cost:g}"
