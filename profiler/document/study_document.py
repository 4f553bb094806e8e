"""A study as one plain document, ready for JSON: the keys that other people script against."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from profiler.document.plain_values import plain
from profiler.words import METRES, headline, reason_words, step_words, steps_words

if TYPE_CHECKING:
    from profiler.budget import Budget, Direction
    from profiler.geometry import HeldRule
    from profiler.models import Radio, Site
    from profiler.study.result import RuleResult, Study

__all__ = ["to_document"]

_SCHEMA = "hopwright-study/1"
_SITE_FACTS = ("call_sign", "owner", "licence", "structure", "structure_height_m")
_TERMINAL_FACTS = ("model", "equipment", "line", "line_length_m")


def to_document(study: Study) -> dict[str, Any]:
    """Give the study as a dictionary of plain values, under the stable top-level keys.

    Parameters
    ----------
    study
        The study.

    Returns
    -------
    dict
        ``schema``, ``hop``, ``path``, ``terrain``, ``rules``, ``diffraction``, ``budget``, ``availability``,
        ``confidence``, ``verdict``, ``provenance``. A part that the hop gives no data for is None.
    """
    return {
        "schema": _SCHEMA,
        "hop": _hop(study),
        "path": _path(study),
        "terrain": plain(study.terrain),
        "rules": [_rule(result) for result in study.rules],
        "diffraction": plain(study.diffraction),
        "budget": None if study.budget is None else _budget(study.budget),
        "availability": _availability(study),
        "confidence": _confidence(study),
        "verdict": _verdict(study),
        "provenance": plain(study.provenance),
    }


def _verdict(study: Study) -> dict[str, Any]:
    """Give the verdict with its words, in metres, and what was assumed and is to be beware of."""
    verdict = study.verdict
    reasons = [
        {"test": each.test, "outcome": each.outcome, **plain(each), "text": reason_words(each, study, METRES)}
        for each in verdict.reasons
    ]
    steps = [{"kind": each.kind, **plain(each), "text": step_words(each, study, METRES)} for each in verdict.next_step]
    return {
        "outcome": verdict.outcome,
        "chance": None if verdict.chance is None else verdict.chance.value,
        "minimum_chance": verdict.minimum_chance,
        "headline": headline(study, METRES),
        "tested": list(verdict.tested),
        "clears": verdict.clears,
        "has_margin": verdict.has_margin,
        "meets_objective": verdict.meets_objective,
        "reasons": reasons,
        "next_step": {"text": steps_words(study, METRES), "any_of": steps},
        "assumptions": plain(study.assumptions),
        "warnings": plain(study.warnings),
    }


def _site(site: Site, ground_m: float, centre_m: float) -> dict[str, Any]:
    return {
        "name": site.name,
        "longitude": site.longitude,
        "latitude": site.latitude,
        "antenna_m": site.antenna_m,
        "ground_m": ground_m,
        "centre_m": centre_m,
        "ground_surveyed": site.surveyed_ground_m is not None,
        "position_notes": list(site.position_notes),
        **{name: getattr(site, name) for name in _SITE_FACTS},
    }


def _hop(study: Study) -> dict[str, Any]:
    hop, ground = study.hop, study.profile.ground_m
    return {
        "name": hop.name,
        "site_a": _site(hop.site_a, float(ground[0]), study.centre_a_m),
        "site_b": _site(hop.site_b, float(ground[-1]), study.centre_b_m),
        "frequency_hz": hop.frequency_hz,
        "polarization": hop.polarization,
        "median_k": study.climate.median_k,
        "frequencies_hz": hop.frequencies_hz,
        "equipment": None if hop.radio is None else _equipment(hop.radio),
        "document": plain(hop.document),
        "overrides": plain(hop.overrides),
    }


def _equipment(radio: Radio) -> dict[str, Any]:
    """Give what is said of the radio and carried as it stands."""
    found: dict[str, Any] = {"emission": radio.emission, "channel": radio.channel}
    for end, terminal in radio.terminals.items():
        found[f"terminal_{end.lower()}"] = {name: getattr(terminal, name) for name in _TERMINAL_FACTS}
    return found


def _path(study: Study) -> dict[str, Any]:
    return {
        "distance_m": study.line.distance_m,
        "azimuth_a_deg": study.line.azimuth_a_deg,
        "azimuth_b_deg": study.line.azimuth_b_deg,
        "elevation_a_deg": study.elevation_a_deg,
        "elevation_b_deg": study.elevation_b_deg,
        "points": study.line.points,
        "spacing_m": study.terrain.spacing_m,
    }


def _rule(result: RuleResult) -> dict[str, Any]:
    check = result.check
    return {
        **plain(check.rule),
        "passes": result.passes,
        "line_of_sight": check.line_of_sight,
        "critical": plain(result.critical),
        "tight": plain(result.places),
        "feet": plain(result.feet),
        "across": _across(result.held) if result.held.half_width_m > 0.0 else None,
        "elevation_a_deg": result.elevation_a_deg,
        "elevation_b_deg": result.elevation_b_deg,
        "reflections": [{**plain(place), "screened": place.screened} for place in result.reflections],
    }


def _across(held: HeldRule) -> dict[str, Any]:
    """Say how wide one rule was checked, and what was not seen."""
    return {
        "passes": held.passes,
        "surplus_m": held.surplus_m,
        "half_width_m": held.half_width_m,
        "missing_share": held.missing_share,
    }


def _direction(direction: Direction) -> dict[str, Any]:
    """Give one direction: the reference mode's lines stand at the top, every mode has its row."""
    return {**plain(direction), "lines": plain(direction.modes[0].lines)}


def _budget(budget: Budget) -> dict[str, Any]:
    return {**plain(budget), "a_to_b": _direction(budget.a_to_b), "b_to_a": _direction(budget.b_to_a)}


def _availability(study: Study) -> dict[str, Any] | None:
    """Give the outage of the reference mode, with the totals of every mode beside it."""
    found = study.outage.availability
    return None if found is None else {**plain(found), "modes": plain(study.outage.modes)}


def _confidence(study: Study) -> dict[str, Any] | None:
    """Give the confidence analysis without its per-point arrays, which are in the point table."""
    confidence = study.confidence
    if confidence is None:
        return None
    document: dict[str, Any] = plain(confidence)
    for row, found in zip(document["rules"], confidence.rules, strict=True):
        del row["surplus"], row["rule"]
        row |= {"k": found.rule.k, "fresnel_fraction": found.rule.fresnel_fraction, "margin_m": found.rule.margin_m}
    return document
