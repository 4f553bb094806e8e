"""The availability stage of a study: from path, climate and margin to outage, for every mode of the radio."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from profiler.diffraction import DiffractionLoss
from profiler.models import Hop, Objective, Profile
from profiler.study.climate_numbers import ClimateUse

if TYPE_CHECKING:
    from profiler.availability import Availability, OutageCurve, OutageModel, PathFacts
    from profiler.budget import Budget, Way

__all__ = ["ModeOutage", "OutageResult", "predict_outage"]

_CURVE_MARGINS_DB = np.linspace(0.0, 60.0, 121)


@dataclass(frozen=True, slots=True)
class ModeOutage:
    """Outage of one mode in its weaker direction."""

    mode: str
    direction: Way
    fade_margin_db: float
    worst_month_percent: float
    year_percent: float
    met: bool | None


@dataclass(frozen=True, slots=True, eq=False)
class OutageResult:
    """Outage of the reference mode, its curve over the margin, and the totals of every mode; or nothing and why."""

    availability: Availability | None = None
    curve: OutageCurve | None = None
    modes: tuple[ModeOutage, ...] = ()
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()

    @property
    def meets(self) -> bool | None:
        """Whether the objective is met; None where there is none, or it cannot be told."""
        objective = None if self.availability is None else self.availability.objective
        return None if objective is None else objective.met


def predict_outage(
    hop: Hop,
    profile: Profile,
    climate: ClimateUse,
    budget: Budget | None,
    centre_a_m: float,
    centre_b_m: float,
    losses: Mapping[float, DiffractionLoss],
) -> OutageResult:
    """Predict the outage of every mode whose fade margin is known.

    Parameters
    ----------
    hop, profile, climate
        The hop, its profile and its climate numbers.
    budget
        The link budget, or None.
    centre_a_m, centre_b_m
        Antenna centres above the datum.
    losses
        Diffraction loss by k: the median k, those of the rules and the percentiles.

    Returns
    -------
    OutageResult
        Empty, with the reason in words, where there is no margin or no climate to predict from.
    """
    choice = climate.choice
    if choice is None:
        return OutageResult(warnings=climate.warnings)
    rows = [] if budget is None else [budget.weaker(mode) for mode in range(len(budget.a_to_b.modes))]
    known = [(way, row) for way, row in rows if row.fade_margin_db is not None]
    if hop.radio is None or not known:
        reason = "availability not predicted: the hop file gives no radio with a threshold"
        asked = choice.objective != Objective()
        unjudged = ("the availability objective was not judged: no radio with a threshold",) if asked else ()
        return OutageResult(assumptions=(reason,), warnings=(*climate.warnings, *unjudged))
    if climate.gap is not None:
        judged = ", and the objective not judged" if hop.has_objective else ""
        reason = f"availability was not predicted{judged}: {climate.gap}"
        return OutageResult(warnings=(*climate.warnings, reason))
    from profiler.availability import outage_curve, outage_model, predict
    from profiler.budget import way_name

    path = _facts(hop, profile, climate, centre_a_m, centre_b_m, losses)
    low_k = min(rule.k for rule in hop.rules)
    counted_db = losses[climate.median_k].loss_db
    signatures = {mode.name: mode.signature for mode in hop.radio.modes}
    models: dict[str, OutageModel] = {}
    found: list[tuple[str, Way, Availability]] = []
    for way, row in known:
        models[row.name] = outage_model(
            path,
            choice,
            signature=signatures[row.name],
            k_excess_db=[losses[k].loss_db - counted_db for _, k in climate.k_percentiles],
            low_k=low_k,
            low_k_excess_db=losses[low_k].loss_db - counted_db,
            sources=climate.sources,
        )
        assert row.fade_margin_db is not None
        found.append((row.name, way, predict(models[row.name], row.fade_margin_db)))
    name, way, first = found[0]
    assumption = f"availability is that of mode {name}, {way_name(way)}: the direction with less fade margin"
    return OutageResult(
        availability=first,
        curve=outage_curve(models[name], _CURVE_MARGINS_DB),
        modes=tuple(_summary(*each) for each in found),
        assumptions=(assumption, *first.assumptions),
        warnings=(*climate.warnings, *first.warnings),
    )


def _summary(mode: str, direction: Way, availability: Availability) -> ModeOutage:
    return ModeOutage(
        mode=mode,
        direction=direction,
        fade_margin_db=availability.fade_margin_db,
        worst_month_percent=availability.worst_month_percent.total,
        year_percent=availability.year_percent.total,
        met=None if availability.objective is None else availability.objective.met,
    )


def _facts(
    hop: Hop,
    profile: Profile,
    climate: ClimateUse,
    centre_a_m: float,
    centre_b_m: float,
    losses: Mapping[float, DiffractionLoss],
) -> PathFacts:
    """Put the path into the plain numbers that the outage methods take."""
    from profiler.availability import PathFacts, path_roughness

    named_climate = climate.choice is not None and climate.choice.climate is not None
    return PathFacts(
        distance_m=float(profile.distance_m[-1]),
        frequency_hz=hop.frequency_hz,
        centre_a_m=centre_a_m,
        centre_b_m=centre_b_m,
        latitude=climate.latitude,
        polarization=hop.polarization,
        mean_ground_m=float(profile.ground_m.mean()),
        ground_roughness_m=path_roughness(profile.distance_m, profile.ground_m) if named_climate else None,
        median_k=climate.median_k,
        median_loss_db=losses[climate.median_k].loss_db,
    )
