"""State in sentences what the analysis assumed, for the reader of a data sheet."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from profiler.confidence.draws import Doubt
from profiler.models import ConfidenceChoice
from profiler.remarks import Length, Note, k_text, note, percent_text

__all__ = ["describe"]


def describe(
    choice: ConfidenceChoice, doubt: Doubt, surveyed: tuple[bool, bool], k_percentiles: Sequence[tuple[float, float]]
) -> tuple[Note, ...]:
    """State what was assumed, a sentence each."""
    lines = [
        _say(
            f"{choice.draws} draws, seed {choice.seed}; intervals of chances are Wilson's at 95 %, of heights those of"
            " order statistics."
        ),
        _say(
            f"Local ground error: Gaussian, no bias, sigma {{}}, {_correlation_words(choice.correlation_m, choice)}.",
            Length(choice.terrain_sigma_m, 2),
            *_range(choice.correlation_m),
        ),
    ]
    if doubt.terrain is not None:
        lines.append(
            _say(
                "Errors are drawn every {} along the path and carried between, with the same sigma everywhere; how"
                " densely the path is listed does not matter.",
                Length(doubt.terrain.step_m),
            )
        )
    apart = [known or choice.site_sigma_m is not None for known in surveyed]
    if choice.terrain_offset_sigma_m:
        cancels = "which cancels" if not any(apart) else "which does not cancel at a site known apart"
        words = f"All ground of the raster shares an offset too, sigma {{}}, {cancels}."
        lines.append(_say(words, Length(choice.terrain_offset_sigma_m, 2)))
    sites = [
        f"site {name} {'is known to {} (sigma) apart' if known else 'is on the raster'}"
        for name, known in zip("AB", apart, strict=True)
    ]
    lines += [
        _say(
            f"Antennas stand on the ground and move with it: {sites[0]}, {sites[1]}.",
            *(Length(choice.site_sigma_m or 0.0) for known in apart if known),
        ),
        _say("Chances, sure heights and survey places are at each rule's own k, over terrain and cover."),
    ]
    if doubt.cover is not None:
        reach_m = choice.correlation_m if choice.cover_correlation_m is None else choice.cover_correlation_m
        lines.append(
            _say(
                "Cover error where there is cover: Gaussian, sigma {} and"
                f" {percent_text(choice.cover_relative_sigma)} of the height in quadrature, cut off at height 0,"
                f" {_correlation_words(reach_m, choice)}.",
                Length(choice.cover_sigma_m),
                *_range(reach_m),
            )
        )
    if len(k_percentiles):
        first, last = k_percentiles[0], k_percentiles[-1]
        lines.append(
            _say(
                f"k varies in time, one value for the whole path, by {len(k_percentiles)} given percentiles; held at"
                f" {k_text(first[1])} below {first[0]:g} % and at {k_text(last[1])} above {last[0]:g} %."
            )
        )
    else:
        lines.append(_say("k does not vary in this analysis."))
    shares = "Shares of doubt are Shapley effects on the least surplus; shares of survey places are lower bounds."
    return (*lines, _say(shares))


def _say(words: str, *lengths: Length) -> Note:
    return note("confidence", words, *lengths)


def _range(range_m: float) -> tuple[Length, ...]:
    """Give the length that `_correlation_words` leaves open."""
    return (Length(range_m, 0),) if 0 < range_m < np.inf else ()


def _correlation_words(range_m: float, choice: ConfidenceChoice) -> str:
    if range_m == 0:
        return "uncorrelated from node to node"
    if range_m == np.inf:
        return "the same for the whole path"
    return f"{choice.covariance} correlation with a practical range (5 % left) of {{}}"
