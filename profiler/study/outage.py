"""The availability stage of a study: from path, climate and margin to outage, for every mode of the radio."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from profiler.diffraction import DiffractionLoss
from profiler.models import AvailabilityChoice, Hop, Objective, Profile, RadioMode
from profiler.remarks import Remark
from profiler.study.climate_numbers import ClimateUse
from profiler.units import STATUTE_MILE_M, Float

if TYPE_CHECKING:
    from profiler.availability import Availability, KStatistics, ObjectiveResult, OutageCurve, OutageModel, PathFacts
    from profiler.budget import Budget, Way

__all__ = ["ModeOutage", "OutageResult", "PathState", "predict_outage"]

_CURVE_MARGINS_DB = np.linspace(0.0, 60.0, 121)


@dataclass(frozen=True, slots=True, eq=False)
class PathState:
    """One pair of antenna centres over a profile, and the diffraction there.

    ``losses`` are those at the median k and at the k of the rules, ``loss_over_k`` gives that at any k, in dB.
    ``lower_clears`` says whether the lower antenna of a diversity pair has its clearance, at A and at B.
    """

    profile: Profile
    centre_a_m: float
    centre_b_m: float
    losses: Mapping[float, DiffractionLoss]
    loss_over_k: Callable[[Float], Float]
    lower_clears: tuple[bool, bool]


@dataclass(frozen=True, slots=True, eq=False)
class ModeOutage:
    """Outage of one mode in its worse direction.

    ``objective`` is that of the mode held against it, or of the hop where the mode has none; None where neither has.
    ``asked``: the verdict needs it met. That is so for a mode with an objective of its own, and for the first one.
    """

    mode: str
    direction: Way
    fade_margin_db: float
    worst_month_percent: float
    year_percent: float
    asked: bool
    objective: ObjectiveResult | None

    @property
    def met(self) -> bool | None:
        """Whether its objective is met; None where there is none, or it cannot be told."""
        return None if self.objective is None else self.objective.met


@dataclass(frozen=True, slots=True, eq=False)
class OutageResult:
    """Outage of the first mode, its curve over the margin, and the totals of every mode; or nothing and why.

    ``unjudged`` are the modes with an objective of their own whose outage could not be predicted.
    """

    availability: Availability | None = None
    curve: OutageCurve | None = None
    modes: tuple[ModeOutage, ...] = ()
    unjudged: tuple[str, ...] = ()
    assumptions: tuple[Remark, ...] = ()
    warnings: tuple[Remark, ...] = ()

    @property
    def asked(self) -> tuple[ModeOutage, ...]:
        """The modes whose objective the verdict needs met, and whose outage is known."""
        return tuple(mode for mode in self.modes if mode.asked)

    @property
    def missed(self) -> tuple[str, ...]:
        """Names of the modes that miss their objective."""
        return tuple(mode.mode for mode in self.asked if mode.met is False)

    @property
    def undecided(self) -> tuple[str, ...]:
        """Names of the modes of which it cannot be told whether they meet their objective."""
        return (*(mode.mode for mode in self.asked if mode.met is None), *self.unjudged)

    @property
    def meets(self) -> bool | None:
        """Whether every objective is met; None where there is none, or none is missed but one cannot be told."""
        if self.missed:
            return False
        return None if self.undecided or not self.asked else True


def predict_outage(hop: Hop, climate: ClimateUse, budget: Budget | None, path: PathState) -> OutageResult:
    """Predict the outage of every mode whose fade margin is known.

    Parameters
    ----------
    hop, climate
        The hop and its climate numbers.
    budget
        The link budget, or None.
    path
        The path at one pair of antenna centres.

    Returns
    -------
    OutageResult
        Empty, with the reason in words, where there is no margin or no climate to predict from.
    """
    choice = climate.choice
    modes = () if hop.radio is None else hop.radio.modes
    own = tuple(mode.name for mode in modes if _has_own(mode))
    if choice is None:
        reason = "the objectives of the modes were not judged: the hop file gives no [availability]"
        return OutageResult(unjudged=own, warnings=(*climate.warnings, *((reason,) if own else ())))
    known = [] if budget is None else [i for i in range(len(modes)) if budget.weaker(i)[1].fade_margin_db is not None]
    if budget is None or not known:
        reason = "availability not predicted: the hop file gives no radio with a threshold"
        unjudged = (
            ("the availability objective was not judged: no radio with a threshold",) if hop.has_objective else ()
        )
        return OutageResult(unjudged=own, assumptions=(reason,), warnings=(*climate.warnings, *unjudged))
    if climate.gap is not None:
        judged = ", and the objective not judged" if hop.has_objective else ""
        reason = f"availability was not predicted{judged}: {climate.gap}"
        return OutageResult(unjudged=own, warnings=(*climate.warnings, reason))
    from profiler.availability import k_statistics, outage_curve
    from profiler.budget import way_name

    counted_db = path.losses[climate.median_k].loss_db
    statistics = k_statistics(climate.k_percentiles, climate.median_k, lambda k: path.loss_over_k(k) - counted_db)
    facts = _facts(hop, climate, choice, path)
    found = [
        _worse_direction(budget, index, _models(hop, climate, _of_mode(choice, modes[index]), facts, path, statistics))
        for index in known
    ]
    rows = []
    for index, (way, _, outage) in zip(known, found, strict=True):
        asked = _has_own(modes[index]) or (index == known[0] and choice.objective != Objective())
        month, year = outage.worst_month_percent.total, outage.year_percent.total
        rows.append(ModeOutage(modes[index].name, way, outage.fade_margin_db, month, year, asked, outage.objective))
    way, model, first = found[0]
    unknown = tuple(name for name in own if name not in {row.mode for row in rows})
    gaps = tuple(f"mode {name}: its objective was not judged, as no threshold is known" for name in unknown)
    return OutageResult(
        availability=first,
        curve=outage_curve(model, _CURVE_MARGINS_DB),
        modes=tuple(rows),
        unjudged=unknown,
        assumptions=(
            f"availability is that of mode {rows[0].mode}, {way_name(way)}: the worse direction",
            *first.assumptions,
        ),
        warnings=(*climate.warnings, *first.warnings, *_other_warnings(rows[1:]), *gaps),
    )


def _has_own(mode: RadioMode) -> bool:
    return mode.objective is not None and mode.objective != Objective()


def _of_mode(choice: AvailabilityChoice, mode: RadioMode) -> tuple[AvailabilityChoice, RadioMode]:
    """Give the choice with the objective of one mode, which replaces that of the hop."""
    return (replace(choice, objective=mode.objective) if mode.objective is not None else choice), mode


def _models(
    hop: Hop,
    climate: ClimateUse,
    of_mode: tuple[AvailabilityChoice, RadioMode],
    facts: PathFacts,
    path: PathState,
    statistics: KStatistics | None,
) -> dict[Way, OutageModel]:
    """Put the outage of one mode together each way; diversity counts where the lower antenna that receives clears."""
    from profiler.availability import outage_model

    choice, mode = of_mode
    low_k = min(rule.k for rule in hop.rules)

    def model(*, credited: bool) -> OutageModel:
        return outage_model(
            facts,
            choice if credited else replace(choice, diversity=None),
            signature=mode.signature,
            k_statistics=statistics,
            low_k=low_k,
            low_k_excess_db=path.losses[low_k].loss_db - path.losses[climate.median_k].loss_db,
            sources=climate.sources,
        )

    at_a, at_b = path.lower_clears if choice.diversity is not None else (True, True)
    to_b = model(credited=at_b)
    return {"a_to_b": to_b, "b_to_a": to_b if at_a == at_b else model(credited=at_a)}


def _worse_direction(
    budget: Budget, index: int, models: Mapping[Way, OutageModel]
) -> tuple[Way, OutageModel, Availability]:
    """Predict one mode in the direction with more outage; with equal outage, in that with less level."""
    from profiler.availability import predict

    weaker, _ = budget.weaker(index)
    ways = tuple(sorted(models, key=lambda way: way != weaker))
    if models["a_to_b"] is models["b_to_a"]:  # the same law both ways: less margin is more outage
        ways = (weaker,)
    found = []
    for way in ways:
        margin_db = getattr(budget, way).modes[index].fade_margin_db
        assert margin_db is not None
        found.append((way, models[way], predict(models[way], margin_db)))
    return max(found, key=lambda each: each[2].worst_month_percent.total)


def _other_warnings(rows: list[ModeOutage]) -> tuple[str, ...]:
    """Say what leaves the objectives of further modes open."""
    return tuple(
        f"mode {row.mode}: {reason}"
        for row in rows
        if row.asked and row.objective is not None
        for reason in row.objective.undecided
    )


def _facts(hop: Hop, climate: ClimateUse, choice: AvailabilityChoice, path: PathState) -> PathFacts:
    """Put the path into the plain numbers that the outage methods take."""
    from profiler.availability import PathFacts, path_roughness

    profile = path.profile
    length_m = float(profile.distance_m[-1])
    # a short path has no roughness: an error where the method that was chosen needs it, else one method less to compare
    rough = choice.climate is not None and (
        choice.multipath_method == "vigants-barnett" or length_m > 3 * STATUTE_MILE_M
    )
    return PathFacts(
        distance_m=length_m,
        frequency_hz=max(hop.frequencies_hz.values()),  # rain and multipath grow with it
        centre_a_m=path.centre_a_m,
        centre_b_m=path.centre_b_m,
        latitude=climate.latitude,
        polarization=hop.polarization,
        mean_ground_m=profile.mean_ground_m,
        ground_roughness_m=path_roughness(profile.distance_m, profile.ground_m) if rough else None,
        median_k=climate.median_k,
        median_loss_db=path.losses[climate.median_k].loss_db,
    )
