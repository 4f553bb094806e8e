"""What a hop's outage depends on besides its fade margin, put together once."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from profiler.atmosphere import rain_attenuation, rain_coefficients
from profiler.availability.diversity import improvement_p530, protected_selective
from profiler.availability.facts import PathFacts
from profiler.availability.fading import GIVEN, MultipathFading, fadings_side_by_side
from profiler.availability.fitted_ranges import diversity_within_fit, rain_warnings
from profiler.availability.multipath import OCCURRENCE_LIMIT_PERCENT
from profiler.availability.notes import InputUsed, Notes
from profiler.availability.obstruction import KStatistics
from profiler.availability.rain_outage import effective_distance
from profiler.availability.selective import multipath_activity, selective_percent
from profiler.availability.vigants import improvement_vigants
from profiler.errors import InputError
from profiler.models import AvailabilityChoice, KPeriod, MultipathMethod, Signature
from profiler.remarks import k_text

__all__ = ["OutageModel", "outage_model"]


@dataclass(frozen=True, slots=True, eq=False)
class OutageModel:
    """All that a hop's outage depends on besides its fade margin; build it with `outage_model`.

    Attributes
    ----------
    path, choice
        What it was built from.
    fadings
        Occurrence of multipath by every method whose numbers are known, that of the choice first: it decides.
    improvement_at_0_db
        The diversity improvement law at a fade of 0 dB, or None without diversity; it grows as 10^(A/10).
    selective_percent
        Selective outage of the worst month, diversity included; None without a signature.
    rain_fade_001_db
        A0.01, or None without a rain rate.
    k_statistics
        Diffraction loss over the budget's by the percent of the time that ``choice.k_period`` names, or None.
    low_k, low_k_excess_db
        Lowest k of the rules, and the diffraction loss there over the budget's, or None.
    notes
        Numbers used with their sources, assumptions, warnings.
    """

    path: PathFacts
    choice: AvailabilityChoice
    fadings: Mapping[MultipathMethod, MultipathFading]
    improvement_at_0_db: float | None
    selective_percent: float | None
    rain_fade_001_db: float | None
    k_statistics: KStatistics | None
    low_k: float | None
    low_k_excess_db: float | None
    notes: Notes

    @property
    def fading(self) -> MultipathFading:
        """Occurrence of multipath by the method of the choice."""
        return self.fadings[self.choice.multipath_method]

    @property
    def beyond_db(self) -> float | None:
        """Diffraction loss over the budget's at the low k of the rules, if that lies below every k of the statistics.

        None where the statistics of k reach the low k, and count the time of it.
        """
        if self.k_statistics is not None and self.low_k is not None:
            reached = min(k for _, k in self.choice.k_percentiles)
            return self.low_k_excess_db if self.low_k < reached else None
        return self.low_k_excess_db


def _selective(
    path: PathFacts, fading: MultipathFading, signature: Signature, improvement_at_0_db: float | None
) -> tuple[float, Notes]:
    """Outage of the worst month by selective fading, with what diversity there is."""
    p0 = fading.occurrence_percent
    outage = selective_percent(
        p0,
        path.distance_m,
        width_hz=signature.width_hz,
        depth_minimum_phase_db=signature.depth_minimum_phase_db,
        depth_nonminimum_phase_db=signature.depth_nonminimum_phase_db,
        delay_s=signature.delay_s,
    )
    activity = float(multipath_activity(p0))
    used = [
        InputUsed("multipath_activity", activity, "Rec. ITU-R P.530-17 §5.1"),
        InputUsed("selective_unprotected_percent", float(outage), "Rec. ITU-R P.530-17 §5.1, from the signature"),
    ]
    if improvement_at_0_db is not None:
        outage = protected_selective(
            outage, activity=activity, occurrence_percent=p0, improvement_at_0_db=improvement_at_0_db
        )
        used.append(InputUsed("selective_protected_percent", float(outage), "Rec. ITU-R P.530-17 §6.2"))
    assumption = "selective fading: the signature has the same width for both phases and is the one at the threshold"
    return float(outage), Notes(tuple(used), (assumption,))


def _improvement(path: PathFacts, choice: AvailabilityChoice, occurrence_percent: float) -> tuple[float | None, Notes]:
    """Diversity improvement law at 0 dB, by the companion of the multipath method."""
    diversity = choice.diversity
    if diversity is None:
        return None, Notes()
    within, outside_fit = diversity_within_fit(path, choice, diversity.spacing_m)
    where = (*within, 0.0)
    if choice.multipath_method == "vigants-barnett":
        improvement = improvement_vigants(*where, gain_difference_db=diversity.gain_difference_db)
        source = "Vigants (BSTJ 1975)"
    else:
        improvement = improvement_p530(
            *where, occurrence_percent=occurrence_percent, gain_difference_db=diversity.gain_difference_db
        )
        source = "Rec. ITU-R P.530-17 §6.2"
    used = InputUsed("diversity_improvement_at_0_db", float(improvement), f"{source}; x 10^(A/10) at a fade of A dB")
    assumptions = (
        f"space diversity by {source} with maximum-power combining; an improvement below 1 counts as none",
        "space diversity: flat and selective outage join as (flat^0.75 + selective^0.75)^(4/3), so the total is a "
        "little more than their sum (Rec. ITU-R P.530-17 §6.2)",
    )
    return float(improvement), Notes((used,), assumptions, outside_fit=outside_fit)


def _rain(path: PathFacts, choice: AvailabilityChoice, sources: Mapping[str, str]) -> tuple[float | None, Notes]:
    """A0.01 of the path."""
    rate = choice.rain_rate_mm_h
    if rate is None:
        return None, Notes()
    k, alpha = rain_coefficients(path.frequency_hz, path.elevation_deg, path.tilt_deg)
    length_m = float(effective_distance(path.distance_m, path.frequency_hz, rate, alpha))
    specific_db_km = float(rain_attenuation(path.frequency_hz, rate, path.elevation_deg, path.tilt_deg))
    fade_db = specific_db_km * length_m / 1e3
    used = (
        InputUsed("rain_rate_mm_h", rate, sources.get("rain_rate_mm_h", GIVEN)),
        InputUsed("rain_k", float(k), f"Rec. ITU-R P.838-3, {path.polarization} polarization"),
        InputUsed("rain_alpha", float(alpha), f"Rec. ITU-R P.838-3, {path.polarization} polarization"),
        InputUsed("rain_effective_distance_m", length_m, "Rec. ITU-R P.530-18 §2.4.1"),
        InputUsed("rain_fade_001_db", fade_db, "Rec. ITU-R P.530-18 §2.4.1"),
    )
    assumption = "rain in the worst month from the year by Rec. ITU-R P.841-6, global values (Q1 2.85, β 0.13)"
    return fade_db, Notes(used, (assumption,), outside_fit=rain_warnings(path))


def _k_notes(choice: AvailabilityChoice, statistics: KStatistics | None, sources: Mapping[str, str]) -> Notes:
    """Say what the statistics of k are, and what they cannot say."""
    if statistics is None:
        return Notes()
    other: dict[KPeriod, str] = {"year": "worst month from the year", "worst-month": "year from the worst month"}
    assumption = (
        f"obstruction fading: k statistics are of the {choice.k_period.replace('-', ' ')}; {other[choice.k_period]} by "
        "Rec. ITU-R P.841-6, global values (Q1 2.85, β 0.13); 1/k is linear in the normal score between percentiles"
    )
    assumptions = [assumption, *statistics.assumptions]
    text = ", ".join(f"{k_text(k)} at {share:g} %" for share, k in choice.k_percentiles)
    return Notes((InputUsed("k_percentiles", text, sources.get("k_percentiles", GIVEN)),), tuple(assumptions))


def _diffraction(
    path: PathFacts, low_k: float | None, low_k_excess_db: float | None, sources: Mapping[str, str]
) -> Notes:
    """Note what diffraction takes at the median k and at the low k of the rules."""
    if (low_k is None) != (low_k_excess_db is None):
        raise InputError(f"low_k = {low_k}: must be given together with low_k_excess_db = {low_k_excess_db}")
    numbers = (
        ("median_k", path.median_k, sources.get("median_k", GIVEN)),
        ("median_diffraction_db", path.median_loss_db, "diffraction in the budget, at median_k"),
        ("low_k", low_k, "lowest k of the rules"),
        ("low_k_excess_db", low_k_excess_db, "diffraction at low_k less that in the budget"),
    )
    return Notes(tuple(InputUsed(name, value, source) for name, value, source in numbers if value is not None))


def outage_model(
    path: PathFacts,
    choice: AvailabilityChoice,
    *,
    signature: Signature | None = None,
    k_statistics: KStatistics | None = None,
    low_k: float | None = None,
    low_k_excess_db: float | None = None,
    sources: Mapping[str, str] | None = None,
) -> OutageModel:
    """Put together what the outage of one hop depends on, whatever its fade margin.

    Parameters
    ----------
    path
        The path in plain numbers.
    choice
        Multipath method by name, climate numbers, diversity, objective. A number that is None is not used: without
        ``rain_rate_mm_h`` there is no rain outage, and the result says so.
    signature
        The radio's selective-fading signature; None leaves selective fading out.
    k_statistics
        Diffraction loss over that of the budget by the percent of ``choice.k_period``, from `k_statistics`; None leaves
        obstruction fading out.
    low_k, low_k_excess_db
        The lowest k of the rules, and the diffraction loss there over that of the budget. It gives no percentage, only
        whether the hop is cut off there.
    sources
        Where numbers came from, by field name of the choice or the path, for the result; ``"given"`` for the rest.

    Returns
    -------
    OutageModel
        For `predict` and `outage_curve`.

    Raises
    ------
    InputError
        If the method is unknown or lacks a number.

    Examples
    --------
    >>> path = PathFacts(40e3, 7e9, 300.0, 400.0, latitude=45.0)
    >>> choice = AvailabilityChoice("p530-17-quick", dn1_n_km=-300.0, rain_rate_mm_h=42.0)
    >>> model = outage_model(path, choice)
    >>> round(model.fading.occurrence_percent, 2), round(model.rain_fade_001_db, 2)
    (7.65, 4.98)

    Notes
    -----
    Source: the modules of this package, each with its own.
    """
    fadings = fadings_side_by_side(path, choice, sources or {})
    fading = fadings[choice.multipath_method]
    improvement, diversity_notes = _improvement(path, choice, fading.occurrence_percent)
    selective, selective_notes = None, Notes()
    if signature is not None:
        selective, selective_notes = _selective(path, fading, signature, improvement)
    rain_fade, rain_notes = _rain(path, choice, sources or {})
    k_notes = _k_notes(choice, k_statistics, sources or {})
    losses = _diffraction(path, low_k, low_k_excess_db, sources or {})
    general = Notes(
        assumptions=(
            "antenna heights above the terrain's datum are taken as above mean sea level",
            "multipath, rain and obstruction outages add in time",
        )
    )
    if fading.occurrence_percent >= OCCURRENCE_LIMIT_PERCENT:
        general += Notes(
            outside_fit=(
                f"multipath occurrence = {fading.occurrence_percent:.4g} %: outside the 0 to 2000 % of the shallow "
                "fading of Rec. ITU-R P.530-17 §2.3.2; the deep-fade law was used at every depth",
            )
        )
    return OutageModel(
        path=path,
        choice=choice,
        fadings=fadings,
        improvement_at_0_db=improvement,
        selective_percent=selective,
        rain_fade_001_db=rain_fade,
        k_statistics=k_statistics,
        low_k=low_k,
        low_k_excess_db=low_k_excess_db,
        notes=fading.notes + selective_notes + diversity_notes + rain_notes + losses + k_notes + general,
    )
