"""Screening pairs of sites: the same as a study of each, and what happens to tables, chunks and bad rows."""

from dataclasses import replace

import numpy as np
import pytest

from profiler.models import Hop, Rule, Site, TerrainChoice
from profiler.plan import plan_heights
from profiler.screen.chunk import Template, hop_of, screen_chunk
from profiler.screen.pairs import Pairs
from profiler.study import open_hop_terrain, run_study

RULES = (Rule(4 / 3, 1.0), Rule(2 / 3, 0.3), Rule(1.0, 0.6, 3.0))
SLACK_M = 0.004 + 0.0005
"""How far two searches of the width may differ, one that stops at 4 mm (a study) and one at 0.5 mm (screening)."""


def template(raster, **changes) -> Template:
    site = Site("anywhere", -112.0, 37.0, 30.0)
    hop = Hop("template", site, replace(site, antenna_m=24.0), 6.2e9, RULES, TerrainChoice((raster,)))
    return Template(replace(hop, **changes))


def some_pairs(count, west, south, east, north, seed=5, most_km=35.0) -> Pairs:
    """Pairs anywhere in a box, tilted and uneven; every third with heights and a frequency of its own."""
    rng = np.random.default_rng(seed)
    a = rng.uniform((west, south), (east, north), (count, 2))
    way, length = rng.uniform(0, 2 * np.pi, count), rng.uniform(2.0, most_km, count) / 111.0
    b = a + np.stack([np.sin(way) / np.cos(np.radians(a[:, 1])), np.cos(way)], axis=1) * length[:, None]
    b = np.clip(b, (west, south), (east, north))
    own = np.where((np.arange(count) % 3 == 0)[:, None], [[41.0, 12.0, 13.0]], np.nan)
    return Pairs([f"p{i}" for i in range(count)], [""] * count, *a.T, *b.T, *own.T)
