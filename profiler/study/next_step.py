"""What a reader can do next, by what the verdict hangs on: what can be built, a survey, or a missing number."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, ClassVar

import numpy as np

from profiler.geometry import ROUNDING_M
from profiler.models import Hop
from profiler.remarks import Remark
from profiler.study.reasons import ChanceTooSmall, MarginMissing, ObjectiveMissed, ObjectiveOpen, Reason, RuleMissed
from profiler.study.result import Place, RuleResult
from profiler.units import Float

if TYPE_CHECKING:
    from profiler.availability.objective import Limit
    from profiler.budget import Budget
    from profiler.confidence import Confidence, SurveyPlace
    from profiler.study.outage import OutageResult

__all__ = [
    "AddMargin",
    "Counter",
    "CoverCut",
    "FreePositions",
    "GiveInputs",
    "GoElsewhere",
    "LowerCover",
    "RaiseAntennas",
    "StateDoubt",
    "Step",
    "Survey",
    "TakeMode",
    "next_step",
]


_AS_GOOD_AS_SURE = 0.995
"""From this chance on, a survey of the ground tells nothing that matters (common practice, no source)."""


@dataclass(frozen=True, slots=True)
class RaiseAntennas:
    """Raise both antennas, within their towers' limits, so that every rule is met, or is with the chance ``chance``."""

    kind: ClassVar[str] = "raise_antennas"

    a_by_m: float
    b_by_m: float
    chance: float | None = None


@dataclass(frozen=True, slots=True)
class CoverCut:
    """Cover that stands in the way, and by how much."""

    distance_m: float
    offset_m: float
    by_m: float


@dataclass(frozen=True, slots=True)
class LowerCover:
    """Lower what stands on the ground at every one of these places."""

    kind: ClassVar[str] = "lower_cover"

    cuts: tuple[CoverCut, ...]


@dataclass(frozen=True, slots=True)
class FreePositions:
    """Free positions of the towers that are taken: they are high enough without them."""

    kind: ClassVar[str] = "free_positions"


@dataclass(frozen=True, slots=True)
class GoElsewhere:
    """No tower there is reaches: a relay, a passive reflector or another site; a higher band where only the zone lacks.

    ``band`` says that the ray itself is free, so that a narrower zone can help.
    """

    kind: ClassVar[str] = "go_elsewhere"

    band: bool


@dataclass(frozen=True, slots=True)
class TakeMode:
    """Use a mode that does what the reference mode fails to do."""

    kind: ClassVar[str] = "take_mode"

    mode: str


@dataclass(frozen=True, slots=True)
class AddMargin:
    """Add so much fade margin: greater antennas, more power, less line loss."""

    kind: ClassVar[str] = "add_margin"

    missing_db: float


@dataclass(frozen=True, slots=True)
class Counter:
    """No margin is sure to meet the objective: work against what takes it."""

    kind: ClassVar[str] = "counter"

    limit: Limit


@dataclass(frozen=True, slots=True)
class Survey:
    """Measure these places, the most useful first."""

    kind: ClassVar[str] = "survey"

    places: tuple[SurveyPlace, ...]


@dataclass(frozen=True, slots=True)
class GiveInputs:
    """Give what the objective cannot be decided without; ``why`` in words."""

    kind: ClassVar[str] = "give_inputs"

    why: tuple[Remark, ...]


@dataclass(frozen=True, slots=True)
class StateDoubt:
    """Say how wrong the terrain may be: without it nobody knows how sure the clearance is."""

    kind: ClassVar[str] = "state_doubt"


Step = (
    RaiseAntennas
    | LowerCover
    | FreePositions
    | GoElsewhere
    | TakeMode
    | AddMargin
    | Counter
    | Survey
    | GiveInputs
    | StateDoubt
)


def next_step(
    hop: Hop,
    distance_m: Float,
    rules: Sequence[RuleResult],
    budget: Budget | None,
    outage: OutageResult,
    confidence: Confidence | None,
    reasons: Sequence[Reason],
) -> tuple[Step, ...]:
    """Give what to do about the first reason, any one of the steps; of a hop that passes, what makes it surer."""
    survey = _survey(confidence)
    steps: tuple[Step, ...]
    match reasons[0] if reasons else None:
        case RuleMissed():
            steps = _to_clear(hop, distance_m, rules)
        case MarginMissing(missing_db=missing_db):
            steps = (*_mode_with_margin(budget), AddMargin(missing_db))
        case ObjectiveMissed() as missed:
            steps = _to_meet(missed, outage)
        case ChanceTooSmall(asked=asked):
            steps = (*survey, *_to_be_sure(hop, confidence, asked))
        case ObjectiveOpen(why=why):
            steps = (GiveInputs(why),)
        case None if confidence is None:
            steps = (StateDoubt(),)
        case None:
            steps = survey if confidence.chance.value < _AS_GOOD_AS_SURE else ()
    return steps


def _survey(confidence: Confidence | None) -> tuple[Survey, ...]:
    return () if confidence is None or not confidence.survey else (Survey(confidence.survey),)


def _room(hop: Hop) -> tuple[float, float]:
    """How far the towers' limits let the antennas rise."""
    towers, sites = (hop.heights.tower_a, hop.heights.tower_b), (hop.site_a, hop.site_b)
    room_a, room_b = (max(tower.highest_m - site.antenna_m, 0.0) for tower, site in zip(towers, sites, strict=True))
    return room_a, room_b


def _to_clear(hop: Hop, distance_m: Float, rules: Sequence[RuleResult]) -> tuple[Step, ...]:
    """Ways to meet every rule: higher antennas within the towers' limits, less cover, else another path or band."""
    short = [place for result in rules for place in result.places if place.surplus_m < -ROUNDING_M]
    steps: list[Step] = []
    lift = _least_lift(distance_m, np.max([-result.least_surplus_m for result in rules], axis=0), _room(hop))
    if lift is not None:
        steps.append(RaiseAntennas(*lift))
    if all(place.cover_m >= -place.surplus_m for place in short):
        steps.append(LowerCover(_cuts(short)))
    if not steps:
        free = all(result.critical.clearance_m > max(result.check.rule.margin_m, 0.0) for result in rules)
        steps.append(GoElsewhere(band=free))
    return tuple(steps)


def _least_lift(distance_m: Float, need_m: Float, room_m: tuple[float, float]) -> tuple[float, float] | None:
    """By how much both antennas must rise for the ray to rise by ``need_m`` at each point: alike, if there is room.

    Where there is not, the antenna with less room goes to its limit and the other as far as it then must; None where
    both limits together do not do.
    """
    alike, share = float(need_m.max()), distance_m / distance_m[-1]
    if alike <= min(room_m):
        return alike, alike
    if (need_m > (1 - share) * room_m[0] + share * room_m[1] + ROUNDING_M).any():
        return None
    at_a = room_m[0] <= room_m[1]
    near, far = (1 - share, share) if at_a else (share, 1 - share)
    first = min(room_m)
    left = need_m - near * first
    second = float(np.max(np.divide(left, far, out=np.zeros_like(left), where=far > 0)))
    return (first, second) if at_a else (second, first)


def _cuts(places: Sequence[Place]) -> tuple[CoverCut, ...]:
    """Give the cuts along the path; of a place that several rules name, the one that asks for most."""
    worst: dict[int, Place] = {}
    for place in sorted(places, key=lambda place: place.surplus_m):
        worst.setdefault(place.index, place)
    return tuple(CoverCut(worst[i].distance_m, worst[i].offset_m, -worst[i].surplus_m) for i in sorted(worst))


def _to_be_sure(hop: Hop, confidence: Confidence | None, asked: float) -> tuple[Step, ...]:
    """Raise both antennas alike until the chance is the one that is asked for, where the towers reach so far."""
    enough = [] if confidence is None else [sure for sure in confidence.sure if sure.chance >= asked - 1e-9]
    if not enough or enough[0].raise_m > min(_room(hop)):
        return ()
    return (RaiseAntennas(enough[0].raise_m, enough[0].raise_m, enough[0].chance),)


def _mode_with_margin(budget: Budget | None) -> tuple[TakeMode, ...]:
    if budget is None:
        return ()
    rows = [budget.weaker(number)[1] for number in range(len(budget.a_to_b.modes))]
    works = [row.name for row in rows if row.fade_margin_db is not None and row.fade_margin_db >= 0.0]
    return (TakeMode(works[0]),) if works else ()


def _to_meet(missed: ObjectiveMissed, outage: OutageResult) -> tuple[Step, ...]:
    """Ways to meet an objective: a mode that does, more margin, or work against what takes it."""
    target = missed.target
    # a mode that is asked for itself is no way round another that is
    modes = [TakeMode(each.mode) for each in outage.modes if each.met is True and not each.asked]
    if target.required_margin_db is None:
        return (*modes[:1], Counter(target.margin_set_by))
    return (*modes[:1], AddMargin(target.required_margin_db - missed.fade_margin_db))
