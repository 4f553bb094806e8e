"""State in sentences what the analysis assumed, for the reader of a data sheet."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from profiler.confidence.fields import Covariance
from profiler.units import Float

__all__ = ["Sigmas", "describe"]


@dataclass(frozen=True, slots=True, eq=False)
class Sigmas:
    """Standard deviation of the ground's and the cover's error at each point, and of the ground at the sites."""

    ground_m: Float
    site_a_m: float | None
    site_b_m: float | None
    cover_m: Float


def describe(
    sigmas: Sigmas,
    ranges_m: tuple[float, float],
    covariance: Covariance,
    k_percentiles: Sequence[tuple[float, float]],
    draws: int,
    seed: int,
) -> tuple[str, ...]:
    """State what was assumed, a sentence each."""
    ground = _span(sigmas.ground_m)
    sites = [
        f"site {name} {'shares the error of the raster' if sigma is None else f'is known to {sigma:g} m (sigma) apart'}"
        for name, sigma in (("A", sigmas.site_a_m), ("B", sigmas.site_b_m))
    ]
    lines = [
        f"{draws} draws, seed {seed}; intervals of chances are Wilson's at 95 %, of heights those of order statistics.",
        f"Ground error: Gaussian, no bias, sigma {ground}, {_correlation_words(ranges_m[0], covariance)}.",
        f"Antennas stand on the ground and move with it: {sites[0]}, {sites[1]}.",
        "Chances, sure heights and survey points are at each rule's own k, over terrain and cover.",
    ]
    if sigmas.cover_m.any():
        lines.append(
            f"Cover error where there is cover: Gaussian, sigma {_span(sigmas.cover_m)}, cut off at height 0, "
            f"{_correlation_words(ranges_m[1], covariance)}."
        )
    if len(k_percentiles):
        first, last = k_percentiles[0], k_percentiles[-1]
        lines.append(
            f"k varies in time, one value for the whole path, by {len(k_percentiles)} given percentiles; held at "
            f"{first[1]:.3g} below {first[0]:g} % and at {last[1]:.3g} above {last[0]:g} %."
        )
    else:
        lines.append("k does not vary in this analysis.")
    lines.append("Shares of doubt are Shapley effects on the least surplus; shares of survey points are lower bounds.")
    return tuple(lines)


def _span(values: Float) -> str:
    low, high = float(values.min()), float(values.max())
    return f"{low:.2f} m" if low == high else f"{low:.2f} to {high:.2f} m"


def _correlation_words(range_m: float, covariance: Covariance) -> str:
    if range_m == 0:
        return "uncorrelated from point to point"
    if range_m == np.inf:
        return "the same for the whole path"
    return f"{covariance} correlation with a practical range (5 % left) of {range_m:g} m"
