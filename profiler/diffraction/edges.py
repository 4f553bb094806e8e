"""The result that every method of edges gives: a loss per hop, and the edges that set it."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Self

import numpy as np
from numpy.typing import NDArray

from profiler.diffraction.formulas import fresnel_parameter
from profiler.diffraction.hops import Hops
from profiler.models import frozen_array
from profiler.units import Float

__all__ = ["EdgeLosses", "edge_losses", "nu_at", "sealed"]


@dataclass(frozen=True, slots=True, eq=False)
class EdgeLosses:
    """Loss of hops over edges, and which edges: `loss_db` is `(hops,)`, the rest `(hops, slots)`; no hops axis for one.

    Slots run from A to B; a slot that a hop does not use is NaN in all four arrays. All arrays are read-only.
    """

    loss_db: Float
    distance_m: Float
    """From A."""
    height_m: Float
    """Above the datum, without the bulge of the earth."""
    nu: Float
    edge_loss_db: Float
    """What this edge was charged; NaN for a point that shapes the construction and is charged nothing itself."""

    def of_hop(self, index: int) -> Self:
        """Return the part of one hop of many, as if it alone had been asked for."""
        return replace(self, **{each.name: getattr(self, each.name)[index] for each in fields(self)})


def sealed(hops: Hops, values: Float) -> Float:
    """Read-only `values`, without the axis of hops where all inputs were for one hop."""
    return frozen_array(values[0] if hops.single else values)


def nu_at(hops: Hops, t: Float, rise_m: Float) -> Float:
    """Fresnel parameter from the two ends of what rises `rise_m` over the ray at `t`; NaN where `t` is."""
    there = np.where(np.isnan(t), 0.5, t)
    nu = fresnel_parameter(rise_m, hops.length_m * there, hops.length_m * (1.0 - there), hops.frequency_hz)
    return np.asarray(np.where(np.isnan(t), np.nan, nu))


def edge_losses(
    hops: Hops, loss_db: Float, slots: list[tuple[NDArray[np.bool_], Float, Float, Float, Float]]
) -> EdgeLosses:
    """Assemble the result from slots of (used, t, height above the datum, ν, loss), each `(hops,)`."""
    columns = [np.stack([np.where(used, values[i], np.nan) for used, *values in slots], axis=-1) for i in range(4)]
    columns[0] *= hops.length_m[:, None]
    return EdgeLosses(sealed(hops, loss_db), *(sealed(hops, column) for column in columns))
