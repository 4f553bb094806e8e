"""Run every stage for one hop, in one direction, and return one immutable result.

The heights plan is in `profiler.plan`: a study does without it, and starts faster.
"""

from profiler.study.ground import read_ground
from profiler.study.link import losses_at
from profiler.study.result import Place, Study
from profiler.study.run import open_hop_terrain, run_study
from profiler.study.said_once import gathered

__all__ = [
    "Place",
    "Study",
    "gathered",
    "losses_at",
    "open_hop_terrain",
    "read_ground",
    "run_study",
]
