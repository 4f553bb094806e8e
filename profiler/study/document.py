"""A study as one plain document, ready for JSON: the keys that other people script against."""

from __future__ import annotations

import math
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from profiler.geometry import ray_height

if TYPE_CHECKING:
    from profiler.budget import Budget, Direction
    from profiler.geometry import CorridorCheck
    from profiler.models import Site
    from profiler.study.result import RuleResult, Study

__all__ = ["SCHEMA", "SCHEMA_HEIGHTS", "plain", "point_table", "to_document"]

SCHEMA = "hopwright-study/1"
SCHEMA_HEIGHTS = "hopwright-heights/1"


def plain(value: Any) -> Any:
    """Turn dataclasses into dictionaries, arrays and tuples into lists, paths into text, however deep.

    A number that is not finite becomes None, since JSON has no word for it.

    Examples
    --------
    >>> from profiler.models import Rule
    >>> plain({"rule": Rule(k=1.0, fresnel_fraction=0.6), "at_m": np.array([0.0, np.nan])})
    {'rule': {'k': 1.0, 'fresnel_fraction': 0.6, 'margin_m': 0.0, 'label': ''}, 'at_m': [0.0, None]}
    """
    if is_dataclass(value) and not isinstance(value, type):
        return {each.name: plain(getattr(value, each.name)) for each in fields(value)}
    if isinstance(value, dict):
        return {str(key): plain(each) for key, each in value.items()}
    if isinstance(value, tuple | list):
        return [plain(each) for each in value]
    if isinstance(value, np.ndarray | np.generic):
        return plain(value.tolist())
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return str(value) if isinstance(value, Path) else value


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
        "schema": SCHEMA,
        "hop": _hop(study),
        "path": _path(study),
        "terrain": plain(study.terrain),
        "rules": [_rule(result) for result in study.rules],
        "diffraction": plain(study.diffraction),
        "budget": None if study.budget is None else _budget(study.budget),
        "availability": _availability(study),
        "confidence": _confidence(study),
        "verdict": {
            **plain(study.verdict),
            "assumptions": list(study.assumptions),
            "warnings": list(study.warnings),
        },
        "provenance": plain(study.provenance),
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
    }


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
        "across": None if result.corridor is None else _across(result.corridor),
        "elevation_a_deg": result.elevation_a_deg,
        "elevation_b_deg": result.elevation_b_deg,
        "reflections": [{**plain(place), "screened": place.screened} for place in result.reflections],
    }


def _across(corridor: CorridorCheck) -> dict[str, Any]:
    """Say how wide one rule was checked, and what was not seen."""
    return {
        "passes": corridor.passes,
        "surplus_m": corridor.surplus_m,
        "half_width_m": corridor.half_width_m,
        "points_across": corridor.across,
        "missing_share": corridor.need.missing_share,
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


def point_table(study: Study) -> tuple[list[str], np.ndarray]:
    """Give the point table: the names of its columns and the numbers, one row for each point of the path.

    Columns: position, ground, cover, ray, and for each rule (numbered from 1 in the order of the study) bulge, F1,
    clearance, required clearance, surplus and ratio on the path, the least surplus over the width of the zone and the
    offset where that is; with a confidence analysis, the 5 % and 95 % surplus too.
    """
    profile = study.profile
    columns: dict[str, Any] = {
        "distance_m": profile.distance_m,
        "longitude": profile.longitude,
        "latitude": profile.latitude,
        "ground_m": profile.ground_m,
        "cover_m": profile.cover_m,
        "ray_m": ray_height(profile.distance_m, study.centre_a_m, study.centre_b_m),
        "filled": profile.filled.astype(float),
    }
    for number, result in enumerate(study.rules, start=1):
        check, corridor = result.check, result.corridor
        for name in ("bulge_m", "f1_m", "clearance_m", "required_m", "surplus_m", "ratio"):
            columns[f"rule{number}_{name}"] = getattr(check, name)
        columns[f"rule{number}_least_surplus_m"] = check.surplus_m if corridor is None else corridor.least_surplus_m
        columns[f"rule{number}_offset_m"] = np.zeros(check.f1_m.size) if corridor is None else corridor.need.offset_m
        if study.confidence is not None:
            band = study.confidence.rules[number - 1].surplus
            columns[f"rule{number}_surplus_5_percent_m"] = band.low_m
            columns[f"rule{number}_surplus_95_percent_m"] = band.high_m
    return list(columns), np.column_stack(list(columns.values()))
