"""What a study has to say about the rasters under its path: what was passed over, taken for the sea, or disagrees."""

from __future__ import annotations

import math
from collections.abc import Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from profiler.models import Hop
from profiler.remarks import Length, Note, note
from profiler.study.said_once import gathered
from profiler.terrain import Overlap, RasterInfo, Terrain
from profiler.units import Float

__all__ = ["disagreements", "passed_over", "sea_notes"]

_AGREE_M = 1.0
"""Rasters of one resolution that differ by no more agree, where the hop file states no error of the terrain."""


def passed_over(terrain: Terrain) -> tuple[str, ...]:
    """Say which files, links and folders of the terrain were not used."""
    return tuple(
        f"terrain left out: {note}"
        for note in gathered(((each.name, each.reason) for each in terrain.skipped), "files")
    )


def sea_notes(sea: NDArray[np.bool_], distance_m: Float) -> tuple[Note, ...]:
    """Say where along the path cells without a height were taken for the sea, and on whose word."""
    distance_m, sea = distance_m.ravel(), sea.ravel()
    turns = np.flatnonzero(np.diff(np.concatenate([[False], sea, [False]]).astype(int)))
    if not turns.size:
        return ()
    ends = list(zip(distance_m[turns[::2]].tolist(), distance_m[turns[1::2] - 1].tolist(), strict=True))
    told = ", ".join("{} to {}" for _ in ends[:5])
    more = f" and {len(ends) - 5} more stretches" if len(ends) > 5 else ""
    words = f"sea level at {told}{more}: the rasters hold no height there, and by the hop file such cells are sea"
    return (note("terrain", words, *(Length(end_m, far=True) for pair in ends[:5] for end_m in pair)),)


def disagreements(hop: Hop, overlaps: Sequence[Overlap], distance_m: Float) -> tuple[Note, ...]:
    """Warn of rasters of one resolution that overlap on the path and differ by more than their errors."""
    sigma_m = None if hop.confidence is None else hop.confidence.terrain_sigma_m
    # two errors of standard deviation σ differ by less than 2·√2·σ in 95 of 100 places
    allowed_m = _AGREE_M if not sigma_m else 2.0 * math.sqrt(2.0) * sigma_m
    return tuple(
        _disagreement(hop, overlap, distance_m)
        for overlap in overlaps
        if np.abs(overlap.difference_m).max() > allowed_m
    )


def _disagreement(hop: Hop, overlap: Overlap, distance_m: Float) -> Note:
    apart_m, at_m = np.abs(overlap.difference_m), distance_m[overlap.point]
    most = int(np.argmax(apart_m))
    order = [_place_in_order(hop, info) for info in (overlap.first, overlap.second)]
    why = "its name comes first in its folder" if order[0] == order[1] else "its path stands first in terrain.paths"
    higher = "above" if overlap.difference_m[most] > 0 else "below"
    far = (Length(float(each), far=True) for each in (at_m.min(), at_m.max(), at_m[most]))
    return note(
        "terrain",
        f"{{}} and {{}} overlap between {{}} and {{}} and do not agree: at {{}} the first lies {{}} {higher} the second"
        f" (median {{}}); the first answers, as {why}. Find out which is right and put it first",
        overlap.first.path.name,
        overlap.second.path.name,
        *far,
        Length(float(apart_m[most])),
        Length(float(np.median(apart_m))),
    )


def _place_in_order(hop: Hop, info: RasterInfo) -> int:
    """Which of the hop file's terrain paths a raster came by."""
    for number, path in enumerate(hop.terrain.paths):
        if Path(path) == info.path or Path(path) in info.path.parents:
            return number
    return -1
