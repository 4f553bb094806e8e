"""What the confidence analysis finds: chances with their sampling error, bands, sure heights, shares, survey points."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from profiler.models import Rule
from profiler.remarks import Note
from profiler.units import Float

__all__ = ["Band", "Chance", "Confidence", "DoubtShares", "RuleConfidence", "SureHeights", "SurveyPlace"]


@dataclass(frozen=True, slots=True)
class Chance:
    """A probability from draws, with the 95 % interval that the number of draws leaves (Wilson's score interval)."""

    value: float
    low: float
    high: float


@dataclass(frozen=True, slots=True, eq=False)
class Band:
    """The 5 %, 50 % and 95 % points of the surplus at each point of the path, (n,) each, metres."""

    low_m: Float
    median_m: Float
    high_m: Float


@dataclass(frozen=True, slots=True)
class DoubtShares:
    """Shares of the variance of the least surplus that come from each cause; they add up to 1 (all 0 without doubt)."""

    terrain: float
    cover: float
    k: float


@dataclass(frozen=True, slots=True, eq=False)
class RuleConfidence:
    """How sure one rule is.

    ``chance`` and ``surplus`` are at the rule's own k, over terrain and cover. ``least_*_m`` are the 5 %, 50 % and
    95 % points of the least surplus along the path. ``chance_with_k`` lets k vary in time as its
    percentiles say, against the rule's fraction and margin: the expected share of time clear; None when k's spread is
    off. ``shares`` split the variance of the least surplus, with k varying if it is on.
    """

    rule: Rule
    chance: Chance
    surplus: Band
    least_low_m: float
    least_median_m: float
    least_high_m: float
    shares: DoubtShares
    chance_with_k: Chance | None


@dataclass(frozen=True, slots=True)
class SureHeights:
    """Antenna heights above ground with which all rules are met with at least the probability ``chance``.

    Three ways from the given heights: both raised alike by ``raise_m`` (negative: lowered) to ``equal_m`` (A, B), only
    A raised to ``a_only_m``, only B to ``b_only_m``; None where one antenna alone cannot do it. ``raise_low_m`` and
    ``raise_high_m`` are the 95 % interval of ``raise_m`` that the number of draws leaves.
    """

    chance: float
    raise_m: float
    raise_low_m: float
    raise_high_m: float
    equal_m: tuple[float, float]
    a_only_m: float | None
    b_only_m: float | None


@dataclass(frozen=True, slots=True)
class SurveyPlace:
    """A place worth measuring, as a crew would tell places apart: its most useful point, and from where to where.

    ``index`` is that point of the path, and ``site`` is "A" or "B" where the place is a site's own ground.
    ``share_of_doubt`` is the share of the variance of the least surplus that the heights there remove once the places
    before it in the list are measured. ``chance_critical`` is how often the critical point lies here.
    """

    index: int
    distance_m: float
    from_m: float
    to_m: float
    site: Literal["A", "B"] | None
    share_of_doubt: float
    chance_critical: float


@dataclass(frozen=True, slots=True, eq=False)
class Confidence:
    """The whole analysis. ``chance`` is that of all rules together.

    ``method`` states what was assumed, in sentences for the reader of a data sheet.
    """

    rules: tuple[RuleConfidence, ...]
    chance: Chance
    sure: tuple[SureHeights, ...]
    survey: tuple[SurveyPlace, ...]
    draws: int
    seed: int
    method: tuple[Note, ...]
