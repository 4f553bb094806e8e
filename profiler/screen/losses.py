"""Diffraction loss of many hops: each path laid open at all its crossings, then the methods for batches of profiles."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from profiler.diffraction import delta_bullington
from profiler.models import Polarization
from profiler.screen.blocks import Blocks
from profiler.screen.least import Segments, open_segments, segments_of
from profiler.screen.lines import GridLines, Ints
from profiler.units import MEAN_EARTH_RADIUS_M, SPEED_OF_LIGHT_M_S, Float

__all__ = ["delta_bullington_losses", "profiles_of"]

_HOPS_AT_ONCE = 128
"""Their points fill some megabytes."""

_HAIR = 1e-6
"""Part of the path's length that two points must be apart to be two."""


def delta_bullington_losses(
    lines: GridLines,
    blocks: Blocks,
    centre_a_m: Float,
    centre_b_m: Float,
    wavelength_m: Float,
    k: float,
    *,
    polarization: Polarization = "vertical",
    sea_fraction: float = 0.0,
) -> Float:
    """Delta-Bullington loss of many hops at one k, dB, (hops,), by `profiler.diffraction.delta_bullington`.

    Parameters
    ----------
    lines, blocks
        The paths, whose ground has no gap, and the ground.
    centre_a_m, centre_b_m
        Antenna centres above the datum, (hops,), not under the ground of their site.
    wavelength_m
        Wavelengths, (hops,).
    k
        Effective-earth-radius factor.
    polarization, sea_fraction
        As there.
    """
    loss_db = np.empty(lines.distance_m.size)
    for hops, distance_m, height_m in profiles_of(lines, blocks):
        found = delta_bullington(
            distance_m,
            height_m,
            centre_a_m[hops],
            centre_b_m[hops],
            SPEED_OF_LIGHT_M_S / wavelength_m[hops],
            k * MEAN_EARTH_RADIUS_M,
            polarization,
            sea_fraction,
        )
        loss_db[hops] = found.total_db
    return loss_db


def profiles_of(lines: GridLines, blocks: Blocks) -> Iterator[tuple[Ints, Float, Float]]:
    """Give profiles at every crossing, some hops at a time: which hops, their distances and heights, (hops, points).

    Hops with paths of about equal length come together. Those with fewer points have the last stretch before B,
    straight from one crossing to the site, cut into as many more.
    """
    segments = segments_of(lines)
    count = np.diff(np.append(segments.start, segments.hop.size))
    order = np.argsort(count, kind="stable")
    for hops in np.array_split(order, -(-order.size // _HOPS_AT_ONCE)):
        yield hops, *_laid_open(lines, blocks, segments, hops, count[hops])


def _laid_open(lines: GridLines, blocks: Blocks, segments: Segments, hops: Ints, count: Ints) -> tuple[Float, Float]:
    """Distances and heights of some hops, from A to B, (hops, points)."""
    which = np.repeat(segments.start[hops] - np.cumsum(count) + count, count) + np.arange(count.sum())
    opened = open_segments(lines, blocks, segments, which)
    row = np.repeat(np.repeat(np.arange(hops.size), count), opened.distance_m.shape[1])
    distance_m, height_m = opened.distance_m.ravel(), opened.height_m.ravel()
    order = np.lexsort((distance_m, row))
    row, distance_m, height_m = row[order], distance_m[order], height_m[order]
    length_m = lines.distance_m[hops]
    inner = (distance_m > _HAIR * length_m[row]) & (distance_m < (1.0 - _HAIR) * length_m[row])
    inner &= (np.diff(distance_m, prepend=-1.0) > _HAIR * length_m[row]) | (np.diff(row, prepend=-1) > 0)
    row, distance_m, height_m = row[inner], distance_m[inner], height_m[inner]

    points = np.bincount(row, minlength=hops.size)
    place = np.arange(row.size) - (np.cumsum(points) - points)[row] + 1
    width = int(points.max()) + 2
    along, ground = np.empty((hops.size, width)), np.empty((hops.size, width))
    along[:, 0], ground[:, 0] = 0.0, blocks.height(lines.column_a[hops], lines.row_a[hops])
    along[row, place], ground[row, place] = distance_m, height_m
    # what is left of each row runs straight from its last crossing to B
    end_m = blocks.height(lines.column_b[hops], lines.row_b[hops])
    final = np.arange(hops.size), points
    share = np.clip((np.arange(width) - points[:, None]) / (width - 1 - points[:, None]), 0.0, 1.0)
    rest = np.arange(width) > points[:, None]
    along = np.where(rest, along[final][:, None] + share * (length_m - along[final])[:, None], along)
    ground = np.where(rest, ground[final][:, None] + share * (end_m - ground[final])[:, None], ground)
    return along, ground
