"""Many hops at once: least surplus, its place and least heights of thousands of pairs of sites over one grid."""

from profiler.screen.blocks import Blocks, build_blocks
from profiler.screen.least import LeastSurplus, Sight, least_surplus
from profiler.screen.lines import GridLines, grid_lines

__all__ = ["Blocks", "GridLines", "LeastSurplus", "Sight", "build_blocks", "grid_lines", "least_surplus"]
