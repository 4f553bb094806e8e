"""Hop files: what a user says about one hop, from TOML (or from a few values) to `profiler.models.Hop`.

The only user of pydantic, which is imported when a hop is read, not before.
"""

from profiler.hopfile.edit import with_antennas
from profiler.hopfile.moved import with_paths_from
from profiler.hopfile.presets import PRESETS
from profiler.hopfile.reader import load_hop, parse_hop, quick_hop
from profiler.hopfile.starter_file import starter

__all__ = [
    "PRESETS",
    "load_hop",
    "parse_hop",
    "quick_hop",
    "starter",
    "with_antennas",
    "with_paths_from",
]
