"""The link stage of a study: losses, budget and outage for one pair of antenna centres over a known profile."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from functools import partial
from typing import TYPE_CHECKING

from profiler.atmosphere import Atmosphere, gas_along_ray, gas_warnings
from profiler.diffraction import DiffractionLoss, diffract_over_k, losses_over_k
from profiler.errors import under
from profiler.models import AvailabilityChoice, DiffractionMethod, Hop, Profile
from profiler.remarks import Length, Note, Remark, k_text, note, prefixed
from profiler.study.climate_numbers import ClimateUse
from profiler.study.outage import OutageResult, PathState, predict_outage
from profiler.units import Float

if TYPE_CHECKING:
    from profiler.budget import Budget

__all__ = ["Air", "Link", "air_along", "link", "losses_at"]


@dataclass(frozen=True, slots=True)
class Air:
    """The air at the ray's mean height, what the gases take along the ray, and where each number comes from."""

    atmosphere: Atmosphere
    gas_db: float
    source: Note
    warnings: tuple[Remark, ...]


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


def link(
    hop: Hop,
    profile: Profile,
    climate: ClimateUse,
    air: Air,
    centre_a_m: float,
    centre_b_m: float,
    *,
    cell_m: float,
    lower_clears: tuple[bool, bool] = (True, True),
) -> Link:
    """Give losses, budget and outage for one pair of antenna centres.

    Parameters
    ----------
    hop, profile, climate, air
        The hop and what is known of its ground, climate and air.
    centre_a_m, centre_b_m
        Antenna centres above the datum.
    cell_m
        Length of the terrain's finest cell.
    lower_clears
        Whether the lower antenna of a diversity pair has its clearance, at A and at B.

    Returns
    -------
    Link
    """
    stated = (*(rule.k for rule in hop.rules), climate.median_k)
    losses = losses_at(hop, profile, stated, centre_a_m, centre_b_m, cell_m=cell_m)
    budget = _budget(hop, profile, air, losses[climate.median_k], (centre_a_m, centre_b_m), cell_m)
    with under("availability", AvailabilityChoice):
        path = PathState(
            profile,
            centre_a_m,
            centre_b_m,
            losses,
            partial(_loss_over_k, hop, profile, centre_a_m, centre_b_m, cell_m),
            lower_clears,
        )
        outage = predict_outage(hop, climate, budget, path)
    return Link(losses, budget, outage)


def losses_at(
    hop: Hop,
    profile: Profile,
    ks: Iterable[float],
    centre_a_m: float,
    centre_b_m: float,
    *,
    cell_m: float,
    method: DiffractionMethod | None = None,
) -> dict[float, DiffractionLoss]:
    """Diffraction loss of a hop at each k, each k once, by the hop's own method unless another is named."""
    once = tuple(dict.fromkeys(ks))
    losses = diffract_over_k(
        hop.diffraction.method if method is None else method,
        profile.distance_m,
        profile.surface_m,
        centre_a_m,
        centre_b_m,
        hop.frequency_hz,
        once,
        polarization=hop.polarization,
        sea_fraction=hop.diffraction.sea_fraction,
        cell_m=cell_m,
    )
    return dict(zip(once, losses, strict=True))


def _loss_over_k(hop: Hop, profile: Profile, centre_a_m: float, centre_b_m: float, cell_m: float, k: Float) -> Float:
    """Diffraction loss of a hop at many k, by its own method."""
    return losses_over_k(
        hop.diffraction.method,
        profile.distance_m,
        profile.surface_m,
        centre_a_m,
        centre_b_m,
        hop.frequency_hz,
        k,
        polarization=hop.polarization,
        sea_fraction=hop.diffraction.sea_fraction,
        cell_m=cell_m,
    )


def air_along(hop: Hop, profile: Profile, median_k: float, centre_a_m: float, centre_b_m: float) -> Air:
    """Gas attenuation along the ray, in the air that was given or the reference atmosphere, at the ray's own height.

    Parameters
    ----------
    hop, profile
        The hop and its profile.
    median_k
        Median effective-earth-radius factor: the ray's height over the curved earth.
    centre_a_m, centre_b_m
        Antenna centres above the datum, which is taken as sea level.

    Returns
    -------
    Air
    """
    given = hop.air
    with under("air"):
        found = gas_along_ray(
            hop.frequency_hz,
            profile.distance_m,
            profile.ground_m,
            centre_a_m,
            centre_b_m,
            median_k,
            total_pressure_hpa=given.pressure_hpa,
            temperature_k=given.temperature_k,
            vapour_g_m3=given.vapour_g_m3,
        )
    fields = {"pressure": given.pressure_hpa, "temperature": given.temperature_k, "vapour": given.vapour_g_m3}
    reference = ", ".join(name for name, value in fields.items() if value is None)
    measured = ", ".join(name for name, value in fields.items() if value is not None)
    parts, heights_m = [], [found.lowest_m, found.highest_m]
    if measured:
        parts.append(f"{measured} as given for the ray's mean height of {{}}, carried along its heights")
        heights_m.insert(0, found.mean_m)
    if reference:
        parts.append(f"{reference}: Rec. ITU-R P.835-6 mean annual reference atmosphere along the ray")
    source = note("air", f"{'; '.join(parts)}, {{}} to {{}}", *(Length(height_m, 0) for height_m in heights_m))
    return Air(found.atmosphere, found.loss_db, source, gas_warnings(hop.frequency_hz, found.lowest_m))


def _budget(
    hop: Hop, profile: Profile, air: Air, loss: DiffractionLoss, centres_m: tuple[float, float], cell_m: float
) -> Budget | None:
    """Link budget both ways where a radio is given."""
    if hop.radio is None:
        return None
    from profiler.budget import link_budget

    def at(frequency_hz: float) -> tuple[float, float, float]:
        """Give a frequency with the losses of the path at it."""
        if frequency_hz == hop.frequency_hz:
            return frequency_hz, air.gas_db, loss.loss_db
        other = replace(hop, frequency_hz=frequency_hz)
        lost = losses_at(other, profile, (loss.k,), *centres_m, cell_m=cell_m)[loss.k]
        return frequency_hz, air_along(other, profile, loss.k, *centres_m).gas_db, lost.loss_db

    (there_hz, gas_db, diffraction_db), back = (at(each) for each in hop.frequencies_hz.values())
    with under("radio"):
        return link_budget(
            hop.radio,
            float(profile.distance_m[-1]),
            there_hz,
            gas_db=gas_db,
            diffraction_db=diffraction_db,
            gas_note=prefixed("Rec. ITU-R P.676-13", air.source),
            diffraction_note=f"{loss.method} at k = {k_text(loss.k)}",
            back=back if hop.two_frequencies_hz else None,
        )
