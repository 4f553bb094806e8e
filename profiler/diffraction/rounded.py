"""Diffraction over the main obstacle of a profile taken as one rounded top, its radius fitted to the profile."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.checks import not_negative
from profiler.diffraction.edges import EdgeLosses, edge_losses, sealed
from profiler.diffraction.formulas import rounded_obstacle_loss, rounding
from profiler.diffraction.general import bullington_points, vertex
from profiler.diffraction.hops import Block, Hops
from profiler.units import Float

__all__ = ["RoundedLosses", "rounded_obstacle"]


_CELLS = 2.0
"""A top is fitted over at least so many cells to each side: five heights of the raster."""

_PLACE, _WEIGHT = np.polynomial.legendre.leggauss(3)
"""Of a sum over a straight piece that is exact for what a parabola's fit adds up, powers to the fourth."""


@dataclass(frozen=True, slots=True, eq=False)
class RoundedLosses(EdgeLosses):
    """Loss over one rounded obstacle, with the radius fitted to its top; per-hop arrays as `loss_db`."""

    radius_m: Float
    """Radius of the top on the bulged earth, as far as it has room; 0 where the points show none, NaN where hollow."""
    roundness: Float
    """The m of `rounding`; NaN where the radius is."""
    top_m: Float
    """Distances from A between which the top is fitted, `(hops, 2)`."""
    arc_m: Float
    """Length of the arc of the fitted radius which turns one horizon ray into the other; NaN where the radius is."""
    isolated: NDArray[np.bool_]
    """Both horizon rays touch the fitted top, so that the path has this one obstacle only."""
    narrow: NDArray[np.bool_]
    """Within one Fresnel radius of its highest point the top is narrower than the cells over which it is fitted."""


def _rounded_kernel(block: Block, cell_m: float) -> tuple[NDArray[Any], ...]:
    """Find the construction points of each hop, and the curvature and extent of the top around the main one."""
    from_a, from_b, main = bullington_points(block)
    rise, length = block.rise(), block.length_m[:, None]
    t = np.broadcast_to(block.grid.t, rise.shape)
    rows = np.arange(main.size)
    t_main = t[rows, main]
    x, y = (t - t_main[:, None]) * length, rise - rise[rows, main][:, None]
    f1 = np.sqrt(block.wavelength_m * block.length_m * t_main * (1.0 - t_main))
    before, after = _reach(-x[:, ::-1], y[:, ::-1], f1), _reach(x, y, f1)
    least = _CELLS * cell_m
    first = np.maximum(-np.maximum(before, least), x[:, 0])
    last = np.minimum(np.maximum(after, least), x[:, -1])
    # without cells the points are all that is known of the top, and fewer than three show no radius
    shown = (cell_m > 0) | (((x >= first[:, None]) & (x <= last[:, None])).sum(axis=1) >= 3)
    curvature = np.where(shown & (last > first), _curvature(x, y, first, last), np.inf)
    touch_a, touch_b = x[rows, from_a], x[rows, from_b]
    isolated = (touch_a >= first) & (touch_a <= last) & (touch_b >= first) & (touch_b <= last)
    start, end = t_main + first / block.length_m, t_main + last / block.length_m
    return from_a, from_b, main, start, end, curvature, isolated, before + after < 2.0 * least


def _reach(x_m: Float, y_m: Float, fall_m: Float) -> Float:
    """How far from x = 0 the line through the points first lies `fall_m` below 0, at greater x, or where it ends."""
    lower = (y_m < -fall_m[:, None]) & (x_m > 0)
    place = lower.argmax(axis=1)
    rows = np.arange(place.size)
    before = np.maximum(place - 1, 0)
    x0, x1, y0, y1 = x_m[rows, before], x_m[rows, place], y_m[rows, before], y_m[rows, place]
    fallen = lower[rows, place]
    share = np.where(fallen, (y0 + fall_m) / np.where(fallen, y0 - y1, 1.0), 0.0)
    return np.asarray(np.where(fallen, x0 + share * (x1 - x0), x_m[:, -1]))


def _curvature(x_m: Float, y_m: Float, first_m: Float, last_m: Float) -> Float:
    """Curvature −y″, 1/m, of the parabola nearest to the line through each row's points, from first to last.

    Least squares over the length, not over the points, so that it is the same however densely the line is drawn. A bend
    of less than a micrometre is rounding, and counts as none.
    """
    cut = np.clip(x_m, first_m[:, None], last_m[:, None])
    half = np.diff(cut, axis=1) / 2.0
    x = (cut[:, :-1] + half)[..., None] + half[..., None] * _PLACE
    slope = np.diff(y_m, axis=1) / np.diff(x_m, axis=1)
    y = y_m[:, :-1, None] + slope[..., None] * (x - x_m[:, :-1, None])
    scale = np.maximum(np.maximum(-first_m, last_m), 1e-9)
    u = x / scale[:, None, None]
    weight = half[..., None] * _WEIGHT
    powers = np.stack([np.ones_like(u), u, u * u])
    normal = np.einsum("ihpg,jhpg,hpg->hij", powers, powers, weight)
    normal[~(last_m > first_m)] = np.eye(3)
    fit = np.linalg.solve(normal, np.einsum("ihpg,hpg->hi", powers, weight * y)[..., None])[:, 2, 0]
    return np.asarray(2.0 * np.where(np.abs(fit) > 1e-6, -fit, 0.0) / scale**2)


def rounded_obstacle(
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: ArrayLike,
    centre_b_m: ArrayLike,
    frequency_hz: ArrayLike,
    effective_radius_m: ArrayLike,
    cell_m: float = 0.0,
) -> RoundedLosses:
    """Loss of the profile's main obstacle as one rounded top: J(ν) + T(m, n), its radius fitted to the profile.

    The top is the ground around the principal edge that is no more than the first Fresnel radius below it, and at least
    two cells of the terrain to each side; a least-squares parabola through it, on the bulged earth and straight between
    points, gives the radius, which is held to what has room on the top: its arc from one horizon ray to the other is no
    longer than the top. ν, m and n are taken at the vertex where the two horizon rays meet, or at the principal
    edge where the ray is clear. Where the top is not convex the loss is that of the knife edge, and the radius NaN.

    Parameters
    ----------
    distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m
        As in `delta_bullington`.
    cell_m
        Length of a cell of the terrain, m. Within one cell nobody knows how round a top is; the corner that a raster
        has there is none of the hill's. 0: the points are all that is known of the top, and where it has fewer than 3
        of them the radius is 0 and the loss that of the knife edge.

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
    fail where two neighbouring samples are level. That it reaches over several cells, and that its arc must have room
    on the top, are this project's own rules: a flat top between walls would take any radius.
    """
    cell = float(not_negative("cell_m", cell_m, "m"))
    hops = Hops.of(distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m)
    from_a, from_b, main, start, end, curvature, isolated, narrow = hops.run(partial(_rounded_kernel, cell_m=cell))
    top = vertex(hops, from_a, from_b, main)
    convex = curvature > 0
    fitted = np.where(convex, 1.0 / np.where(convex, curvature, 1.0), 0.0)
    extent = np.stack([start, end], axis=-1) * hops.length_m[:, None]
    ends = (hops.length_m * top.t, hops.length_m * (1.0 - top.t))
    turn = np.maximum(top.rise_m, 0.0) * (1.0 / ends[0] + 1.0 / ends[1])
    room = extent[:, 1] - extent[:, 0]
    radius = np.where(fitted * turn > room, room / np.where(turn > 0, turn, 1.0), fitted)
    loss = rounded_obstacle_loss(top.rise_m, *ends, radius, hops.frequency_hz)
    base = edge_losses(hops, loss, [(loss > 0, top.t, top.height_m, top.nu, loss)])
    alone, thin = (np.asarray(each[0] if hops.single else each) for each in (isolated, narrow))
    roundness = rounding(*ends, radius, hops.frequency_hz)
    return RoundedLosses(
        loss_db=base.loss_db,
        distance_m=base.distance_m,
        height_m=base.height_m,
        nu=base.nu,
        edge_loss_db=base.edge_loss_db,
        radius_m=sealed(hops, np.where(convex, radius, np.nan)),
        roundness=sealed(hops, np.where(convex, roundness, np.nan)),
        top_m=sealed(hops, extent),
        arc_m=sealed(hops, np.where(convex, fitted * turn, np.nan)),
        isolated=alone,
        narrow=thin,
    )
