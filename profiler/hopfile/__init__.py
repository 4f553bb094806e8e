"""Hop files: what a user says about one hop, from TOML (or from a few values) to `profiler.models.Hop`.

What a key is, is stated once, in `profiler.models`; the reader, the schema, the starter and the page of keys follow.
"""

from profiler.hopfile.edit import with_antennas
from profiler.hopfile.json_schema import hop_schema
from profiler.hopfile.moved import with_paths_from
from profiler.hopfile.overrides import value_of
from profiler.hopfile.page import keys_page
from profiler.hopfile.presets import PRESETS
from profiler.hopfile.reader import load_hop, parse_hop, quick_hop
from profiler.hopfile.starter_file import starter

__all__ = [
    "PRESETS",
    "hop_schema",
    "keys_page",
    "load_hop",
    "parse_hop",
    "quick_hop",
    "starter",
    "value_of",
    "with_antennas",
    "with_paths_from",
]
