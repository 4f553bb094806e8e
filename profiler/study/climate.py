"""Climate numbers of a hop: as given, or from the published maps where the hop file asks for them."""

from __future__ import annotations

from dataclasses import dataclass, replace

from profiler.models import AvailabilityChoice, Hop
from profiler.path import geodesic, midpoint, trace
from profiler.units import Float

__all__ = ["ClimateUse", "climate_numbers"]


@dataclass(frozen=True, slots=True, eq=False)
class ClimateUse:
    """The availability choice with its numbers filled in, where each came from, and what is still to be sampled.

    ``roughness_points`` are the longitudes and latitudes at which the terrain gives the roughness sa, or None where it
    is not wanted.
    """

    choice: AvailabilityChoice | None
    sources: dict[str, str]
    latitude: float
    roughness_points: tuple[Float, Float] | None
    warnings: tuple[str, ...] = ()

    @property
    def k_percentiles(self) -> tuple[tuple[float, float], ...]:
        """(percent of the time that k is not exceeded, k) pairs; empty where nobody gave any."""
        return () if self.choice is None else self.choice.k_percentiles

    def with_roughness(self, heights_m: Float | None) -> ClimateUse:
        """Take the roughness from the sampled heights.

        Raises
        ------
        InputError
            If the terrain covers too little of the box around the path.
        """
        if heights_m is None or self.choice is None:
            return self
        from profiler.availability import terrain_roughness

        roughness = terrain_roughness(heights_m)
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
    ends = (hop.site_a.longitude, hop.site_a.latitude, hop.site_b.longitude, hop.site_b.latitude)
    middle = midpoint(trace(*ends, spacing_m=float(geodesic(*ends)[0])))
    choice = hop.availability
    sources: dict[str, str] = {}
    warnings: tuple[str, ...] = ()
    if choice is not None and choice.use_maps:
        choice, sources, warnings = _from_maps(choice, middle)
    wanted = choice is not None and choice.multipath_method == "p530-17"
    known = choice is not None and (choice.terrain_roughness_m is not None or choice.geoclimatic_factor is not None)
    points = None
    if wanted and not known:
        from profiler.availability import roughness_grid

        points = roughness_grid(*middle)
    return ClimateUse(choice, sources, middle[1], points, warnings)


def _from_maps(
    choice: AvailabilityChoice, middle: tuple[float, float]
) -> tuple[AvailabilityChoice, dict[str, str], tuple[str, ...]]:
    """Fill what is None from the maps; what the hop file gives stays."""
    from profiler.climate import lookup

    found = lookup(*middle)
    named: list[str] = []
    if choice.rain_rate_mm_h is None:
        named.append("rain_rate_mm_h")
        choice = replace(choice, rain_rate_mm_h=found.rain_rate_r001_mm_h)
    if choice.dn1_n_km is None:
        named.append("dn1_n_km")
        choice = replace(choice, dn1_n_km=found.dn1_n_km)
    if not choice.k_percentiles:
        named.append("k_percentiles")
        choice = replace(choice, k_percentiles=found.k_percentiles, k_period="year")
    return choice, dict.fromkeys(named, found.source), found.warnings
