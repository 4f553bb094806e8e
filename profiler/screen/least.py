"""Least surplus of many hops over one grid, and where it is, along the path: exact, though most of it is not looked at.

Between crossings with the lines through cell centres the bilinear ground along a path is a parabola of the distance, so
crossings and the lowest inside of each such piece give the exact least. A path is cut into segments, one for each
column of blocks that it crosses. Ray, bulge and zone together are convex over the ground, so a tangent at the middle of
a segment and the highest cell of its blocks bound its surplus from below: first the segments with the least bounds are
opened, then those that could still hold less.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from profiler.models import Rule
from profiler.screen.blocks import BLOCK, Blocks
from profiler.screen.lines import GridLines, Ints
from profiler.units import MEAN_EARTH_RADIUS_M, Float

__all__ = [
    "LeastSurplus",
    "Opened",
    "Segments",
    "Sight",
    "least_surplus",
    "lower_bounds",
    "open_segments",
    "segments_of",
    "strides",
]

_SPARE = 1e-3
"""Cells that a path may bend out of the box around both ends of a segment: far more than a geodesic does."""

_LOOKS, _ZOOMS = 9, 4
"""Looks into a piece, and how often it is narrowed to the neighbours of the lowest: a 250th of a piece is left."""


@dataclass(frozen=True, slots=True, eq=False)
class Sight:
    """What the ground is held against: centres and wavelengths of the hops, (hops,), and rules, (rules, 1)."""

    centre_a_m: Float
    centre_b_m: Float
    wavelength_m: Float
    per_metre: Float
    fraction: Float
    margin_m: Float

    @classmethod
    def of(cls, rules: Sequence[Rule], centre_a_m: Float, centre_b_m: Float, wavelength_m: Float) -> Sight:
        """Lay out some rules; ``per_metre`` is 1/(2·k·R), what the bulge takes for each square metre of d1·d2."""
        k, fraction, margin_m = np.array([(rule.k, rule.fresnel_fraction, rule.margin_m) for rule in rules]).T
        per_metre = 1.0 / (2.0 * k * MEAN_EARTH_RADIUS_M)
        return cls(centre_a_m, centre_b_m, wavelength_m, per_metre[:, None], fraction[:, None], margin_m[:, None])

    def take(self, hops: Ints) -> Sight:
        """Return the same rules over some hops, in the order given."""
        a, b, wavelength = (each[hops] for each in (self.centre_a_m, self.centre_b_m, self.wavelength_m))
        return Sight(a, b, wavelength, self.per_metre, self.fraction, self.margin_m)


@dataclass(frozen=True, slots=True, eq=False)
class Segments:
    """Every path cut at the borders of blocks: hop, column of blocks, both ends along the main axis, (segments,).

    ``start`` (hops,) is each hop's first segment; a hop's segments follow one another.
    """

    hop: Ints
    block: Ints
    first: Float
    last: Float
    start: Ints


@dataclass(frozen=True, slots=True, eq=False)
class Opened:
    """Segments laid open at their crossings, (segments, points): distance, height, and how each piece between bends.

    ``bend_m`` (segments, points - 1) is c of h(t) = h0 + (h1 - h0)·t + c·(t² - t), t from 0 to 1 along the piece.
    """

    distance_m: Float
    height_m: Float
    bend_m: Float


@dataclass(frozen=True, slots=True, eq=False)
class LeastSurplus:
    """Least surplus and its distance from A, (rules, hops), NaN where ground is missing on the way; share opened."""

    surplus_m: Float
    distance_m: Float
    opened: float


def segments_of(lines: GridLines) -> Segments:
    """Cut every path where it crosses from one column of blocks to the next along its main axis."""
    first_block = np.floor(lines.first_main / BLOCK).astype(np.int64)
    count = np.maximum(np.ceil(lines.last_main / BLOCK).astype(np.int64) - first_block, 1)
    start = np.cumsum(count) - count
    hop = np.repeat(np.arange(count.size), count)
    block = np.arange(hop.size) - start[hop] + first_block[hop]
    return Segments(
        hop=hop,
        block=block,
        first=np.maximum(block * BLOCK, lines.first_main[hop]),
        last=np.minimum((block + 1) * BLOCK, lines.last_main[hop]),
        start=start,
    )


def least_surplus(lines: GridLines, blocks: Blocks, sight: Sight) -> LeastSurplus:
    """Find the least surplus of every hop under every rule along its path.

    Parameters
    ----------
    lines
        The paths, all of them within the grid.
    blocks
        The ground.
    sight
        Antenna centres above the datum of the ground, wavelengths and rules.

    Returns
    -------
    LeastSurplus

    Examples
    --------
    A ridge 30 m high halfway between antennas 40 m up, with no zone and a flat earth:

    >>> from profiler.screen import build_blocks, grid_lines
    >>> ground = np.zeros((40, 101)); ground[:, 50] = 30.0
    >>> ends = (np.array([value]) for value in (10.05, 0.0, 10.95, 0.0))
    >>> lines = grid_lines(*ends, lambda lon, lat: (100 * (lon - 10), 20 - 100 * lat))
    >>> flat = Sight.of([Rule(k=1e9, fresnel_fraction=0)], *(np.array([value]) for value in (40.0, 40.0, 0.05)))
    >>> found = least_surplus(lines, build_blocks(ground), flat)
    >>> found.surplus_m.round(6).tolist(), found.distance_m.round().tolist()
    ([[10.0]], [[50094.0]])
    """
    segments = segments_of(lines)
    least = lower_bounds(lines, blocks, sight, segments)
    hops = lines.distance_m.size
    best, at = (np.full((len(sight.fraction), hops), fill) for fill in (np.inf, np.nan))
    opened = np.zeros(segments.hop.size, dtype=bool)
    # a missing cell makes the bound of its block -inf, so that every gap near the path is looked at in the first round
    bar = np.minimum.reduceat(least, segments.start, axis=1)
    for _ in range(2):
        now = np.flatnonzero((least <= bar[:, segments.hop]).any(axis=0) & ~opened)
        opened[now] = True
        for part in np.array_split(now, max(1, now.size // _AT_ONCE)):
            _lower(best, at, segments.hop[part], *_least_of(lines, blocks, sight, segments, part, best))
        bar = np.where(np.isnan(best), -np.inf, best)
    return LeastSurplus(best, np.where(np.isnan(best), np.nan, at), float(opened.mean()))


_AT_ONCE = 4096
"""Segments opened together: their arrays of some 33 points stay in a core's cache."""


def lower_bounds(
    lines: GridLines, blocks: Blocks, sight: Sight, segments: Segments, *, aside_m: Float | float = 0.0
) -> Float:
    """Bound the surplus of every segment from below, (rules, segments), as far as some metres beside the path."""
    hop, final = segments.hop, np.append(segments.start[1:], segments.hop.size) - 1
    main = np.append(segments.first, segments.last[final])
    owner = np.append(hop, hop[final])
    cross, metres = lines.cross(main, owner), lines.metres(main, owner)
    # a segment ends where the next begins, and each hop's last one at the hop's own end
    following = np.arange(1, hop.size + 1)
    following[final] = hop.size + np.arange(final.size)
    low, high = (pick(cross[: hop.size], cross[following]) for pick in (np.minimum, np.maximum))
    spare: Float | float = _SPARE
    if np.any(aside_m):
        spare = aside_m / np.abs(lines.beside(0.5 * (segments.first + segments.last), hop)[0])
    along, across = strides(lines.turned[hop], blocks.block_columns)
    near, far = (np.floor(side).astype(np.int64) // BLOCK for side in (np.maximum(low - spare, 0.0), high + spare))
    top = np.full(hop.size, -np.inf)
    for further in range(int((far - near).max(initial=0)) + 1):
        place = segments.block * along + np.minimum(near + further, far) * across
        np.maximum(top, blocks.highest_m[np.minimum(place, blocks.highest_m.size - 1)], out=top)

    here, there = metres[: hop.size], metres[following]
    middle, half = 0.5 * (here + there), 0.5 * np.abs(there - here) + aside_m
    length = lines.distance_m[hop]
    rise = (sight.centre_b_m - sight.centre_a_m)[hop] / length
    ray = sight.centre_a_m[hop] + rise * middle
    product, turn = middle * (length - middle), length - 2.0 * middle
    radius = np.sqrt(sight.wavelength_m[hop] * product / length)
    # the convex part lies above its tangent: at most the slope times half the length below its middle
    value = ray - sight.per_metre * product - sight.fraction * radius - sight.margin_m
    slope = rise - turn * (sight.per_metre + sight.fraction * radius / (2.0 * product))
    return np.asarray(value - np.abs(slope) * half - top)


def strides(turned: np.ndarray, columns: int) -> tuple[Ints, Ints]:
    """Give the steps in a flat grid along the main axis and along the cross axis."""
    return np.where(turned, columns, 1), np.where(turned, 1, columns)


def open_segments(lines: GridLines, blocks: Blocks, segments: Segments, which: Ints) -> Opened:
    """Lay segments open at every crossing with a line of cell centres.

    The main axis crosses a line at every whole number. Between two of those the path moves by at most one cell across,
    so that it crosses one line of the other axis or none: a column, the crossing, the next column, and so on. Where
    there is no crossing its place is the middle.
    """
    hop, first = segments.hop[which], segments.block[which, None] * BLOCK
    low, high = lines.first_main[hop, None], lines.last_main[hop, None]
    main = np.clip(first + np.arange(BLOCK + 1), low, high)
    # a strip that lies beyond the path's end has no width: it stays in the last column that the path is in
    column = np.clip(first + np.arange(BLOCK), np.floor(low), np.maximum(np.ceil(high) - 1, np.floor(low)))
    cross, metres = lines.cross(main, hop), lines.metres(main, hop)
    from_row, to_row = np.floor(cross[:, :-1]), np.floor(cross[:, 1:])
    crosses = from_row != to_row
    line = np.maximum(from_row, to_row)
    step = cross[:, 1:] - cross[:, :-1]
    share = np.divide(line - cross[:, :-1], step, out=np.full_like(step, 0.5), where=crosses)
    middle_cross = np.where(crosses, line, cross[:, :-1] + step * share)
    left, right = main[:, :-1] - column, main[:, 1:] - column
    middle = left + (right - left) * share

    along, across = (stride[:, None] for stride in strides(lines.turned[hop], blocks.columns))
    before = _Cells.at(blocks, column, from_row, along, across)
    after = _Cells.at(blocks, column, to_row, along, across)
    shape = (which.size, 2 * BLOCK + 1)
    distance_m, height_m, bend_m = np.empty(shape), np.empty(shape), np.empty((shape[0], shape[1] - 1))
    distance_m[:, ::2] = metres
    distance_m[:, 1::2] = metres[:, :-1] + (metres[:, 1:] - metres[:, :-1]) * share
    height_m[:, :-1:2] = before.height(left, cross[:, :-1] - from_row)
    height_m[:, 1::2] = before.height(middle, middle_cross - from_row)
    height_m[:, -1] = after.height(right, cross[:, 1:] - to_row)[:, -1]
    bend_m[:, ::2] = before.twist * (middle - left) * (middle_cross - cross[:, :-1])
    bend_m[:, 1::2] = after.twist * (right - middle) * (cross[:, 1:] - middle_cross)
    return Opened(distance_m, height_m, bend_m)


@dataclass(frozen=True, slots=True, eq=False)
class _Cells:
    """The four cells around places: the first, and what the others add along, across and both ways."""

    first: Float
    along: Float
    across: Float
    twist: Float

    @classmethod
    def at(cls, blocks: Blocks, column: Float, row: Float, along: Ints, across: Ints) -> _Cells:
        first = column.astype(np.int64) * along + row.astype(np.int64) * across
        most = blocks.cells_m.size - 1  # a place on the last line of cells has no weight beyond it
        near, next_along, next_across, opposite = (
            blocks.cells_m[np.minimum(first + step, most)].astype(float) for step in (0, along, across, along + across)
        )
        return cls(near, next_along - near, next_across - near, near + opposite - next_along - next_across)

    def height(self, along: Float, across: Float) -> Float:
        """Bilinear height, shares of a cell along both axes."""
        return self.first + self.along * along + (self.across + self.twist * along) * across


def _least_of(
    lines: GridLines, blocks: Blocks, sight: Sight, segments: Segments, which: Ints, best: Float
) -> tuple[Float, Float]:
    """Exact least surplus of segments and where it is, (rules, segments)."""
    opened, hop = open_segments(lines, blocks, segments, which), segments.hop[which]
    length = lines.distance_m[hop, None]
    rise = (sight.centre_b_m - sight.centre_a_m)[hop, None] / length
    over = sight.centre_a_m[hop, None] + rise * opened.distance_m - opened.height_m
    product = np.maximum(opened.distance_m * (length - opened.distance_m), 0.0)
    radius = np.sqrt(sight.wavelength_m[hop, None] / length * product)
    span = np.diff(opened.distance_m)
    # how deep the zone can dip inside a piece: its curvature is F1/(4·m²) and less, m the way to the nearer antenna
    near = np.minimum(opened.distance_m, length - opened.distance_m)
    dip = 0.125 * span**2 * np.minimum(radius[:, 1:], radius[:, :-1]) / np.maximum(_lesser(near), 1.0) ** 2
    sag = np.maximum(-opened.bend_m, 0.0) / 4.0
    rows = np.arange(which.size)
    least, at = np.empty((len(sight.fraction), which.size)), np.empty((len(sight.fraction), which.size))
    for rule, (per_metre, fraction, margin_m) in enumerate(
        zip(sight.per_metre[:, 0], sight.fraction[:, 0], sight.margin_m[:, 0], strict=True)
    ):
        surplus = over - per_metre * product - fraction * radius - margin_m
        lowest = surplus.argmin(axis=1)
        least[rule], at[rule] = surplus[rows, lowest], opened.distance_m[rows, lowest]
        bar = np.fmin(least[rule], best[rule, hop])[:, None]
        deep = _lesser(surplus) - sag - 0.25 * per_metre * span**2 - fraction * dip < bar
        row, piece = np.nonzero(deep & (span != 0.0))
        if row.size:
            ends = np.stack([piece, piece + 1])
            asked = (sight.wavelength_m[hop[row]], per_metre, fraction, margin_m)
            piece_ends = over[row, ends], opened.distance_m[row, ends]
            inside, where = _inside(*piece_ends, opened.bend_m[row, piece], length[row, 0], asked)
            _fold(least[rule], at[rule], row, inside, where)
    return least, at


def _lesser(values: Float) -> Float:
    """Lesser of both ends of every piece."""
    return np.minimum(values[:, 1:], values[:, :-1])


def _inside(
    over: Float, ends_m: Float, bend_m: Float, length_m: Float, rule: tuple[Float, float, float, float]
) -> tuple[Float, Float]:
    """Least surplus inside pieces and where: ``over`` and ``ends_m`` (2, pieces) are ray over ground, and distances."""
    wavelength_m, per_metre, fraction, margin_m = rule
    low, high = np.zeros(bend_m.size), np.ones(bend_m.size)
    pieces = np.arange(bend_m.size)
    for _ in range(_ZOOMS):
        t = low + (high - low) * np.linspace(0.0, 1.0, _LOOKS)[:, None]
        distance_m = ends_m[0] + (ends_m[1] - ends_m[0]) * t
        product = np.maximum(distance_m * (length_m - distance_m), 0.0)
        surplus = over[0] + (over[1] - over[0]) * t + bend_m * (t - t * t) - per_metre * product - margin_m
        surplus -= fraction * np.sqrt(wavelength_m / length_m * product)
        lowest = surplus.argmin(axis=0)
        low, high = t[np.maximum(lowest - 1, 0), pieces], t[np.minimum(lowest + 1, _LOOKS - 1), pieces]
    return surplus[lowest, pieces], distance_m[lowest, pieces]


def _fold(least: Float, at: Float, row: Ints, inside: Float, where: Float) -> None:
    """Lower the least of rows, in place, where an inside is lower."""
    order = np.lexsort((inside, row))
    first = order[np.diff(row[order], prepend=-1) > 0]
    first = first[inside[first] < least[row[first]]]
    least[row[first]], at[row[first]] = inside[first], where[first]


def _lower(best: Float, at: Float, hop: Ints, least: Float, where: Float) -> None:
    """Lower the best of hops, in place, by the least of their segments; missing ground makes it unknown for good."""
    if not hop.size:
        return
    start = np.flatnonzero(np.diff(hop, prepend=-1))
    owner = hop[start]
    for rule in range(len(best)):
        lowest = np.minimum.reduceat(least[rule], start)
        holder = np.flatnonzero(np.repeat(lowest, np.diff(np.append(start, hop.size))) == least[rule])
        place = np.full(best.shape[1], np.nan)
        place[hop[holder[::-1]]] = where[rule, holder[::-1]]
        lower = ~(lowest >= best[rule, owner])
        best[rule, owner[lower]], at[rule, owner[lower]] = lowest[lower], place[owner[lower]]
