"""Diffraction over the main obstacle of a profile taken as one rounded top, its radius fitted to the profile."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.diffraction.edges import EdgeLosses, edge_losses, sealed
from profiler.diffraction.formulas import rounded_obstacle_loss, rounding
from profiler.diffraction.general import bullington_points, vertex
from profiler.diffraction.hops import Block, Hops
from profiler.units import Float

__all__ = ["RoundedLosses", "rounded_obstacle"]


@dataclass(frozen=True, slots=True, eq=False)
class RoundedLosses(EdgeLosses):
    """Loss over one rounded obstacle, with the radius fitted to its top; per-hop arrays as `loss_db`."""

    radius_m: Float
    """Radius of the top on the bulged earth; 0 where the points show none, NaN where the top is not convex."""
    roundness: Float
    """The m of `rounding`; NaN where the radius is."""
    top_m: Float
    """Distances from A of the first and last point of the fitted top, `(hops, 2)`."""
    arc_m: Float
    """Length of the arc of that radius which turns one horizon ray into the other; NaN where the radius is."""
    isolated: NDArray[np.bool_]
    """Both horizon rays touch the fitted top, so that the path has this one obstacle only."""


def _rounded_kernel(block: Block) -> tuple[NDArray[Any], ...]:
    """Find the construction points of each hop, and the curvature and extent of the top around the main one."""
    from_a, from_b, main = bullington_points(block)
    rise = block.rise()
    rows = np.arange(rise.shape[0])
    t = np.broadcast_to(block.grid.t, rise.shape)
    bow = np.broadcast_to(block.grid.bow, rise.shape)[rows, main]
    f1 = np.sqrt(block.wavelength_m * block.length_m * bow)
    apex = rise[rows, main]

    index = np.arange(rise.shape[1])
    below = apex[:, None] - rise > f1[:, None]
    first = np.where(below & (index < main[:, None]), index, -1).max(axis=1) + 1
    last = np.where(below & (index > main[:, None]), index, rise.shape[1]).min(axis=1) - 1
    inside = (index >= first[:, None]) & (index <= last[:, None])
    x = (t - t[rows, main][:, None]) * block.length_m[:, None]
    curvature = _curvature(np.where(inside, x, 0.0), np.where(inside, rise - apex[:, None], 0.0), inside)
    isolated = (from_a >= first) & (from_a <= last) & (from_b >= first) & (from_b <= last)
    return from_a, from_b, main, first, last, curvature, isolated


def _curvature(x_m: Float, y_m: Float, inside: NDArray[np.bool_]) -> Float:
    """Curvature −y″, 1/m, of the least-squares parabola through each row's points; infinite for fewer than 3 points.

    Entries outside are 0 in both coordinates. A bend of less than a micrometre is rounding, and counts as none.
    """
    enough = inside.sum(axis=1) >= 3
    scale = np.maximum(np.abs(x_m).max(axis=1), 1e-9)
    u = x_m / scale[:, None]
    powers = np.stack([inside.astype(float), u, u * u], axis=1)
    normal = np.einsum("hip,hjp->hij", powers, powers)
    normal[~enough] = np.eye(3)
    fit = np.linalg.solve(normal, np.einsum("hip,hp->hi", powers, y_m)[..., None])[:, 2, 0]
    bend = np.where(np.abs(fit) > 1e-6, -fit, 0.0)
    return np.asarray(np.where(enough, 2.0 * bend / scale**2, np.inf))


def rounded_obstacle(
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: ArrayLike,
    centre_b_m: ArrayLike,
    frequency_hz: ArrayLike,
    effective_radius_m: ArrayLike,
) -> RoundedLosses:
    """Loss of the profile's main obstacle as one rounded top: J(ν) + T(m, n), its radius fitted to the profile.

    The top is the run of points around the principal edge that are no more than the first Fresnel radius below it; a
    least-squares parabola through them, on the bulged earth, gives the radius. ν, m and n are taken at the vertex where
    the two horizon rays meet, or at the principal edge where the ray is clear. With fewer than 3 points on the top the
    radius is 0 and the loss that of the knife edge; where the top is not convex the loss is that of the knife edge too,
    and the radius NaN.

    Parameters
    ----------
    distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m
        As in `delta_bullington`.

    Returns
    -------
    RoundedLosses
        The loss, one slot with the vertex, the radius, and the extent of the fitted top.

    Raises
    ------
    InputError, MissingGroundError
        As in `delta_bullington`.

    Examples
    --------
    A hill of radius 1000 m whose top touches the ray.

    >>> import numpy as np
    >>> d = np.linspace(0, 10e3, 1001)
    >>> hill = rounded_obstacle(d, np.maximum(130 - (d - 5e3) ** 2 / 2000, 0), 130, 130, 6e9, np.inf)
    >>> round(float(hill.radius_m), 1), round(float(hill.loss_db), 2)
    (1000.0, 6.74)

    Notes
    -----
    Source: Rec. ITU-R P.526-15 §4.2 for the loss; §2 for the radius, "of a parabola fitted into the obstacle profile in
    the vicinity of the top", down to about the first Fresnel radius (from memory). That text shows a mean of
    x²/(2·y) over samples from the apex; a least-squares parabola gives the same radius on an exact one, and does not
    fail where two neighbouring samples are level.
    """
    hops = Hops.of(distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m)
    from_a, from_b, main, first, last, curvature, isolated = hops.run(_rounded_kernel)
    top = vertex(hops, from_a, from_b, main)
    convex = curvature > 0
    radius = np.where(convex, 1.0 / np.where(convex, curvature, 1.0), 0.0)
    ends = (hops.length_m * top.t, hops.length_m * (1.0 - top.t))
    loss = rounded_obstacle_loss(top.rise_m, *ends, radius, hops.frequency_hz)
    base = edge_losses(hops, loss, [(loss > 0, top.t, top.height_m, top.nu, loss)])
    extent = np.stack([hops.fraction_at(first), hops.fraction_at(last)], axis=-1) * hops.length_m[:, None]
    alone = np.asarray(isolated[0] if hops.single else isolated)
    return RoundedLosses(
        base.loss_db,
        base.distance_m,
        base.height_m,
        base.nu,
        base.edge_loss_db,
        sealed(hops, np.where(convex, radius, np.nan)),
        sealed(hops, np.where(convex, rounding(*ends, radius, hops.frequency_hz), np.nan)),
        sealed(hops, extent),
        sealed(hops, np.where(convex, radius * np.maximum(top.rise_m, 0.0) * (1.0 / ends[0] + 1.0 / ends[1]), np.nan)),
        alone,
    )
