"""The verdict in words: its outcome with the chance, the sentence that says why, and each reason."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.remarks import chance_text, db_text, listed, minus
from profiler.study.reasons import (
    ChanceTooSmall,
    MarginMissing,
    ObjectiveMissed,
    ObjectiveOpen,
    Outcome,
    Reason,
    RuleMissed,
)
from profiler.words.outage_words import achieved_text, asked_text, mode_text, needs_text
from profiler.words.places import rule_text, spare_text, stands_text, where_text
from profiler.words.scale import Scale

if TYPE_CHECKING:
    from profiler.confidence import Chance
    from profiler.study.result import Study

__all__ = [
    "chance_words",
    "clearance_words",
    "ends_words",
    "feet_words",
    "headline",
    "held_words",
    "outcome_word",
    "reason_words",
    "verdict_words",
]

_WORDS: dict[Outcome, str] = {"passes": "PASSES", "not_sure": "NOT SURE", "fails": "FAILS"}


def outcome_word(outcome: Outcome) -> str:
    """Give an outcome in a word or two."""
    return _WORDS[outcome]


def chance_words(chance: Chance | None, asked: float | None) -> str:
    """Say how sure the clearance is, or that nobody knows.

    Examples
    --------
    >>> from profiler.confidence import Chance
    >>> chance_words(Chance(0.8415, 0.82, 0.86), 0.9), chance_words(Chance(1.0, 0.99, 1.0), 0.9)
    ('84.2 % chance of clearing, 90 % asked', 'more than 99.9 % chance of clearing, 90 % asked')
    >>> chance_words(None, None)
    'doubt not examined'
    """
    if chance is None:
        return "doubt not examined"
    return f"{chance_text(chance.value)} chance of clearing" + (
        "" if asked is None else f", {chance_text(asked)} asked"
    )


def verdict_words(study: Study) -> str:
    """Give the verdict with its chance."""
    verdict = study.verdict
    return f"{outcome_word(verdict.outcome)}, {chance_words(verdict.chance, verdict.minimum_chance)}"


def clearance_words(study: Study, scale: Scale) -> str:
    """Say by how much the hop clears or is short, where and under which rule."""
    result, count = study.governing, len(study.rules)
    place, asks = result.tightest, rule_text(result.check.rule, scale)
    where = where_text(place, scale) + (", where the ground is interpolated" if place.filled else "")
    spare = spare_text(place.surplus_m, scale)
    if study.verdict.clears:
        return f"Clears {'every rule' if count > 1 else 'the rule'}; tightest {where}: {spare} ({asks})"
    missed = sum(isinstance(reason, RuleMissed) for reason in study.verdict.reasons)
    of_rules = f"; {missed} of {count} rules {'is' if missed == 1 else 'are'} missed" if count > 1 else ""
    return f"Does not clear: {spare}, {where} ({asks}){of_rules}"


def held_words(study: Study, scale: Scale) -> str:
    """Say what clearance there is at the place that decides, what is required and what stands there."""
    place = study.governing.tightest
    share = f" ({minus(f'{place.ratio:.2f}')} F1)" if place.f1_m > 0 else ""
    clearance, required = scale.height_text(place.clearance_m), scale.height_text(place.required_m)
    return f"There the clearance is {clearance}{share} and {required} are required, over {stands_text(place, scale)}."


def ends_words(study: Study, scale: Scale) -> str:
    """Give both ends and what lies between them."""
    hop, line = study.hop, study.line
    ends = [
        f"{end} {site.name}, antenna {scale.height_text(site.antenna_m)} up, azimuth {azimuth_deg:.2f}°"
        for end, site, azimuth_deg in (("A", hop.site_a, line.azimuth_a_deg), ("B", hop.site_b, line.azimuth_b_deg))
    ]
    return f"{'; '.join(ends)}; {scale.distance_text(line.distance_m)} at {hop.frequency_hz / 1e9:g} GHz."


def feet_words(study: Study, scale: Scale) -> str:
    """Say what is to spare at the masts' own feet, under the rule that leaves least there, and the cover there."""
    parts = []
    for end, name in enumerate("AB"):
        foot = min((result.feet[end] for result in study.rules), key=lambda place: place.surplus_m)
        cover = f" over {scale.height_text(foot.cover_m)} of cover" if foot.cover_m > 0 else ""
        parts.append(f"{spare_text(foot.surplus_m, scale)} at {name}{cover}")
    return f"At the masts' feet: {listed(parts)}."


def headline(study: Study, scale: Scale) -> str:
    """Say in one sentence by how much, where and under which rule the hop clears or is short, and what it lacks."""
    parts = [clearance_words(study, scale)]
    verdict = study.verdict
    missing = [reason.missing_db for reason in verdict.reasons if isinstance(reason, MarginMissing)]
    if missing:
        parts.append(f"no fade margin ({db_text(-missing[0])})")
    if "objective" in verdict.tested:
        judged = {True: "meets", False: "misses", None: "nobody can decide"}[verdict.meets_objective]
        parts.append(f"{judged} the availability objective")
    return "; ".join(parts)


def reason_words(reason: Reason, study: Study, scale: Scale) -> str:
    """Say one thing for which the hop does not pass."""
    match reason:
        case RuleMissed():
            rule = rule_text(study.rules[reason.rule].check.rule, scale)
            return (
                f"The rule {rule} is missed by {scale.height_text(reason.short_m)}, {where_text(reason.place, scale)}."
            )
        case ChanceTooSmall():
            chance, asked = chance_text(reason.chance.value), chance_text(reason.asked)
            return f"The mapped ground clears, but with a chance of {chance} where {asked} is asked."
        case MarginMissing():
            way = reason.direction.replace("_", " ").title().replace("To", "to")
            return f"{mode_text(reason.mode)} has no fade margin {way}: {db_text(reason.missing_db)} are missing."
        case ObjectiveMissed():
            target = reason.target
            needs = f"{needs_text(target)}; there are {db_text(reason.fade_margin_db)}"
            reached = achieved_text(target)
            return f"{mode_text(reason.mode)} misses {asked_text(target)}: it reaches {reached}, and {needs}."
        case ObjectiveOpen():
            why = f": {'; '.join(map(scale.text, reason.why))}" if reason.why else ""
            return f"The availability objective cannot be decided{why}."
