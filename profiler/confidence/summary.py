"""From what the draws gave to what the reader is told: chances, sure heights, one rule's confidence."""

from __future__ import annotations

import numpy as np

from profiler.confidence.fields import Draws
from profiler.confidence.findings import Chance, DoubtShares, RuleConfidence, SureHeights
from profiler.confidence.shares import shapley_shares
from profiler.confidence.tally import BAND, DrawTally
from profiler.models import Rule

__all__ = ["chance_of", "rule_confidence", "sure_heights"]

_Z95 = 1.959964
"""Half width of the central 95 % of the standard normal distribution."""


def chance_of(least_m: Draws) -> Chance:
    """Share of the draws whose least surplus is not negative, with Wilson's 95 % score interval."""
    draws = least_m.size
    share = float(np.mean(least_m >= 0))
    weight = _Z95**2 / draws
    centre = (share + weight / 2) / (1 + weight)
    half = _Z95 * np.sqrt(share * (1 - share) / draws + weight / (4 * draws)) / (1 + weight)
    return Chance(share, float(min(share, centre - half)), float(max(share, centre + half)))


def rule_confidence(index: int, rule: Rule, result: DrawTally) -> RuleConfidence:
    """Gather what the draws say of one rule."""
    varied = result.least_varied_m
    least = np.sort(result.least_m[index])
    low, median, high = (float(least[int(chance * least.size)]) for chance in BAND)
    shares = shapley_shares(
        (result.least_m if varied is None else varied)[index],
        {cause: mixed[index] for cause, mixed in result.mixed_m.items()},
    )
    return RuleConfidence(
        rule=rule,
        chance=chance_of(result.least_m[index]),
        surplus=result.bands[index],
        least_low_m=low,
        least_median_m=median,
        least_high_m=high,
        shares=DoubtShares(shares.get("terrain", 0.0), shares.get("cover", 0.0), shares.get("k", 0.0)),
        chance_with_k=None if varied is None else chance_of(varied[index]),
    )


def sure_heights(chance: float, result: DrawTally, antenna_a_m: float, antenna_b_m: float) -> SureHeights:
    """Order statistics of what the draws need: the least raise that meets the rules in at least that share of them."""
    draws = result.all_m.size
    rank = int(np.ceil(chance * draws)) - 1
    spread = int(np.ceil(_Z95 * np.sqrt(draws * chance * (1 - chance))))
    need = -np.sort(result.all_m)[::-1]
    alone = [float(np.sort(one)[rank]) for one in (result.need_a_m, result.need_b_m)]
    both = float(need[rank])
    return SureHeights(
        chance=chance,
        raise_m=both,
        raise_low_m=float(need[max(0, rank - spread)]),
        raise_high_m=float(need[min(draws - 1, rank + spread)]),
        equal_m=(antenna_a_m + both, antenna_b_m + both),
        a_only_m=antenna_a_m + alone[0] if np.isfinite(alone[0]) else None,
        b_only_m=antenna_b_m + alone[1] if np.isfinite(alone[1]) else None,
    )
