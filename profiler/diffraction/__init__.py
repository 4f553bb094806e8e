"""Diffraction over a profile (Rec. ITU-R P.526-15): each method for batches of hops, and one front door by name."""

from profiler.diffraction.edges import EdgeLosses
from profiler.diffraction.formulas import knife_edge_loss
from profiler.diffraction.general import DeltaBullington, bullington, delta_bullington
from profiler.diffraction.methods import (
    METHODS,
    DiffractionLoss,
    Edge,
    Method,
    RoundTop,
    diffract,
    diffract_over_k,
    losses_over_k,
)
from profiler.diffraction.obstacles import DoubleLosses, cascaded_knife_edges, double_edge, single_knife_edge
from profiler.diffraction.rounded import RoundedLosses, rounded_obstacle
from profiler.diffraction.sphere import spherical_earth

__all__ = [
    "METHODS",
    "DeltaBullington",
    "DiffractionLoss",
    "DoubleLosses",
    "Edge",
    "EdgeLosses",
    "Method",
    "RoundTop",
    "RoundedLosses",
    "bullington",
    "cascaded_knife_edges",
    "delta_bullington",
    "diffract",
    "diffract_over_k",
    "double_edge",
    "knife_edge_loss",
    "losses_over_k",
    "rounded_obstacle",
    "single_knife_edge",
    "spherical_earth",
]
