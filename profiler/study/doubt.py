"""How wrong the ground of a hop may be, in the words of the confidence analysis."""

from __future__ import annotations

from typing import Any

from profiler.models import ConfidenceChoice, Profile

__all__ = ["doubt_given"]


def doubt_given(choice: ConfidenceChoice, profile: Profile) -> dict[str, Any]:
    """Give the arguments of `profiler.confidence.draw_doubt` that a hop file's ``[confidence]`` decides, but for k's.

    Parameters
    ----------
    choice
        What the hop file says.
    profile
        The profile; a surveyed site with no error of its own given has none.
    """
    surveyed_sigma_m = 0.0 if choice.site_sigma_m is None else choice.site_sigma_m
    return {
        "terrain_sigma_m": choice.terrain_sigma_m,
        "correlation_m": choice.correlation_m,
        "covariance": choice.covariance,
        "site_sigma_a_m": surveyed_sigma_m if profile.surveyed[0] else choice.site_sigma_m,
        "site_sigma_b_m": surveyed_sigma_m if profile.surveyed[-1] else choice.site_sigma_m,
        "cover_sigma_m": choice.cover_sigma_m,
        "cover_relative_sigma": choice.cover_relative_sigma,
        "cover_correlation_m": choice.cover_correlation_m,
        "draws": choice.draws,
        "seed": choice.seed,
    }
