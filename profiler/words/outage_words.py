"""Fade margin, outage and objective in words."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.remarks import db_text, target_text, time_text

if TYPE_CHECKING:
    from profiler.availability.objective import ObjectiveResult, TargetResult
    from profiler.availability.predict import Availability
    from profiler.study.result import Study

__all__ = [
    "achieved_text",
    "asked_text",
    "limit_text",
    "margin_words",
    "mode_text",
    "needs_text",
    "objective_words",
    "outage_sentence",
]

_PROPAGATION_ONLY = "by propagation alone, equipment and power not counted"

_LIMITS = {
    "multipath": "multipath",
    "selective": "selective fading",
    "rain": "rain",
    "obstruction": "obstruction",
    "no margin": "the missing margin",
}


def limit_text(limit: str) -> str:
    """Name a mechanism of outage."""
    return _LIMITS[limit]


def asked_text(target: TargetResult) -> str:
    """Say what a target asks for."""
    return target_text(target.name, target.required)


def achieved_text(target: TargetResult) -> str:
    """Say what is reached in the measure of a target, and what it could be at most."""
    reached = target_text(target.name, target.achieved)
    if target.achieved_up_to > target.achieved:
        return f"{reached}, at most {target_text(target.name, target.achieved_up_to)}"
    return reached


def needs_text(objective: ObjectiveResult | TargetResult) -> str:
    """Say which fade margin meets an objective, and what decides."""
    if objective.required_margin_db is None:
        return f"has no fade margin that is sure to do, because of {limit_text(objective.margin_set_by)}"
    return (
        f"needs a fade margin of {db_text(objective.required_margin_db)}; {limit_text(objective.margin_set_by)} decides"
    )


def outage_sentence(outage: Availability) -> str:
    """Say how long the hop is out, and by what."""
    if outage.limited_by == "no margin":
        return "out all the time: the level is below the threshold"
    return f"out {time_text(outage.year_minutes)} {_PROPAGATION_ONLY}, most by {limit_text(outage.limited_by)}"


def margin_words(study: Study) -> str:
    """Say what fade margin there is, what is needed, and how long the hop is out."""
    if study.budget is None:
        return "No radio is given, so there is no fade margin"
    row = study.budget.weaker()[1]
    if row.fade_margin_db is None:
        return f"Received level {db_text(row.received_dbm, 'dBm')}; no threshold is given, so there is no fade margin"
    margin, outage = db_text(row.fade_margin_db), study.outage.availability
    if outage is None:
        return f"Fade margin {margin}; no outage is predicted, as no climate numbers are given"
    if outage.objective is None:
        return f"Fade margin {margin}; {outage_sentence(outage)}; no objective is given"
    return f"Fade margin {margin}, and the objective {needs_text(outage.objective)}; {outage_sentence(outage)}"


def objective_words(study: Study) -> list[str]:
    """Hold the outage of each mode that must meet an objective against what is asked, a sentence for each target."""
    judged = {True: "met", False: "missed", None: "undecided"}
    return [
        f"{mode_text(mode.mode)}: asked {asked_text(target)}, expected {achieved_text(target)}: {judged[target.met]}"
        for mode in study.outage.asked
        if mode.objective is not None
        for target in mode.objective.targets
    ]


def mode_text(mode: str) -> str:
    """Name a mode of the radio at the beginning of a sentence."""
    return f"Mode {mode}" if mode else "The radio"
