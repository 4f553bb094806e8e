"""What a hop's outage depends on besides its fade margin, put together once."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from profiler.atmosphere import rain_attenuation, rain_coefficients
from profiler.availability.diversity import improvement_p530, protected_selective
from profiler.availability.facts import PathFacts
from profiler.availability.fading import GIVEN, MultipathFading, multipath_fading
from profiler.availability.fitted_ranges import diversity_warnings, rain_warnings
from profiler.availability.multipath import OCCURRENCE_LIMIT_PERCENT
from profiler.availability.notes import InputUsed, Notes
from profiler.availability.obstruction import obstruction_percent
from profiler.availability.rain_outage import effective_distance
from profiler.availability.selective import multipath_activity, selective_percent
from profiler.availability.vigants import improvement_vigants
from profiler.errors import InputError
from profiler.models import AvailabilityChoice, KPeriod, Signature, frozen_array
from profiler.units import Float

__all__ = ["OutageModel", "outage_model"]


@dataclass(frozen=True, slots=True, eq=False)
class OutageModel:
    """All that a hop's outage depends on besides its fade margin; build it with `outage_model`.

    Attributes
    ----------
    path, choice
        What it was built from.
    occurrence_percent
        p0 of the worst month; ``year_share`` is what the year has of it.
    improvement_at_0_db
        The diversity improvement law at a fade of 0 dB, or None without diversity; it grows as 10^(A/10).
    selective_percent
        Selective outage of the worst month, diversity included; None without a signature.
    rain_fade_001_db
        A0.01, or None without a rain rate.
    k_percent, k_excess_db
        Statistics of k with the diffraction loss over the budget's, or None; ``choice.k_period`` says of which period.
    low_k, low_k_excess_db
        Lowest k of the rules, and the diffraction loss there over the budget's, or None.
    notes
        Numbers used with their sources, assumptions, warnings.
    """

    path: PathFacts
    choice: AvailabilityChoice
    occurrence_percent: float
    year_share: float
    improvement_at_0_db: float | None
    selective_percent: float | None
    rain_fade_001_db: float | None
    k_percent: Float | None
    k_excess_db: Float | None
    low_k: float | None
    low_k_excess_db: float | None
    notes: Notes

    @property
    def beyond_db(self) -> float | None:
        """Diffraction loss over the budget's at the low k of the rules, if that lies below every k of the statistics.

        None where the statistics of k reach the low k, and count the time of it.
        """
        if self.k_percent is not None and self.low_k is not None:
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
    where = (path.distance_m, path.frequency_hz, diversity.spacing_m, 0.0)
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
    return float(improvement), Notes((used,), assumptions, diversity_warnings(path, choice, diversity))


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
    return fade_db, Notes(used, (assumption,), rain_warnings(path))


def _k_statistics(
    choice: AvailabilityChoice, k_excess_db: Sequence[float], sources: Mapping[str, str]
) -> tuple[Float | None, Float | None, Notes]:
    """Percentiles of k beside the excess loss at each, and what they cannot say."""
    if len(k_excess_db) == 0:
        return None, None, Notes()
    if len(k_excess_db) != len(choice.k_percentiles):
        raise InputError(
            f"k_excess_db has {len(k_excess_db)} values: must have one for each of the "
            f"{len(choice.k_percentiles)} k_percentiles"
        )
    percent = [pair[0] for pair in choice.k_percentiles]
    obstruction_percent(percent, k_excess_db, 0.0)  # stop here, not at the first margin, if they are unusable
    other: dict[KPeriod, str] = {"year": "worst month from the year", "worst-month": "year from the worst month"}
    assumptions = [
        f"obstruction fading: k statistics are of the {choice.k_period.replace('-', ' ')}; {other[choice.k_period]} by "
        "Rec. ITU-R P.841-6, global values (Q1 2.85, β 0.13); loss is linear in the normal quantile between percentiles"
    ]
    if percent[-1] < 50.0:
        assumptions.append("obstruction fading: no excess loss at 50 %, where the budget's median k holds")
    text = ", ".join(f"{k:.4g} at {share:g} %" for share, k in choice.k_percentiles)
    used = InputUsed("k_percentiles", text, sources.get("k_percentiles", GIVEN))
    return frozen_array(percent), frozen_array(k_excess_db), Notes((used,), tuple(assumptions))


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
    k_excess_db: Sequence[float] = (),
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
    k_excess_db
        Diffraction loss at the k of each of ``choice.k_percentiles`` less the diffraction loss in the budget, dB, in
        their order; empty leaves obstruction fading out.
    low_k, low_k_excess_db
        The lowest k of the rules, and the same there. It gives no percentage, only whether the hop is cut off there.
    sources
        Where numbers came from, by field name of the choice or the path, for the result; ``"given"`` for the rest.

    Returns
    -------
    OutageModel
        For `predict` and `outage_curve`.

    Raises
    ------
    InputError
        If the method is unknown, lacks a number, or the statistics of k and their losses do not match.

    Examples
    --------
    >>> path = PathFacts(40e3, 7e9, 300.0, 400.0, latitude=45.0)
    >>> choice = AvailabilityChoice("p530-17-quick", dn1_n_km=-300.0, rain_rate_mm_h=42.0)
    >>> model = outage_model(path, choice)
    >>> round(model.occurrence_percent, 2), round(model.rain_fade_001_db, 2)
    (7.65, 4.98)

    Notes
    -----
    Source: the modules of this package, each with its own.
    """
    fading = multipath_fading(path, choice, sources or {})
    improvement, diversity_notes = _improvement(path, choice, fading.occurrence_percent)
    selective, selective_notes = None, Notes()
    if signature is not None:
        selective, selective_notes = _selective(path, fading, signature, improvement)
    rain_fade, rain_notes = _rain(path, choice, sources or {})
    k_percent, k_excess, k_notes = _k_statistics(choice, k_excess_db, sources or {})
    losses = _diffraction(path, low_k, low_k_excess_db, sources or {})
    general = Notes(
        assumptions=(
            "antenna heights above the terrain's datum are taken as above mean sea level",
            "multipath, rain and obstruction outages add in time",
        )
    )
    if fading.occurrence_percent >= OCCURRENCE_LIMIT_PERCENT:
        general += Notes(
            warnings=(
                f"multipath occurrence = {fading.occurrence_percent:.4g} %: outside the 0 to 2000 % of the shallow "
                "fading of Rec. ITU-R P.530-17 §2.3.2; the deep-fade law was used at every depth",
            )
        )
    return OutageModel(
        path=path,
        choice=choice,
        occurrence_percent=fading.occurrence_percent,
        year_share=fading.year_share,
        improvement_at_0_db=improvement,
        selective_percent=selective,
        rain_fade_001_db=rain_fade,
        k_percent=k_percent,
        k_excess_db=k_excess,
        low_k=low_k,
        low_k_excess_db=low_k_excess_db,
        notes=fading.notes + selective_notes + diversity_notes + rain_notes + losses + k_notes + general,
    )
