"""Warnings where a published range is left."""

from __future__ import annotations

__all__ = ["FREQUENCY_RANGE_GHZ", "gas_warnings"]

FREQUENCY_RANGE_GHZ = (1.0, 1000.0)
"""Validity of P.676-13 Annex 1 and of P.838-3 alike."""


def gas_warnings(frequency_hz: float, reference_height_m: float | None = None) -> tuple[str, ...]:
    """Say in one plain line each where a published range is left and what was done about it; empty inside.

    Parameters
    ----------
    frequency_hz
        Frequency of the gas attenuation.
    reference_height_m
        Height asked of `reference_atmosphere`; None if all of the air was given.

    Returns
    -------
    tuple of str
        One line each, naming the value, the range and the recommendation.

    Examples
    --------
    >>> gas_warnings(18e9)
    ()
    >>> print(*gas_warnings(0.45e9))
    gas attenuation at 0.45 GHz: outside the 1 to 1000 GHz of Rec. ITU-R P.676-13 Annex 1; its formula was carried on

    Notes
    -----
    Source: Rec. ITU-R P.676-13 Annex 1, P.835-6 Annex 1 (heights).
    """
    low, high = FREQUENCY_RANGE_GHZ
    frequency_ghz = frequency_hz / 1e9
    warnings = []
    if not low <= frequency_ghz <= high:
        span = f"outside the {low:g} to {high:g} GHz of Rec. ITU-R P.676-13 Annex 1"
        warnings.append(f"gas attenuation at {frequency_ghz:g} GHz: {span}; its formula was carried on")
    if reference_height_m is not None and reference_height_m < 0:
        warnings.append(
            f"reference atmosphere at {reference_height_m:g} m: below the 0 m of Rec. ITU-R P.835-6; its formula was "
            "carried on"
        )
    return tuple(warnings)
