"""Where errors are drawn: at nodes of their own step, which does not depend on how densely the path is listed."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiler.confidence.fields import Covariance, Draws, correlation, draw_field
from profiler.units import Float

__all__ = ["CarriedField", "Places", "draw_carried", "join_places", "node_distances"]


def node_distances(length_m: float, step_m: float) -> Float:
    """Distances of the nodes: equal steps of at most ``step_m`` with a node at either end, so that ends can be swapped.

    Examples
    --------
    >>> node_distances(1000.0, 400.0).round(1).tolist()
    [0.0, 333.3, 666.7, 1000.0]
    """
    return np.linspace(0.0, length_m, max(1, math.ceil(length_m / step_m - 1e-9)) + 1)


@dataclass(frozen=True, slots=True, eq=False)
class CarriedField:
    """A field of variance 1 drawn at equal steps along a path, (nodes, draws), and carried between them.

    ``step_correlation`` is the correlation of two neighbouring nodes.
    """

    step_m: float
    node: Draws
    step_correlation: float

    def at(self, distance_m: Float) -> Draws:
        """Give the field at distances from A, (k, draws).

        Carried linearly, as the ground is, and scaled to variance 1: a mean of two nodes would vary less than either,
        but a published error is that of the surface at any point, wherever the nodes happen to stand.
        """
        position = distance_m / self.step_m
        first = np.clip(position.astype(np.intp), 0, len(self.node) - 2)
        rest = position - first
        spread = np.sqrt(1.0 - 2.0 * rest * (1.0 - rest) * (1.0 - self.step_correlation))
        carried: Draws = self.node[first] * ((1.0 - rest) / spread)[:, None].astype(np.float32)
        carried += self.node[first + 1] * (rest / spread)[:, None].astype(np.float32)
        return carried


def draw_carried(
    node_m: Float, correlation_m: float, covariance: Covariance, draws: int, rng: np.random.Generator
) -> CarriedField:
    """Draw a field of mean 0 and variance 1 at nodes, as `draw_field` does at any points."""
    step_m = float(node_m[1] - node_m[0])
    node = draw_field(node_m, correlation_m, covariance, draws, rng)
    return CarriedField(step_m, node, float(correlation(step_m, correlation_m, covariance)))


@dataclass(frozen=True, slots=True, eq=False)
class Places:
    """The points of a path, (n,), and places between them, so that errors are looked at as often on a coarse path.

    ``distance_m`` (m,) are all in order, ``own`` (m,) marks the path's points, ``nearest`` (m,) is the index of the
    nearest of these.
    """

    distance_m: Float
    own: NDArray[np.bool_]
    nearest: NDArray[np.intp]

    def carry(self, rows: Float) -> Float:
        """Carry rows over the path's points, (..., n), linearly to the places between too, (..., m)."""
        carried = np.empty((*rows.shape[:-1], self.own.size))
        carried[..., self.own] = rows
        points_m, between_m = self.distance_m[self.own], self.distance_m[~self.own]
        after = np.searchsorted(points_m, between_m)
        rest = (between_m - points_m[after - 1]) / (points_m[after] - points_m[after - 1])
        carried[..., ~self.own] = (1.0 - rest) * rows[..., after - 1] + rest * rows[..., after]
        return carried


def join_places(distance_m: Float, place_m: Float) -> Places:
    """Put places between the points of a path; one at a point is that point.

    Examples
    --------
    >>> places = join_places(np.array([0.0, 300.0, 1000.0]), np.array([0.0, 500.0, 1000.0]))
    >>> places.distance_m.tolist(), places.nearest.tolist()
    ([0.0, 300.0, 500.0, 1000.0], [0, 1, 1, 2])
    >>> places.carry(np.array([7.0, 1.0, 8.0])).tolist()
    [7.0, 1.0, 3.0, 8.0]
    """
    fresh = np.setdiff1d(place_m, distance_m)
    where = np.searchsorted(distance_m, fresh)
    joined = np.insert(distance_m, where, fresh)
    own = np.insert(np.ones(distance_m.size, dtype=bool), where, False)
    nearest = np.searchsorted(0.5 * (distance_m[1:] + distance_m[:-1]), joined)
    nearest[own] = np.arange(distance_m.size)
    return Places(joined, own, nearest)
