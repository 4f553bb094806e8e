"""Where the path runs on the WGS 84 ellipsoid.

pyproj is imported inside the functions that need it: its import alone costs some 50 ms.
"""

from profiler.path.datum import DATUMS, to_wgs84
from profiler.path.line import (
    LONGEST_M,
    PathLine,
    across,
    beside,
    equal_steps,
    geodesic,
    locate,
    midpoint,
    points_along,
    trace,
    with_points,
)

__all__ = [
    "DATUMS",
    "LONGEST_M",
    "PathLine",
    "across",
    "beside",
    "equal_steps",
    "geodesic",
    "locate",
    "midpoint",
    "points_along",
    "to_wgs84",
    "trace",
    "with_points",
]
