"""The link stage of a study: losses, budget and outage for one pair of antenna centres over a known profile."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from profiler.atmosphere import Atmosphere, gas_attenuation, gas_warnings, local_atmosphere
from profiler.diffraction import DiffractionLoss, diffract_over_k
from profiler.errors import under
from profiler.models import AvailabilityChoice, DiffractionMethod, Hop, Profile
from profiler.study.climate_numbers import ClimateUse
from profiler.study.outage import OutageResult, predict_outage

if TYPE_CHECKING:
    from profiler.budget import Budget

__all__ = ["Air", "Link", "air_along", "link", "losses_at"]


@dataclass(frozen=True, slots=True)
class Air:
    """The air that the gas attenuation assumes, where each number comes from, and where a published range is left."""

    atmosphere: Atmosphere
    gas_db: float
    source: str
    warnings: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Link:
    """What one pair of antenna centres gives: diffraction at the k of the rules and the median k, budget and outage."""

    losses: dict[float, DiffractionLoss]
    budget: Budget | None
    outage: OutageResult

    @classmethod
    def none(cls) -> Link:
        """Give the link that was not asked for."""
        return cls({}, None, OutageResult())


def link(hop: Hop, profile: Profile, climate: ClimateUse, air: Air, centre_a_m: float, centre_b_m: float) -> Link:
    """Give losses, budget and outage for one pair of antenna centres.

    Parameters
    ----------
    hop, profile, climate, air
        The hop and what is known of its ground, climate and air.
    centre_a_m, centre_b_m
        Antenna centres above the datum.

    Returns
    -------
    Link
    """
    stated = (*(rule.k for rule in hop.rules), climate.median_k)
    losses = losses_at(hop, profile, (*stated, *(k for _, k in climate.k_percentiles)), centre_a_m, centre_b_m)
    budget = _budget(hop, profile, air, losses[climate.median_k])
    with under("availability", AvailabilityChoice):
        outage = predict_outage(hop, profile, climate, budget, centre_a_m, centre_b_m, losses)
    return Link({k: losses[k] for k in stated}, budget, outage)


def losses_at(
    hop: Hop,
    profile: Profile,
    ks: Iterable[float],
    centre_a_m: float,
    centre_b_m: float,
    *,
    method: DiffractionMethod | None = None,
) -> dict[float, DiffractionLoss]:
    """Diffraction loss of a hop at each k, each k once, by the hop's own method unless another is named."""
    once = tuple(dict.fromkeys(ks))
    losses = diffract_over_k(
        hop.diffraction_method if method is None else method,
        profile.distance_m,
        profile.surface_m,
        centre_a_m,
        centre_b_m,
        hop.frequency_hz,
        once,
        polarization=hop.polarization,
        sea_fraction=hop.sea_fraction,
    )
    return dict(zip(once, losses, strict=True))


def air_along(hop: Hop, profile: Profile) -> Air:
    """Gas attenuation in the air that was given, or the reference atmosphere at the path's mean height.

    Parameters
    ----------
    hop, profile
        The hop and its profile; the height is that of the mean ground plus the mean antenna height.

    Returns
    -------
    Air
    """
    height_m = float(profile.ground_m.mean()) + 0.5 * (hop.site_a.antenna_m + hop.site_b.antenna_m)
    given = hop.air
    with under("air"):
        atmosphere = local_atmosphere(
            height_m,
            total_pressure_hpa=given.pressure_hpa,
            temperature_k=given.temperature_k,
            vapour_g_m3=given.vapour_g_m3,
        )
    per_km = float(
        gas_attenuation(hop.frequency_hz, atmosphere.pressure_hpa, atmosphere.temperature_k, atmosphere.vapour_g_m3)
    )
    fields = {"pressure": given.pressure_hpa, "temperature": given.temperature_k, "vapour": given.vapour_g_m3}
    assumed = [name for name, value in fields.items() if value is None]
    reference = f"Rec. ITU-R P.835-6 mean annual reference atmosphere at {height_m:.0f} m"
    source = f"{', '.join(assumed)}: {reference}" if assumed else "given"
    gas_db = per_km * float(profile.distance_m[-1]) / 1e3
    return Air(atmosphere, gas_db, source, gas_warnings(hop.frequency_hz, height_m if assumed else None))


def _budget(hop: Hop, profile: Profile, air: Air, loss: DiffractionLoss) -> Budget | None:
    """Link budget both ways where a radio is given."""
    if hop.radio is None:
        return None
    from profiler.budget import link_budget

    with under("radio"):
        return link_budget(
            hop.radio,
            float(profile.distance_m[-1]),
            hop.frequency_hz,
            gas_db=air.gas_db,
            diffraction_db=loss.loss_db,
            gas_note=f"Rec. ITU-R P.676-13; {air.source}",
            diffraction_note=f"{loss.method} at k = {loss.k:.3g}",
        )
