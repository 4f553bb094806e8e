"""Climate numbers of a hop: as given, or from the published maps where the hop file asks for them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

from profiler.errors import InputError, under
from profiler.models import AvailabilityChoice, Hop
from profiler.path import midpoint
from profiler.remarks import Remark
from profiler.units import K_MEDIAN, Float

__all__ = ["ClimateUse", "climate_numbers"]


@dataclass(frozen=True, slots=True, eq=False)
class ClimateUse:
    """The availability choice with its numbers filled in, where each came from, and what is still to be sampled.

    ``median_k`` is what losses, budget and angles use. ``roughness_points`` are the longitudes and latitudes at which
    the terrain gives the roughness sa, or None where it is not wanted; ``gap`` says why it could not give it.
    """

    choice: AvailabilityChoice | None
    sources: dict[str, str]
    latitude: float
    median_k: float
    roughness_points: tuple[Float, Float] | None
    gap: str | None = None
    assumptions: tuple[Remark, ...] = ()
    warnings: tuple[Remark, ...] = ()

    @property
    def k_percentiles(self) -> tuple[tuple[float, float], ...]:
        """(percent of the time that k is not exceeded, k) pairs; empty where nobody gave any."""
        return () if self.choice is None else self.choice.k_percentiles

    def with_roughness(self, heights_m: Float | None) -> ClimateUse:
        """Take the roughness from the sampled heights, or note the gap where they cover too little of the box."""
        if heights_m is None or self.choice is None:
            return self
        from profiler.availability import terrain_roughness

        try:
            roughness = terrain_roughness(heights_m)
        except InputError as error:  # clearance and margin do not need it: only the outage is left out
            return replace(self, gap=str(error))
        return replace(
            self,
            choice=replace(self.choice, terrain_roughness_m=roughness.roughness_m),
            sources=self.sources | {"terrain_roughness_m": roughness.source},
        )


def climate_numbers(hop: Hop) -> ClimateUse:
    """Collect the climate numbers of a hop.

    Parameters
    ----------
    hop
        The hop; with ``use_maps`` what is None in its availability choice comes from the maps at the path's middle.

    Returns
    -------
    ClimateUse

    Raises
    ------
    MissingExtraError
        If the maps are asked for and the climate extra is not installed.
    """
    middle = midpoint(*hop.ends)
    climate = _as_given(hop, middle[1])
    if hop.availability is not None and hop.availability.use_maps:
        climate = _from_maps(climate, hop.availability, middle, wants_median=hop.median_k is None)
    return replace(climate, roughness_points=_roughness_points(climate.choice, middle))


def _as_given(hop: Hop, latitude: float) -> ClimateUse:
    """Take the numbers of the hop file, with 4/3 for a median k that it does not give."""
    if hop.median_k is not None:
        return ClimateUse(hop.availability, {}, latitude, hop.median_k, None)
    source = "Rec. ITU-R P.530-18 §2.2, where unknown"
    note = f"median k: none is given, 4/3 is taken ({source})"
    return ClimateUse(hop.availability, {"median_k": source}, latitude, K_MEDIAN, None, assumptions=(note,))


def _from_maps(
    climate: ClimateUse, choice: AvailabilityChoice, middle: tuple[float, float], *, wants_median: bool
) -> ClimateUse:
    """Fill what is None from the maps; what the hop file gives stays, and so do the rules, whose k are its own."""
    from profiler.climate import lookup

    found = lookup(*middle)
    values: dict[str, Any] = {}
    sources: dict[str, str] = {}
    if choice.rain_rate_mm_h is None:
        values["rain_rate_mm_h"], sources["rain_rate_mm_h"] = found.rain_rate_r001_mm_h, found.rain_source
    if choice.dn1_n_km is None:
        values["dn1_n_km"], sources["dn1_n_km"] = found.dn1_n_km, found.dn1_source
    if not choice.k_percentiles:
        values |= {"k_percentiles": found.k_percentiles, "k_period": "year"}
        sources["k_percentiles"] = found.k_source
    climate = replace(climate, choice=replace(choice, **values), sources=sources, warnings=found.warnings)
    if not wants_median:
        return climate
    note = (
        f"median k: none is given, {found.k_median:.4g} is taken for losses, budget and angles ({found.k_source}); "
        "the rules keep their own k"
    )
    sources = sources | {"median_k": found.k_source}
    return replace(climate, median_k=found.k_median, sources=sources, assumptions=(note,))


def _roughness_points(choice: AvailabilityChoice | None, middle: tuple[float, float]) -> tuple[Float, Float] | None:
    """Where to sample the terrain for sa; None where the method does not take it, or it is known."""
    if choice is None or choice.multipath_method != "p530-17":
        return None
    if choice.terrain_roughness_m is not None or choice.geoclimatic_factor is not None:
        return None
    from profiler.availability import roughness_grid

    with under("availability"):
        return roughness_grid(*middle)
