"""The link stage of a study: losses, budget and outage for one pair of antenna centres over a known profile."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from profiler.atmosphere import Atmosphere, gas_attenuation, local_atmosphere
from profiler.diffraction import DiffractionLoss, diffract
from profiler.errors import under
from profiler.models import AvailabilityChoice, Hop, Profile
from profiler.study.climate import ClimateUse
from profiler.study.outage import OutageResult, predict_outage

if TYPE_CHECKING:
    from profiler.budget import Budget

__all__ = ["Air", "Link", "air_along", "link"]


@dataclass(frozen=True, slots=True)
class Air:
    """The air that the gas attenuation assumes, and where each number comes from."""

    atmosphere: Atmosphere
    gas_db_per_km: float
    gas_db: float
    source: str


@dataclass(frozen=True, slots=True, eq=False)
class Link:
    """What one pair of antenna centres gives: diffraction by k, the budget and the outage."""

    losses: dict[float, DiffractionLoss]
    budget: Budget | None
    outage: OutageResult

    @classmethod
    def none(cls) -> Link:
        """Give the link that was not asked for."""
        return cls({}, None, OutageResult(None, None, (), (), ()))


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
    losses = _diffraction(hop, profile, climate.median_k, centre_a_m, centre_b_m)
    budget = _budget(hop, profile, air, losses[climate.median_k])
    with under("availability", AvailabilityChoice):
        outage = predict_outage(hop, profile, climate, budget, centre_a_m, centre_b_m, losses)
    return Link(losses, budget, outage)


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
    return Air(atmosphere, per_km, per_km * float(profile.distance_m[-1]) / 1e3, source)


def _diffraction(
    hop: Hop, profile: Profile, median_k: float, centre_a_m: float, centre_b_m: float
) -> dict[float, DiffractionLoss]:
    """Loss by the chosen method at every k of the rules and at the median k, each k once."""
    path = (profile.distance_m, profile.surface_m, centre_a_m, centre_b_m, hop.frequency_hz)
    return {
        k: diffract(hop.diffraction_method, *path, k, polarization=hop.polarization, sea_fraction=hop.sea_fraction)
        for k in dict.fromkeys([*(rule.k for rule in hop.rules), median_k])
    }


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
