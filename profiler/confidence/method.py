"""State in sentences what the analysis assumed, for the reader of a data sheet."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from profiler.confidence.draws import Doubt
from profiler.models import ConfidenceChoice

__all__ = ["describe"]


def describe(
    choice: ConfidenceChoice, doubt: Doubt, surveyed: tuple[bool, bool], k_percentiles: Sequence[tuple[float, float]]
) -> tuple[str, ...]:
    """State what was assumed, a sentence each."""
    apart = [known or choice.site_sigma_m is not None for known in surveyed]
    sites = [
        f"site {name} " + (f"is known to {choice.site_sigma_m or 0:g} m (sigma) apart" if known else "is on the raster")
        for name, known in zip("AB", apart, strict=True)
    ]
    lines = [
        f"{choice.draws} draws, seed {choice.seed}; intervals of chances are Wilson's at 95 %, of heights those of"
        " order statistics.",
        f"Local ground error: Gaussian, no bias, sigma {choice.terrain_sigma_m:.2f} m,"
        f" {_correlation_words(choice.correlation_m, choice)}.",
    ]
    if doubt.terrain is not None:
        lines.append(
            f"Errors are drawn every {doubt.terrain.step_m:.3g} m along the path and carried between, with the same"
            " sigma everywhere; how densely the path is listed does not matter."
        )
    if choice.terrain_offset_sigma_m:
        cancels = "which cancels" if not any(apart) else "which does not cancel at a site known apart"
        lines.append(
            f"All ground of the raster shares an offset too, sigma {choice.terrain_offset_sigma_m:.2f} m, {cancels}."
        )
    lines += [
        f"Antennas stand on the ground and move with it: {sites[0]}, {sites[1]}.",
        "Chances, sure heights and survey places are at each rule's own k, over terrain and cover.",
    ]
    if doubt.cover is not None:
        reach = choice.correlation_m if choice.cover_correlation_m is None else choice.cover_correlation_m
        lines.append(
            f"Cover error where there is cover: Gaussian, sigma {choice.cover_sigma_m:g} m and"
            f" {choice.cover_relative_sigma:.0%} of the height in quadrature, cut off at height 0,"
            f" {_correlation_words(reach, choice)}."
        )
    if len(k_percentiles):
        first, last = k_percentiles[0], k_percentiles[-1]
        lines.append(
            f"k varies in time, one value for the whole path, by {len(k_percentiles)} given percentiles; held at "
            f"{first[1]:.3g} below {first[0]:g} % and at {last[1]:.3g} above {last[0]:g} %."
        )
    else:
        lines.append("k does not vary in this analysis.")
    lines.append("Shares of doubt are Shapley effects on the least surplus; shares of survey places are lower bounds.")
    return tuple(lines)


def _correlation_words(range_m: float, choice: ConfidenceChoice) -> str:
    if range_m == 0:
        return "uncorrelated from node to node"
    if range_m == np.inf:
        return "the same for the whole path"
    return f"{choice.covariance} correlation with a practical range (5 % left) of {range_m:g} m"
