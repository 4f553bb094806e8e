"""Outage held against what was asked for: met or not, by what it is limited, and which fade margin would do."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.availability.missing_inputs import holds_at_low_k, reasons_open
from profiler.availability.model import OutageModel
from profiler.availability.outages import MECHANISMS, Mechanism, Outages, outages_at
from profiler.models import Objective
from profiler.remarks import Remark, target_text
from profiler.units import MINUTES_PER_YEAR, Float

__all__ = ["LARGEST_MARGIN_DB", "Limit", "ObjectiveResult", "TargetResult", "judge", "limit_of"]

LARGEST_MARGIN_DB = 200.0
"""How far the fade margin that meets a target is searched for."""

Limit = Literal["multipath", "selective", "rain", "obstruction", "no margin"]
Unit = Literal["%", "min", "ratio"]
BoolArray = NDArray[np.bool_]

_GRID = 65


@dataclass(frozen=True, slots=True)
class TargetResult:
    """One target. ``required`` and ``achieved`` are in its ``unit``; ``counts`` says what was counted.

    ``achieved_up_to`` is what the outage could be at most, with what obstruction may hide below the statistics of k;
    ``met`` is None where that, or something that could not be computed, leaves it open. ``limited_by`` is the mechanism
    with the most outage of those counted, or ``"no margin"`` where the received level is below the threshold without
    any fading. ``required_margin_db`` is the least fade margin that is sure to meet the target, at most of the outage
    and with the hop not cut off at the low k of the rules; None if none up to 200 dB is. ``margin_set_by`` is the
    mechanism that asks for it: the one with the most outage, counted or possible, right below that margin.
    """

    name: str
    unit: Unit
    required: float
    achieved: float
    achieved_up_to: float
    met: bool | None
    limited_by: Limit
    required_margin_db: float | None
    margin_set_by: Limit
    counts: tuple[Mechanism, ...]


@dataclass(frozen=True, slots=True)
class ObjectiveResult:
    """All targets together, judged by what was computed.

    ``met`` is None where no target is missed but one or more are open; ``undecided`` says why. ``limited_by`` is that
    of the target that is missed most, or met with least to spare; ``required_margin_db`` and ``margin_set_by`` are
    those of the target that asks for most.
    """

    targets: tuple[TargetResult, ...]
    met: bool | None
    undecided: tuple[Remark, ...]
    limited_by: Limit
    required_margin_db: float | None
    margin_set_by: Limit


@dataclass(frozen=True, slots=True)
class _Target:
    """One target before it is judged: which period and mechanisms, and what one percent is in its unit."""

    name: str
    unit: Unit
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

    def achieved(self, model: OutageModel, margin_db: ArrayLike) -> tuple[Float, Float]:
        """Give what is counted, and what it could be at most."""
        outages, margin = self.outages(model, margin_db), np.asarray(margin_db, dtype=float)
        both = (outages.total, outages.total_up_to)
        if self.clear_air_only:
            assert outages.clear_air is not None  # only a hop without any margin has none
            both = (outages.clear_air, outages.clear_air)
        counted, most = (np.where(margin < self.offset_db, 100.0, part) * self.per_percent for part in both)
        return counted, most

    def is_sure(self, model: OutageModel, margin_db: Float) -> BoolArray:
        """Whether a margin meets the target whatever is unknown."""
        sure = self.achieved(model, margin_db)[1] <= self.required
        return sure & (self.clear_air_only or holds_at_low_k(model, margin_db))

    def limit(self, model: OutageModel, margin_db: float) -> Limit:
        """Mechanism with the most outage at a margin, of what is counted."""
        return "no margin" if margin_db < self.offset_db else limit_of(self.outages(model, margin_db), self.counts)

    def limit_at_most(self, model: OutageModel, margin_db: float) -> Limit:
        """Mechanism with the most outage at a margin, of what is possible."""
        if margin_db < self.offset_db:
            return "no margin"
        if not self.clear_air_only and not holds_at_low_k(model, np.asarray(margin_db)):
            return "obstruction"
        outages = self.outages(model, margin_db)
        return limit_of(replace(outages, obstruction=outages.obstruction_up_to), self.counts)


def _targets(objective: Objective) -> tuple[_Target, ...]:
    """Every target that is asked for."""
    asked = (
        ("worst_month_percent", "%", "worst-month", 1.0, False, 0.0),
        ("year_percent", "%", "year", 1.0, False, 0.0),
        ("minutes_per_year", "min", "year", MINUTES_PER_YEAR / 100.0, False, 0.0),
        ("severely_errored_seconds_ratio", "ratio", "worst-month", 0.01, True, 0.0),
        ("errored_seconds_ratio", "ratio", "worst-month", 0.01, True, objective.errored_threshold_offset_db or 0.0),
    )
    return tuple(
        _Target(name, unit, getattr(objective, name), *rest)  # type: ignore[arg-type]
        for name, unit, *rest in asked
        if getattr(objective, name) is not None
    )


def limit_of(outages: Outages[Float], counts: tuple[Mechanism, ...] = MECHANISMS) -> Mechanism:
    """Mechanism with the most outage of those counted and computed.

    Examples
    --------
    >>> parts = (1.0, 0.1, 2.0, 0.5, 1.1, 3.6, 0.5, 3.6)
    >>> limit_of(Outages(*(np.asarray(part) for part in parts)))
    'rain'
    """
    computed = {name: float(part) for name in counts if (part := outages.part(name)) is not None}
    return max(computed, key=lambda name: computed[name])


def _required_margin(model: OutageModel, target: _Target) -> tuple[float | None, Limit]:
    """Least fade margin sure to meet a target, and what sets it: a grid narrowed five times.

    Outage never grows with the margin, counted or possible.
    """
    low, high = 0.0, LARGEST_MARGIN_DB
    for _ in range(5):
        grid = np.linspace(low, high, _GRID)
        meets = target.is_sure(model, grid)
        if not meets.any():
            return None, target.limit_at_most(model, LARGEST_MARGIN_DB)
        first = int(meets.argmax())
        low, high = float(grid[max(first - 1, 0)]), float(grid[first])
    return high, target.limit_at_most(model, low)


def _judge_target(model: OutageModel, target: _Target, fade_margin_db: float) -> tuple[TargetResult, tuple[str, ...]]:
    """Judge one target at the hop's fade margin, and say what leaves it open."""
    achieved, most = (float(part) for part in target.achieved(model, fade_margin_db))
    reasons = () if target.clear_air_only else reasons_open(model, fade_margin_db)
    if achieved <= target.required < most:
        reasons += (
            f"objective of {target_text(target.name, target.required)}: obstruction below the lowest k given could make"
            f" it {target_text(target.name, most)}; give statistics of k for rarer times, or a rule at a lower k",
        )
    required_margin_db, margin_set_by = _required_margin(model, target)
    result = TargetResult(
        name=target.name,
        unit=target.unit,
        required=target.required,
        achieved=achieved,
        achieved_up_to=most,
        met=False if achieved > target.required else None if reasons else True,
        limited_by=target.limit(model, fade_margin_db),
        required_margin_db=required_margin_db,
        margin_set_by=margin_set_by,
        counts=target.counts,
    )
    return result, reasons


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
    judged = [_judge_target(model, target, fade_margin_db) for target in _targets(model.choice.objective)]
    if not judged:
        return None
    results = tuple(result for result, _ in judged)
    verdicts = {result.met for result in results}
    hardest = max(results, key=_margin_asked)
    return ObjectiveResult(
        targets=results,
        met=False if False in verdicts else None if None in verdicts else True,
        undecided=tuple(dict.fromkeys(reason for _, reasons in judged for reason in reasons)),
        limited_by=max(results, key=lambda result: result.achieved / result.required).limited_by,
        required_margin_db=hardest.required_margin_db,
        margin_set_by=hardest.margin_set_by,
    )


def _margin_asked(result: TargetResult) -> float:
    return math.inf if result.required_margin_db is None else result.required_margin_db
