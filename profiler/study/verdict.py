"""Whether a hop passes, decided here and nowhere else: passes, not sure or fails, why, and what to do next; as data."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from profiler.models import Hop
from profiler.study.next_step import Step, next_step
from profiler.study.reasons import Outcome, Reason, Test, find_reasons
from profiler.study.result import RuleResult

if TYPE_CHECKING:
    from profiler.budget import Budget
    from profiler.confidence import Chance, Confidence
    from profiler.study.outage import OutageResult
    from profiler.units import Float

__all__ = ["Verdict", "judge"]


@dataclass(frozen=True, slots=True)
class Verdict:
    """Whether the hop passes.

    ``chance`` is that of clearing every rule and ``minimum_chance`` the one that is asked for; None where no error of
    the terrain is known, so that the doubt was not examined. ``tested`` is what the hop was held against, ``reasons``
    what failed or is undecided, those that fail first. ``next_step`` is what the reader can do now, any one of its
    parts.
    """

    outcome: Outcome
    chance: Chance | None
    minimum_chance: float | None
    tested: tuple[Test, ...]
    reasons: tuple[Reason, ...]
    next_step: tuple[Step, ...]

    @property
    def clears(self) -> bool:
        """Whether the mapped ground meets every rule."""
        return self._held("clearance") is True

    @property
    def has_margin(self) -> bool | None:
        """Whether the reference mode has a fade margin of 0 dB or more; None without a radio that has a threshold."""
        return self._held("fade_margin")

    @property
    def meets_objective(self) -> bool | None:
        """Whether every objective is met; None where none is set, or it cannot be decided."""
        return self._held("objective")

    def _held(self, test: Test) -> bool | None:
        outcomes = {reason.outcome for reason in self.reasons if reason.test == test}
        if "fails" in outcomes:
            return False
        return None if outcomes or test not in self.tested else True


def judge(
    hop: Hop,
    distance_m: Float,
    rules: Sequence[RuleResult],
    budget: Budget | None,
    outage: OutageResult,
    confidence: Confidence | None,
) -> Verdict:
    """Judge a hop: what fails it, what leaves it open, and what to do next.

    A hop *fails* that misses a rule, has no fade margin where one is known, or misses an objective. It is *not sure*
    where nothing of this is missed, but the chance of clearing is below the one that is asked for, or an objective
    cannot be decided. Otherwise it *passes*.

    Parameters
    ----------
    hop
        The hop.
    distance_m
        Points of the path, metres from A, (n,).
    rules
        Every rule held against the ground.
    budget, outage, confidence
        The link budget, the outage and the doubt; None, or empty, where the hop gives no data for them.

    Returns
    -------
    Verdict
    """
    reasons = find_reasons(hop, rules, budget, outage, confidence)
    examined = confidence is not None and hop.confidence is not None
    return Verdict(
        outcome=_outcome(reasons),
        chance=confidence.chance if confidence is not None else None,
        minimum_chance=hop.confidence.minimum_chance if examined and hop.confidence is not None else None,
        tested=_tests(hop, budget, confidence),
        reasons=reasons,
        next_step=next_step(hop, distance_m, rules, budget, outage, confidence, reasons),
    )


def _outcome(reasons: Sequence[Reason]) -> Outcome:
    """Give the outcome that reasons leave."""
    outcomes = {reason.outcome for reason in reasons}
    return "fails" if "fails" in outcomes else "not_sure" if outcomes else "passes"


def _tests(hop: Hop, budget: Budget | None, confidence: Confidence | None) -> tuple[Test, ...]:
    """List what a hop can be held against, in the order in which it is decided."""
    has_margin = budget is not None and budget.weaker()[1].fade_margin_db is not None
    there_is: dict[Test, bool] = {
        "clearance": True,
        "chance": confidence is not None,
        "fade_margin": has_margin,
        "objective": hop.has_objective,
    }
    return tuple(test for test, there in there_is.items() if there)
