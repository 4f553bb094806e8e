"""For what a hop does not pass: one value for each test that failed or is undecided, with its amounts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, ClassVar, Literal

from profiler.geometry import ROUNDING_M
from profiler.models import Hop
from profiler.remarks import Remark
from profiler.study.result import Place, RuleResult

if TYPE_CHECKING:
    from profiler.availability.objective import TargetResult
    from profiler.budget import Budget, Way
    from profiler.confidence import Chance, Confidence
    from profiler.study.outage import OutageResult

__all__ = [
    "ChanceTooSmall",
    "MarginMissing",
    "ObjectiveMissed",
    "ObjectiveOpen",
    "Outcome",
    "Reason",
    "RuleMissed",
    "Test",
    "find_reasons",
]

Outcome = Literal["passes", "not_sure", "fails"]
Test = Literal["clearance", "chance", "fade_margin", "objective"]


@dataclass(frozen=True, slots=True)
class RuleMissed:
    """A clearance rule is missed: ``rule`` is its index, ``short_m`` by how much at its worst, at ``place``."""

    test: ClassVar[Test] = "clearance"
    outcome: ClassVar[Outcome] = "fails"

    rule: int
    short_m: float
    place: Place


@dataclass(frozen=True, slots=True)
class ChanceTooSmall:
    """The mapped ground clears, but the chance that the real one does is below the one that is asked for."""

    test: ClassVar[Test] = "chance"
    outcome: ClassVar[Outcome] = "not_sure"

    chance: Chance
    asked: float


@dataclass(frozen=True, slots=True)
class MarginMissing:
    """The received level lies below the threshold of the reference mode, by ``missing_db``, in the weaker direction."""

    test: ClassVar[Test] = "fade_margin"
    outcome: ClassVar[Outcome] = "fails"

    mode: str
    direction: Way
    missing_db: float


@dataclass(frozen=True, slots=True)
class ObjectiveMissed:
    """One target of an objective is missed in a mode; ``fade_margin_db`` is the margin that there is."""

    test: ClassVar[Test] = "objective"
    outcome: ClassVar[Outcome] = "fails"

    mode: str
    fade_margin_db: float
    target: TargetResult


@dataclass(frozen=True, slots=True)
class ObjectiveOpen:
    """An objective is set and cannot be decided; ``why`` says for want of what. ``mode`` None: for no mode at all."""

    test: ClassVar[Test] = "objective"
    outcome: ClassVar[Outcome] = "not_sure"

    mode: str | None
    why: tuple[Remark, ...]


Reason = RuleMissed | ChanceTooSmall | MarginMissing | ObjectiveMissed | ObjectiveOpen


def find_reasons(
    hop: Hop,
    rules: Sequence[RuleResult],
    budget: Budget | None,
    outage: OutageResult,
    confidence: Confidence | None,
) -> tuple[Reason, ...]:
    """Find everything for which a hop does not pass, those that fail it first, each kind in the order it is decided."""
    reasons: list[Reason] = [
        RuleMissed(number, -result.critical.surplus_m, result.critical)
        for number, result in enumerate(rules)
        if result.critical.surplus_m < -ROUNDING_M
    ]
    if confidence is not None and hop.confidence is not None and not reasons:
        asked = hop.confidence.minimum_chance
        reasons += [ChanceTooSmall(confidence.chance, asked)] if confidence.chance.value < asked else []
    if budget is not None:
        way, row = budget.weaker()
        if row.fade_margin_db is not None and row.fade_margin_db < 0.0:
            reasons.append(MarginMissing(row.name, way, -row.fade_margin_db))
    if hop.has_objective:
        reasons += _objective_reasons(outage)
    return tuple(sorted(reasons, key=lambda reason: reason.outcome != "fails"))


def _objective_reasons(outage: OutageResult) -> list[Reason]:
    """Hold the objectives of the modes that must meet one against their outage."""
    found: list[Reason] = []
    for mode in outage.asked:
        if mode.objective is not None:
            missed = (each for each in mode.objective.targets if each.met is False)
            found += [ObjectiveMissed(mode.mode, mode.fade_margin_db, each) for each in missed]
        if mode.met is None:
            found.append(ObjectiveOpen(mode.mode, () if mode.objective is None else mode.objective.undecided))
    unjudged = outage.unjudged if outage.asked or outage.unjudged else (None,)
    return [*found, *(ObjectiveOpen(mode, outage.warnings[-1:]) for mode in unjudged)]
