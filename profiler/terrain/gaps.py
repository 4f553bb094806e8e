"""Ground that is missing along a path: say where, stop, or fill it in the open."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.errors import MissingGroundError
from profiler.units import Float

__all__ = ["fill_missing", "missing_stretches", "require_ground"]


def missing_stretches(ground_m: ArrayLike) -> tuple[tuple[int, int], ...]:
    """First and last index of every unbroken run of NaN along a path, in order.

    Examples
    --------
    >>> missing_stretches([1.0, np.nan, np.nan, 2.0, np.nan])
    ((1, 2), (4, 4))
    >>> missing_stretches([1.0, 2.0])
    ()
    """
    gap = np.concatenate([[False], np.isnan(np.asarray(ground_m, dtype=float)), [False]])
    turns = np.flatnonzero(gap[1:] != gap[:-1])
    return tuple((int(first), int(end) - 1) for first, end in zip(turns[::2], turns[1::2], strict=True))


def require_ground(
    distance_m: ArrayLike,
    longitude: ArrayLike,
    latitude: ArrayLike,
    ground_m: ArrayLike,
    *,
    covered: ArrayLike | None = None,
    interpolated: bool = False,
) -> None:
    """Stop when ground is missing anywhere on a path, saying where.

    Parameters
    ----------
    distance_m
        Distances from site A, metres, shape (n,).
    longitude, latitude
        The points, degrees, shape (n,).
    ground_m
        Ground heights, metres, NaN where missing, shape (n,).
    covered
        Where a raster lies, though it may hold no height there; unknown by default.
    interpolated
        Gaps between known ground have been filled already, so that this is no way out.

    Raises
    ------
    MissingGroundError
        One line that names up to three stretches by distance and place, and counts the rest.

    Examples
    --------
    >>> require_ground([0.0, 50.0], [10.0, 10.0], [50.0, 50.1], [120.0, 121.0])
    >>> require_ground([0.0, 50.0], [10.0, 10.0], [50.0, 50.1], [120.0, np.nan])  # doctest: +ELLIPSIS
    Traceback (most recent call last):
    profiler.errors.MissingGroundError: no ground height at 1 of 2 points: at 0.050 km (longitude 10.00000, ...
    """
    gaps = missing_stretches(ground_m)
    if not gaps:
        return
    distance, lon, lat = (np.asarray(values, dtype=float) for values in (distance_m, longitude, latitude))
    told = []
    for first, last in gaps[:3]:
        start, end = distance[[first, last]] / 1000.0
        where = f"at {start:.3f} km" if first == last else f"from {start:.3f} to {end:.3f} km"
        told.append(f"{where} (longitude {lon[first]:.5f}, latitude {lat[first]:.5f})")
    more = f" and {len(gaps) - 3} more stretches" if len(gaps) > 3 else ""
    count = sum(last - first + 1 for first, last in gaps)
    missing = np.isnan(np.asarray(ground_m, dtype=float))
    all_of = "any" if missing.all() else f"{count}"
    ways = ["give terrain that covers them"]
    if not interpolated and not missing.all() and not missing[0] and not missing[-1]:
        ways.append('set terrain.missing = "interpolate" in the hop file')
    if covered is not None and np.asarray(covered)[missing].all():
        ways.append("if these cells are the sea, set terrain.voids_are_sea = true")
    elif covered is not None and not np.asarray(covered)[missing].any():
        ways[0] = "no raster lies there: " + ways[0]
    raise MissingGroundError(
        f"no ground height at {all_of} of {distance.size} points: {', '.join(told)}{more}; {', or '.join(ways)}"
    )


def fill_missing(distance_m: ArrayLike, ground_m: ArrayLike) -> tuple[Float, NDArray[np.bool_]]:
    """Fill missing ground by the straight line between the known neighbours along the path.

    Parameters
    ----------
    distance_m
        Distances from site A, metres, increasing, shape (n,).
    ground_m
        Ground heights, metres, NaN where missing, shape (n,).

    Returns
    -------
    ground_m, filled
        The heights, and where they were filled. What has no known neighbour on one side (the ends) stays NaN.

    Examples
    --------
    >>> ground, filled = fill_missing([0, 10, 20, 40, 50], [np.nan, 100, np.nan, 130, np.nan])
    >>> ground.tolist(), filled.tolist()
    ([nan, 100.0, 110.0, 130.0, nan], [False, False, True, False, False])
    """
    distance, ground = np.asarray(distance_m, dtype=float), np.array(ground_m, dtype=float)
    missing = np.isnan(ground)
    filled = missing & np.logical_or.accumulate(~missing) & np.logical_or.accumulate(~missing[::-1])[::-1]
    if filled.any():
        ground[filled] = np.interp(distance[filled], distance[~missing], ground[~missing])
    return ground, filled
