"""Warnings where a published range is left."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

__all__ = ["FREQUENCY_RANGE_GHZ", "atmosphere_warnings"]

FREQUENCY_RANGE_GHZ = (1.0, 1000.0)
"""Validity of P.676-13 Annex 1 and of P.838-3 alike."""


def atmosphere_warnings(frequency_hz: ArrayLike, height_m: ArrayLike | None = None) -> tuple[str, ...]:
    """Say in one plain line each where a published range is left and what was done about it; empty inside.

    Parameters
    ----------
    frequency_hz
        Frequency for the gas and rain attenuation, any shape.
    height_m
        Height asked of `reference_atmosphere`; None if the air was given.

    Returns
    -------
    tuple of str
        One line each, naming the value, the range and the recommendation.

    Examples
    --------
    >>> atmosphere_warnings(18e9)
    ()
    >>> for line in atmosphere_warnings(0.45e9):
    ...     print(line)
    gas attenuation at 0.45 GHz: outside the 1 to 1000 GHz of Rec. ITU-R P.676-13 Annex 1; its formula was carried on
    rain attenuation at 0.45 GHz: outside the 1 to 1000 GHz of Rec. ITU-R P.838-3; its value at the nearer end was used

    Notes
    -----
    Source: Rec. ITU-R P.676-13 Annex 1 and P.838-3 (both 1 to 1000 GHz), P.835-6 Annex 1 (heights).
    """
    low, high = FREQUENCY_RANGE_GHZ
    f = np.asarray(frequency_hz, dtype=float) / 1e9
    outside = f[(f < low) | (f > high)]
    below = np.asarray(0.0 if height_m is None else height_m, dtype=float)
    below = below[below < 0]
    span = f"outside the {low:g} to {high:g} GHz of Rec. ITU-R"
    warnings = []
    if outside.size:
        found = f"{outside.flat[0]:g} GHz"
        warnings.append(f"gas attenuation at {found}: {span} P.676-13 Annex 1; its formula was carried on")
        warnings.append(f"rain attenuation at {found}: {span} P.838-3; its value at the nearer end was used")
    if below.size:
        found = f"{below.flat[0]:g} m"
        warnings.append(
            f"reference atmosphere at {found}: below the 0 m of Rec. ITU-R P.835-6; its formula was carried on"
        )
    return tuple(warnings)
