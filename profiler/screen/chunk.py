"""Screen some pairs that lie near one another: the kernel where one grid holds them, a full study where it does not.

The kernel answers for clearance over bare ground from one grid. A pair that needs more (cover, ground from several
grids, a radio, an objective, an error of the terrain) is studied in full, so that every row is what a study would say.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from profiler.errors import HopwrightError, RasterError
from profiler.geometry import ROUNDING_M, fresnel_radius, hold_rules
from profiler.models import CoverChoice, Hop, Site
from profiler.screen.beside import Beside, least_beside
from profiler.screen.blocks import Blocks, build_blocks
from profiler.screen.least import Sight, least_surplus
from profiler.screen.lines import GridLines, Ints, grid_lines
from profiler.screen.losses import delta_bullington_losses
from profiler.screen.pairs import Pairs
from profiler.screen.rows import OK, Rows
from profiler.study import run_study
from profiler.terrain import Terrain
from profiler.units import K_MEDIAN, SPEED_OF_LIGHT_M_S, Float

__all__ = ["Template", "hop_of", "screen_chunk"]

_MOST_CELLS = 25_000_000
"""Of one window: 300 MB while it is read. Pairs that span more are cut in two; one that does alone is studied."""


@dataclass(frozen=True, slots=True)
class Template:
    """What all pairs share: a hop whose sites are replaced, and whether the ground beside the path is looked at."""

    hop: Hop
    beside: bool = True

    @property
    def by_kernel(self) -> bool:
        """Whether clearance over bare ground is all that a study would look at."""
        hop = self.hop
        plain = hop.radio is None and hop.availability is None and hop.confidence is None
        bare = hop.cover == CoverChoice() and hop.terrain.method == "bilinear" and not hop.terrain.voids_are_sea
        return plain and bare and hop.diffraction.method == "delta-bullington" and hop.terrain.missing == "stop"


def hop_of(template: Hop, pairs: Pairs, row: int) -> Hop:
    """Give the hop of one pair: the template with its sites, heights and frequency."""

    def site(end: str, given: Site) -> Site:
        antenna_m = float(getattr(pairs, f"antenna_{end}_m")[row])
        return Site(
            name=f"{pairs.ids[row]} {end.upper()}",
            longitude=float(getattr(pairs, f"longitude_{end}")[row]),
            latitude=float(getattr(pairs, f"latitude_{end}")[row]),
            antenna_m=given.antenna_m if math.isnan(antenna_m) else antenna_m,
        )

    frequency_ghz = float(pairs.frequency_ghz[row])
    if not math.isnan(frequency_ghz):
        template = replace(template, frequency_hz=frequency_ghz * 1e9, two_frequencies_hz=None)
    ends = site("a", template.site_a), site("b", template.site_b)
    return replace(template, name=str(pairs.ids[row]), site_a=ends[0], site_b=ends[1])


def screen_chunk(template: Template, pairs: Pairs, terrain: Terrain) -> Rows:
    """Screen pairs, one row for each in their order.

    Parameters
    ----------
    template
        What they share.
    pairs
        Pairs that lie near one another: the ground of all of them is read at once.
    terrain
        The open terrain of the template.

    Returns
    -------
    Rows
    """
    rows = Rows.empty(len(pairs), len(template.hop.rules))
    good = np.array([i for i, problem in enumerate(pairs.problem) if not problem], dtype=np.int64)
    for i, problem in enumerate(pairs.problem):
        rows.status[i] = problem or OK
    left = good
    if good.size and template.by_kernel:
        left = _by_kernel(template, pairs, terrain, good, rows)
    for i in left.tolist():
        rows.put(np.array([i]), _studied(hop_of(template.hop, pairs, i), terrain))
    return rows


def _studied(hop: Hop, terrain: Terrain) -> Rows:
    """Study one pair in full; what stops a study becomes the words of its status."""
    rows = Rows.empty(1, len(hop.rules))
    try:
        study = run_study(hop, terrain)
        feet = [(rule, float(study.profile.ground_m[0]), float(study.profile.ground_m[-1])) for rule in hop.rules]
        short_m = -min(held.surplus_m for held in hold_rules(study.surface, feet, hop.frequency_hz))
    except HopwrightError as error:
        return replace(rows, status=[" ".join(str(error).split())])
    surpluses = [result.critical.surplus_m for result in study.rules]
    number = int(np.argmin(surpluses))
    place, loss = study.rules[number].critical, study.median_diffraction
    margin_db = None if study.budget is None else study.budget.weaker()[1].fade_margin_db
    numbers = {
        "distance_m": study.line.distance_m,
        "azimuth_a_deg": study.line.azimuth_a_deg,
        "azimuth_b_deg": study.line.azimuth_b_deg,
        "surplus_m": place.surplus_m,
        "surplus_at_m": place.distance_m,
        "surplus_offset_m": place.offset_m,
        "rule": number + 1,
        "diffraction_db": None if loss is None else loss.loss_db,
        "least_equal_m": max(short_m, 0.0),
        "fade_margin_db": margin_db,
        "chance": None if study.verdict.chance is None else study.verdict.chance.value,
        "studied": 1.0,
    }
    columns = {name: np.array([np.nan if value is None else value]) for name, value in numbers.items()}
    return replace(rows, status=[OK], outcome=[study.verdict.outcome], rule_surplus_m=np.array([surpluses]), **columns)


def _by_kernel(template: Template, pairs: Pairs, terrain: Terrain, which: Ints, rows: Rows) -> Ints:
    """Screen pairs over one grid; return those that it does not hold."""
    chosen = pairs.take(which)
    ends = chosen.longitude_a, chosen.latitude_a, chosen.longitude_b, chosen.latitude_b
    lattice = terrain.lattice(np.concatenate(ends[::2]), np.concatenate(ends[1::2]))
    if lattice is None or not lattice.alone:
        return which
    lines = grid_lines(*ends, lattice.to_cells)
    window = _window(lines, _reach_m(template, chosen, lines))
    if (window[1] - window[0]) * (window[3] - window[2]) > _MOST_CELLS:
        if which.size == 1:
            return which
        halves = np.array_split(which[np.argsort(lines.main[0] + lines.main[-1])], 2)
        return np.sort(np.concatenate([_by_kernel(template, pairs, terrain, half, rows) for half in halves]))
    try:
        blocks = build_blocks(terrain.window(lattice, window[:2], window[2:]))
    except RasterError:  # a cell that spoils the window is in the way of few pairs: a study finds out whose
        return which
    found = _cleared(template, chosen, lines.moved(window[2], window[0]), blocks)
    known = np.flatnonzero(np.isfinite(found.surplus_m))
    rows.put(which[known], found.take(known))
    return np.delete(which, known)


def _reach_m(template: Template, pairs: Pairs, lines: GridLines) -> float:
    """Greatest radius of any rule's zone on any path."""
    frequency_hz = np.fmin(1e9 * np.nanmin(pairs.frequency_ghz, initial=np.inf), template.hop.frequency_hz)
    half = 0.5 * lines.distance_m.max()
    fraction = max(rule.fresnel_fraction for rule in template.hop.rules)
    return fraction * float(fresnel_radius(half, half, frequency_hz))


def _window(lines: GridLines, reach_m: float) -> tuple[int, int, int, int]:
    """First and end row, first and end column of what holds every path and the zones beside it."""
    hops = np.arange(lines.distance_m.size)
    cross = lines.cross(lines.main.T, hops).T
    across_m, _ = lines.beside(lines.main.T, hops)
    spare = 3 + int(np.ceil(reach_m / np.abs(across_m).min()))
    columns, rows = np.where(lines.turned, cross, lines.main), np.where(lines.turned, lines.main, cross)
    top, left = (int(np.floor(side.min())) - spare for side in (rows, columns))
    bottom, right = (int(np.ceil(side.max())) + spare + 1 for side in (rows, columns))
    return top, bottom, left, right


def _cleared(template: Template, pairs: Pairs, lines: GridLines, blocks: Blocks) -> Rows:
    """Hold every rule against every pair: the numbers of a study of clearance."""
    hop, rules = template.hop, template.hop.rules
    given = (hop.site_a.antenna_m, pairs.antenna_a_m), (hop.site_b.antenna_m, pairs.antenna_b_m)
    antenna_a_m, antenna_b_m = (np.where(np.isnan(own), shared, own) for shared, own in given)
    frequency_hz = np.where(np.isnan(pairs.frequency_ghz), hop.frequency_hz, 1e9 * pairs.frequency_ghz)
    wavelength_m = SPEED_OF_LIGHT_M_S / frequency_hz
    ground_a_m, ground_b_m = blocks.height(lines.column_a, lines.row_a), blocks.height(lines.column_b, lines.row_b)
    centres = ground_a_m + antenna_a_m, ground_b_m + antenna_b_m
    sight = Sight.of(rules, *centres, wavelength_m)
    held = _held(template, lines, blocks, sight)
    lowest = held.surplus_m.argmin(axis=0)
    hops = np.arange(len(pairs))
    rows = Rows.empty(len(pairs), len(rules))
    whole = np.flatnonzero(np.isfinite(held.surplus_m).all(axis=0))
    passes = np.asarray((held.surplus_m >= -ROUNDING_M).all(axis=0))
    loss_db = np.full(len(pairs), np.nan)
    if whole.size:
        loss_db[whole] = delta_bullington_losses(
            lines.take(whole),
            blocks,
            centres[0][whole],
            centres[1][whole],
            wavelength_m[whole],
            hop.median_k or K_MEDIAN,
            polarization=hop.polarization,
            sea_fraction=hop.diffraction.sea_fraction,
        )
    return replace(
        rows,
        status=[OK] * len(pairs),
        outcome=["passes" if each else "fails" for each in passes.tolist()],
        distance_m=lines.distance_m,
        azimuth_a_deg=lines.azimuth_a_deg,
        azimuth_b_deg=lines.azimuth_b_deg,
        surplus_m=held.surplus_m[lowest, hops],
        surplus_at_m=held.distance_m[lowest, hops],
        surplus_offset_m=held.offset_m[lowest, hops],
        rule=lowest + 1.0,
        rule_surplus_m=held.surplus_m.T,
        diffraction_db=loss_db,
        studied=np.zeros(len(pairs)),
        least_equal_m=_least_equal(template, lines, blocks, sight, (antenna_a_m, antenna_b_m), held),
    )


def _held(template: Template, lines: GridLines, blocks: Blocks, sight: Sight) -> Beside:
    """Least surplus of every rule and hop, along the path and, where that is wanted, beside it."""
    along = least_surplus(lines, blocks, sight)
    if template.beside:
        return least_beside(lines, blocks, sight, template.hop.rules, along)
    return Beside(along.surplus_m, along.distance_m, np.zeros_like(along.surplus_m))


def _least_equal(
    template: Template, lines: GridLines, blocks: Blocks, sight: Sight, antennas_m: tuple[Float, Float], held: Beside
) -> Float:
    """Least height of both antennas alike: what a ray along the ground at both sites is short by.

    Raising both alike lifts the ray alike everywhere, so that where they stand equally high the answer is known.
    """
    least = antennas_m[0] - held.surplus_m.min(axis=0)
    other = np.flatnonzero(antennas_m[0] != antennas_m[1])
    if other.size:
        low = sight.take(other)
        low = replace(
            low, centre_a_m=low.centre_a_m - antennas_m[0][other], centre_b_m=low.centre_b_m - antennas_m[1][other]
        )
        least[other] = -_held(template, lines.take(other), blocks, low).surplus_m.min(axis=0)
    return np.asarray(np.maximum(least, 0.0))
