"""Outage held against what was asked for: met or not, by what it is limited, and which fade margin would do."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from profiler.availability.model import OutageModel
from profiler.availability.outages import MECHANISMS, Mechanism, Outages, outages_at
from profiler.models import Objective
from profiler.units import MINUTES_PER_YEAR, Float

__all__ = ["LARGEST_MARGIN_DB", "Limit", "ObjectiveResult", "TargetResult", "judge", "limit_of"]

LARGEST_MARGIN_DB = 200.0
"""How far the fade margin that meets a target is searched for."""

Limit = Literal["multipath", "selective", "rain", "obstruction", "no margin"]

_RAIN_MATTERS_HZ = 5e9
_GRID = 65


@dataclass(frozen=True, slots=True)
class TargetResult:
    """One target. ``required`` and ``achieved`` are in the unit of its name; ``counts`` says what was counted.

    ``limited_by`` is the mechanism with the most outage of those counted, or ``"no margin"`` where the received level
    is below the threshold without any fading. ``required_margin_db`` is the least fade margin that meets the target;
    None if none up to 200 dB does.
    """

    name: str
    required: float
    achieved: float
    met: bool
    limited_by: Limit
    required_margin_db: float | None
    counts: tuple[Mechanism, ...]


@dataclass(frozen=True, slots=True)
class ObjectiveResult:
    """All targets together, judged by what was computed.

    ``met`` is None where every target holds so far but something that matters could not be computed; ``undecided`` says
    what. ``limited_by`` is that of the target that is missed most, or met with least to spare.
    """

    targets: tuple[TargetResult, ...]
    met: bool | None
    undecided: tuple[str, ...]
    limited_by: Limit
    required_margin_db: float | None


@dataclass(frozen=True, slots=True)
class _Target:
    """One target before it is judged: which period and mechanisms, and what one percent is in its unit."""

    name: str
    required: float
    period: Literal["worst-month", "year"]
    per_percent: float = 1.0
    clear_air_only: bool = False
    offset_db: float = 0.0

    @property
    def counts(self) -> tuple[Mechanism, ...]:
        return MECHANISMS[:2] if self.clear_air_only else MECHANISMS

    def outages(self, model: OutageModel, margin_db: ArrayLike) -> Outages[Float]:
        month, year = outages_at(model, np.maximum(np.asarray(margin_db) - self.offset_db, 0.0))
        return month if self.period == "worst-month" else year

    def achieved(self, model: OutageModel, margin_db: ArrayLike) -> Float:
        margin = np.asarray(margin_db, dtype=float)
        outages = self.outages(model, margin)
        percent = outages.clear_air if self.clear_air_only else outages.total
        return np.asarray(np.where(margin < self.offset_db, 100.0, percent) * self.per_percent)


def _targets(objective: Objective) -> tuple[_Target, ...]:
    """Every target that is asked for."""
    asked = (
        ("worst_month_percent", "worst-month", 1.0, False, 0.0),
        ("year_percent", "year", 1.0, False, 0.0),
        ("minutes_per_year", "year", MINUTES_PER_YEAR / 100.0, False, 0.0),
        ("severely_errored_seconds_ratio", "worst-month", 0.01, True, 0.0),
        ("errored_seconds_ratio", "worst-month", 0.01, True, objective.errored_threshold_offset_db or 0.0),
    )
    return tuple(
        _Target(name, getattr(objective, name), period, *rest)  # type: ignore[arg-type]
        for name, period, *rest in asked
        if getattr(objective, name) is not None
    )


def limit_of(outages: Outages[Float], counts: tuple[Mechanism, ...] = MECHANISMS) -> Mechanism:
    """Mechanism with the most outage of those counted and computed.

    Examples
    --------
    >>> limit_of(Outages(*(np.asarray(part) for part in (1.0, 0.1, 2.0)), None, np.asarray(1.1), np.asarray(3.1)))
    'rain'
    """
    computed = {name: float(part) for name in counts if (part := outages.part(name)) is not None}
    return max(computed, key=lambda name: computed[name])


def _required_margin(model: OutageModel, target: _Target) -> float | None:
    """Least fade margin that meets a target: a grid narrowed five times (outage never grows with the margin)."""
    low, high = 0.0, LARGEST_MARGIN_DB
    for _ in range(5):
        grid = np.linspace(low, high, _GRID)
        meets = target.achieved(model, grid) <= target.required
        if not meets.any():
            return None
        first = int(meets.argmax())
        low, high = float(grid[max(first - 1, 0)]), float(grid[first])
    return high


def _judge_target(model: OutageModel, target: _Target, fade_margin_db: float) -> TargetResult:
    """Judge one target at the hop's fade margin."""
    achieved = float(target.achieved(model, fade_margin_db))
    limited_by: Limit = "no margin"
    if fade_margin_db >= target.offset_db:
        limited_by = limit_of(target.outages(model, fade_margin_db), target.counts)
    return TargetResult(
        name=target.name,
        required=target.required,
        achieved=achieved,
        met=achieved <= target.required,
        limited_by=limited_by,
        required_margin_db=_required_margin(model, target),
        counts=target.counts,
    )


def _undecided(model: OutageModel, targets: tuple[_Target, ...], fade_margin_db: float) -> tuple[str, ...]:
    """Name what matters to a target and could not be computed."""
    if all(target.clear_air_only for target in targets):
        return ()
    reasons = []
    if model.rain_fade_001_db is None and model.path.frequency_hz > _RAIN_MATTERS_HZ:
        reasons.append(
            "rain is not counted, and above 5 GHz Rec. ITU-R P.530 §2.4 wants it in the design: give rain_rate_mm_h"
        )
    low_k = model.low_k_excess_db
    if model.k_percent is None and low_k is not None and low_k > fade_margin_db:
        reasons.append(
            "diffraction at the low k takes more than the fade margin, for an unknown time: give k_percentiles"
        )
    return tuple(reasons)


def judge(model: OutageModel, fade_margin_db: float) -> ObjectiveResult | None:
    """Hold a hop's outage against its objective.

    Targets in percent and in minutes judge the total of all that was computed. Ratios of errored seconds judge flat and
    selective multipath in the worst month: an outage of ten seconds or more counts as unavailable time and not as
    errored seconds (ITU-T G.826), and that is what rain and obstruction make. Severely errored seconds are those below
    the threshold; errored ones begin ``errored_threshold_offset_db`` above it.

    Parameters
    ----------
    model
        From `outage_model`; its choice holds the objective.
    fade_margin_db
        Fade margin, dB; below 0 nothing is met.

    Returns
    -------
    ObjectiveResult or None
        None if the objective has no target.

    Examples
    --------
    >>> from profiler.availability import PathFacts, outage_model
    >>> from profiler.models import AvailabilityChoice
    >>> choice = AvailabilityChoice("p530-17-quick", Objective(worst_month_percent=0.001), dn1_n_km=-300.0)
    >>> model = outage_model(PathFacts(40e3, 4e9, 300.0, 400.0, latitude=45.0), choice)
    >>> result = judge(model, 35.0)
    >>> result.met, result.limited_by, round(result.required_margin_db, 1)
    (False, 'multipath', 36.9)

    Notes
    -----
    Source: ITU-T G.826 (unavailable time, severely errored seconds) and Rec. ITU-R F.1668 (targets hold for any month),
    from memory; the outage ratio of the worst month is taken as the ratio of seconds. A year is 365.25 days.
    """
    targets = _targets(model.choice.objective)
    if not targets:
        return None
    results = tuple(_judge_target(model, target, fade_margin_db) for target in targets)
    undecided = _undecided(model, targets, fade_margin_db)
    margins = [result.required_margin_db for result in results]
    known = [margin for margin in margins if margin is not None]
    met: bool | None = all(result.met for result in results)
    return ObjectiveResult(
        targets=results,
        met=None if met and undecided else met,
        undecided=undecided,
        limited_by=max(results, key=lambda result: result.achieved / result.required).limited_by,
        required_margin_db=max(known) if len(known) == len(margins) else None,
    )
