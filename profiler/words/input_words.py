"""The numbers that an outage prediction used, in words."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.remarks import k_text, minus, ratio_text
from profiler.words.scale import Scale

if TYPE_CHECKING:
    from profiler.availability.notes import InputUsed

__all__ = ["input_words"]

_NAMES = {
    "annual_temperature_k": ("mean temperature of the year", "K"),
    "climate_factor": ("climate factor c", ""),
    "diversity_improvement_at_0_db": ("improvement by diversity at a fade of 0 dB", ""),
    "dn1_n_km": ("point refractivity gradient dN1", "N/km"),
    "dn75_n_km": ("refractivity gradient dN75", "N/km"),
    "geoclimatic_factor": ("geoclimatic factor K", ""),
    "ground_roughness_m": ("roughness of the path's ground", "m"),
    "k_percentiles": ("statistics of k", ""),
    "low_k": ("lowest k of the rules", "k"),
    "low_k_excess_db": ("diffraction at that k beyond the budget's", "dB"),
    "mean_ground_m": ("mean ground", "m"),
    "median_diffraction_db": ("diffraction in the budget", "dB"),
    "median_k": ("median k", "k"),
    "multipath_activity": ("multipath activity", ""),
    "multipath_occurrence_percent": ("multipath occurrence", "%"),
    "rain_alpha": ("exponent of rain attenuation", ""),
    "rain_effective_distance_m": ("effective length of the path in rain", "m"),
    "rain_fade_001_db": ("rain fade exceeded for 0.01 % of the time", "dB"),
    "rain_k": ("coefficient of rain attenuation", ""),
    "rain_rate_mm_h": ("rain rate exceeded for 0.01 % of the time", "mm/h"),
    "season_share": ("fading season as a share of the year", ""),
    "selective_protected_percent": ("selective outage with diversity", "%"),
    "selective_unprotected_percent": ("selective outage without diversity", "%"),
    "terrain_roughness_m": ("roughness of the terrain around", "m"),
    "year_conversion_db": ("from the worst month to the year", "dB"),
}


def input_words(used: InputUsed, scale: Scale) -> str:
    """Give one number with its source.

    Examples
    --------
    >>> from profiler.availability.notes import InputUsed
    >>> input_words(InputUsed("dn1_n_km", -300.0, "given"), Scale())
    'point refractivity gradient dN1 −300 N/km: given'
    >>> input_words(InputUsed("mean_ground_m", 100.0, "mean ground of the profile"), Scale(feet=True))
    'mean ground 328.1 ft: mean ground of the profile'
    """
    name, unit = _NAMES.get(used.name, (used.name.replace("_", " "), ""))
    if isinstance(used.value, str):
        amount = used.value
    elif unit == "m":
        amount = scale.height_text(used.value)
    elif unit == "k":
        amount = k_text(used.value)
    else:
        amount = f"{minus(ratio_text(used.value, 4))} {unit}".strip()
    return f"{name} {amount}: {used.source}"
