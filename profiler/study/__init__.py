"""Run every stage for one hop, in one direction, and return one immutable result.

The heights plan is in `profiler.study.plan`: a study does without it, and starts faster.
"""

from profiler.study.document import plain, point_table, to_document
from profiler.study.link import Air, losses_at
from profiler.study.notes import gathered
from profiler.study.outage import ModeOutage, OutageResult
from profiler.study.result import (
    Corridor,
    Place,
    Provenance,
    Relief,
    RuleResult,
    Study,
    TerrainUse,
    Verdict,
)
from profiler.study.run import open_hop_terrain, run_study

__all__ = [
    "Air",
    "Corridor",
    "ModeOutage",
    "OutageResult",
    "Place",
    "Provenance",
    "Relief",
    "RuleResult",
    "Study",
    "TerrainUse",
    "Verdict",
    "gathered",
    "losses_at",
    "open_hop_terrain",
    "plain",
    "point_table",
    "run_study",
    "to_document",
]
