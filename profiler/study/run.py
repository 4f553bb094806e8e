"""The composer: every stage in its order, for one hop."""

from __future__ import annotations

from collections.abc import Sequence
from contextlib import nullcontext
from typing import TYPE_CHECKING

import numpy as np

from profiler.errors import InputError, under
from profiler.geometry import elevation_angle, find_reflections, hold_rules
from profiler.models import ConfidenceChoice, Hop
from profiler.remarks import Note, Remark, k_text, note, prefixed
from profiler.study.climate_numbers import ClimateUse, climate_numbers
from profiler.study.ground import Ground, read_ground, require_above_cover
from profiler.study.ground_warnings import ground_warnings
from profiler.study.link import Air, Link, air_along, link
from profiler.study.places import find_places
from profiler.study.provenance import provenance
from profiler.study.result import RuleResult, Study
from profiler.study.said_once import gathered
from profiler.study.verdict import judge
from profiler.terrain import Terrain, open_terrain, require_inside

if TYPE_CHECKING:
    from profiler.confidence import Confidence
    from profiler.heights import ClearingRegion, DiversityEnd

__all__ = ["open_hop_terrain", "run_study"]


def open_hop_terrain(hop: Hop) -> Terrain:
    """Open the terrain that a hop names, as it asks for it.

    Raises
    ------
    InputError, RasterError
        For rasters that do not exist or cannot be used.
    """
    choice = hop.terrain
    return open_terrain(
        choice.paths,
        method=choice.method,
        allow_mixed_datums=choice.allow_mixed_datums,
        vertical_datum=choice.vertical_datum,
        height_unit=choice.height_unit,
        allow_network=choice.allow_network,
        voids_are_sea=choice.voids_are_sea,
    )


def run_study(hop: Hop, terrain: Terrain | None = None, *, relief: bool = False, losses: bool = True) -> Study:
    """Study one hop: ground, clearance under every rule, losses, margin, availability and confidence.

    Parameters
    ----------
    hop
        The hop.
    terrain
        The open terrain, to use it for several hops; by default the hop's own is opened and closed.
    relief
        Whether to read the ground to both sides too, for the figure's view from above.
    losses
        Whether to go on to diffraction, budget and outage. Without them the result holds clearance and confidence
        alone, and an antenna may stand in its own cover: where heights are sought, the given ones are a first guess.

    Returns
    -------
    Study

    Raises
    ------
    HopwrightError
        If anything is wrong with the input; one line says what, where, and what to do.
    """
    with open_hop_terrain(hop) if terrain is None else nullcontext(terrain) as source:
        for site in (hop.site_a, hop.site_b):  # first of all: a swapped position also spoils the path and the climate
            require_inside(source, site.name, site.longitude, site.latitude)
        climate = climate_numbers(hop)
        ground = read_ground(hop, source, relief=relief, around=climate.roughness_points)
    if losses:
        require_above_cover(hop, ground.profile)
    climate = climate.with_roughness(ground.heights_around_m)
    profile = ground.profile
    centre_a_m = float(profile.ground_m[0]) + hop.site_a.antenna_m
    centre_b_m = float(profile.ground_m[-1]) + hop.site_b.antenna_m
    rules = _hold(hop, ground, centre_a_m, centre_b_m)
    air = air_along(hop, profile, climate.median_k, centre_a_m, centre_b_m)
    regions = _lower_regions(hop, ground, climate.median_k)
    lower = _lower_antennas(hop, regions)
    clears = (lower[0].clears, lower[1].clears) if lower else (True, True)
    found = Link.none()
    if losses:
        cell_m = ground.terrain.finest_cell_m
        found = link(hop, profile, climate, air, centre_a_m, centre_b_m, cell_m=cell_m, lower_clears=clears)
    confidence = _confidence(hop, ground, climate, rules)
    angles = _angles(ground, centre_a_m, centre_b_m, climate.median_k)
    return Study(
        hop=hop,
        line=ground.line,
        profile=profile,
        centre_a_m=centre_a_m,
        centre_b_m=centre_b_m,
        elevation_a_deg=angles[0],
        elevation_b_deg=angles[1],
        terrain=ground.terrain,
        rules=rules,
        diffraction=tuple(found.losses[k] for k in dict.fromkeys(rule.k for rule in hop.rules) if losses),
        median_diffraction=found.losses.get(climate.median_k),
        air=air,
        budget=found.budget,
        outage=found.outage,
        confidence=confidence,
        surface=ground.surface,
        lower_regions=regions,
        climate=climate,
        relief=ground.relief,
        verdict=judge(hop, profile.distance_m, rules, found.budget, found.outage, confidence),
        provenance=provenance(hop, ground.files),
        assumptions=_assumptions(hop, ground, climate, air, found),
        warnings=(*_lower_warnings(lower), *_warnings(hop, ground, rules, air, found)),
    )


def _angles(ground: Ground, centre_a_m: float, centre_b_m: float, k: float) -> tuple[float, float]:
    """Elevation angles at A and at B, degrees."""
    distance_m = ground.line.distance_m
    return (
        float(elevation_angle(distance_m, centre_a_m, centre_b_m, k)),
        float(elevation_angle(distance_m, centre_b_m, centre_a_m, k)),
    )


def _hold(hop: Hop, ground: Ground, centre_a_m: float, centre_b_m: float) -> tuple[RuleResult, ...]:
    """Hold every rule against the path and what stands beside it."""
    profile = ground.profile
    path = (profile.distance_m, profile.surface_m, centre_a_m, centre_b_m, hop.frequency_hz)
    rays = [(rule, centre_a_m, centre_b_m) for rule in hop.rules]
    results = []
    for held in hold_rules(ground.surface, rays, hop.frequency_hz):
        elevation_a_deg, elevation_b_deg = _angles(ground, centre_a_m, centre_b_m, held.check.rule.k)
        tight = find_places(held, profile, ground.line, hop.frequency_hz)
        results.append(
            RuleResult(
                held=held,
                critical=tight.critical,
                places=tight.places,
                feet=tight.feet,
                elevation_a_deg=elevation_a_deg,
                elevation_b_deg=elevation_b_deg,
                reflections=find_reflections(*path, k=held.check.rule.k),
            )
        )
    return tuple(results)


def _confidence(hop: Hop, ground: Ground, climate: ClimateUse, rules: Sequence[RuleResult]) -> Confidence | None:
    """How sure the clearance is, where the hop file says how wrong the terrain may be."""
    choice, profile = hop.confidence, ground.profile
    if choice is None:
        return None
    percentiles = climate.k_percentiles if choice.vary_k else ()
    if choice.vary_k and not percentiles:
        raise InputError(
            "confidence.vary_k = true: must come with availability.k_percentiles or the climate maps; give one of them,"
            " or set it to false"
        )
    from profiler.confidence import assess

    with under("confidence", ConfidenceChoice):
        return assess(
            profile.distance_m,
            profile.ground_m,
            profile.cover_m,
            hop.site_a.antenna_m,
            hop.site_b.antenna_m,
            hop.frequency_hz,
            hop.rules,
            choice,
            cell_m=ground.terrain.finest_cell_m,
            surveyed=(bool(profile.surveyed[0]), bool(profile.surveyed[-1])),
            beside_m=np.stack([result.check.surplus_m - result.least_surplus_m for result in rules]),
            k_percentiles=percentiles,
        )


def _assumptions(hop: Hop, ground: Ground, climate: ClimateUse, air: Air, found: Link) -> tuple[Remark, ...]:
    """Everything that was assumed, in the order of the stages, each thing once."""
    terrain = ground.terrain
    sources = gathered((use.info.path.name, note) for use in terrain.sources for note in use.notes)
    datum = terrain.vertical_datum or "not stated; heights are taken to share one datum"
    return tuple(
        dict.fromkeys(
            [
                *hop.assumptions,
                *climate.assumptions,
                *(f"{site.name}: {note}" for site in (hop.site_a, hop.site_b) for note in site.position_notes),
                note(
                    "ground",
                    f"ground between cell centres: {terrain.method}, exact along the path however densely it is listed",
                ),
                note("ground", "vertical datum: {}", datum),
                *sources,
                *terrain.notes,
                *terrain.cover_notes,
                note(
                    "diffraction",
                    f"diffraction: {hop.diffraction.method} over ground and cover; budget at k ="
                    f" {k_text(climate.median_k)}",
                ),
                prefixed("air", air.source),
                *(_doubt_assumptions(hop.confidence) if hop.confidence is not None else ()),
                *(found.budget.assumptions if found.budget is not None else ()),
                *found.outage.assumptions,
            ]
        )
    )


def _doubt_assumptions(choice: ConfidenceChoice) -> tuple[Note, ...]:
    return (
        note("confidence", "terrain error: {}", choice.terrain_source),
        note("confidence", "terrain error: ground beside the path has the error of the path's own point next to it"),
    )


def _lower_regions(hop: Hop, ground: Ground, median_k: float) -> tuple[ClearingRegion, ...]:
    """Heights at which the lower antennas of a diversity pair clear; empty without diversity."""
    if hop.availability is None or hop.availability.diversity is None:
        return ()
    from profiler.study.requirements import lower_regions

    return lower_regions(hop, ground.profile, ground.surface, median_k)


def _lower_antennas(hop: Hop, regions: tuple[ClearingRegion, ...]) -> tuple[DiversityEnd, ...]:
    """Hold the lower antennas of a diversity pair to their clearance; empty without diversity."""
    if not regions:
        return ()
    from profiler.study.requirements import lower_antennas

    return lower_antennas(hop, regions, antenna_a_m=hop.site_a.antenna_m, antenna_b_m=hop.site_b.antenna_m)


def _lower_warnings(ends: Sequence[DiversityEnd]) -> tuple[Remark, ...]:
    """Warn of lower antennas of a diversity pair that lack the clearance under which their improvement is credited."""
    return tuple(
        Note("diversity", ("diversity at ", *end.notes[0].parts, "; no improvement is credited to what it receives"))
        for end in ends
        if not end.clears
    )


def _warnings(hop: Hop, ground: Ground, rules: Sequence[RuleResult], air: Air, found: Link) -> tuple[Remark, ...]:
    """Every warning of every stage, each once."""
    return tuple(
        dict.fromkeys(
            [
                *ground.terrain.warnings,
                *ground_warnings(hop, ground.terrain, rules),
                *(warning for loss in found.losses.values() for warning in loss.warnings),
                *air.warnings,
                *(found.budget.warnings if found.budget is not None else ()),
                *found.outage.warnings,
            ]
        )
    )
