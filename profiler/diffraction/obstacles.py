"""Diffraction over the main edges of a profile: the principal one, two of them, three in cascade."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.diffraction.edges import EdgeLosses, edge_losses, nu_at, sealed
from profiler.diffraction.formulas import NU_NO_LOSS, double_edge_terms, fresnel_parameter, knife_edge_loss
from profiler.diffraction.hops import Block, Hops, Index, Points
from profiler.units import Float

__all__ = ["DoubleLosses", "cascaded_knife_edges", "double_edge", "single_knife_edge"]

_NO_POINT = -1

_APART_M = 500.0
"""Twice the 250 m of Rec. ITU-R P.526-15 §4.4.1: there, neighbouring points up to 250 m apart are one obstruction."""

_APART_SHARE = 0.1
"""The same as a share of the way to the nearer end, where less: two edges on the line then lose 1 dB more than one."""


def _fade(away: Float, main_t: Float, length_m: Float) -> Float:
    """Share in which an edge counts `away` (a fraction of the path) from the principal one: 0 beside it, 1 from afar.

    It grows with the distance, so that no loss jumps when a hill moves, and points as close as one likes add nothing.
    """
    whole = np.minimum(_APART_M / length_m, _APART_SHARE * np.minimum(main_t, 1.0 - main_t))
    return np.minimum(away / whole, 1.0)


def _main_point(block: Block) -> tuple[Index]:
    """Inner point of greatest ν of each hop."""
    return ((block.rise() * block.grid.weight).argmax(axis=1),)


def single_knife_edge(
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: ArrayLike,
    centre_b_m: ArrayLike,
    frequency_hz: ArrayLike,
    effective_radius_m: ArrayLike,
) -> EdgeLosses:
    """Loss of the principal edge alone: J(ν) of the profile's point of greatest ν.

    Parameters
    ----------
    distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m
        As in `delta_bullington`.

    Returns
    -------
    EdgeLosses
        The loss and one slot, NaN where ν is not above −0.78.

    Raises
    ------
    InputError, MissingGroundError
        As in `delta_bullington`.

    Examples
    --------
    >>> edge = single_knife_edge([0, 5e3, 10e3], [100, 130, 100], 130, 130, 6e9, float("inf"))
    >>> round(float(edge.loss_db), 2), edge.distance_m.tolist()
    (6.03, [5000.0])

    Notes
    -----
    Source: Rec. ITU-R P.526-15 §4.1.
    """
    hops = Hops.of(distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m)
    point = hops.points_at(*hops.run(_main_point))
    nu = nu_at(hops, point.t, point.rise_m)
    loss = knife_edge_loss(nu)
    return edge_losses(hops, loss, [(nu > NU_NO_LOSS, point.t, point.height_m, nu, loss)])


def _three_points(block: Block) -> tuple[Index, Index, Index]:
    """Inner points of each hop: the principal edge, and what costs most towards A and B; −1 for none.

    Where nothing costs anything it is the point of greatest ν, so that over a lesser radius the same point is found.
    """
    rise = block.rise()
    t = np.broadcast_to(block.grid.t, rise.shape)
    main = (rise * block.grid.weight).argmax(axis=1)
    rows = np.arange(main.size)
    t_main, rise_main = t[rows, main][:, None], rise[rows, main][:, None]
    index = np.arange(rise.shape[1])
    left, other = index < main[:, None], index != main[:, None]
    share, share_main = np.where(left, t, 1.0 - t), np.where(left, t_main, 1.0 - t_main)
    away = np.where(other, np.abs(t - t_main), 1.0)
    over = rise - share * (rise_main / share_main)
    per_m = np.sqrt(2.0 / (block.wavelength_m * block.length_m))[:, None]
    nu = over * per_m * np.sqrt(share_main / (share * away))
    cost = knife_edge_loss(nu) * _fade(away, t_main, block.length_m[:, None]) + np.minimum(nu - NU_NO_LOSS, 0.0)
    to_a, to_b = np.where(left, cost, -np.inf), np.where(other & ~left, cost, -np.inf)
    return main, _greatest(to_a), _greatest(to_b)


def _greatest(values: Float) -> Index:
    """Place of the greatest value of each row; −1 where all are −inf."""
    place = values.argmax(axis=1)
    return np.where(np.isneginf(values[np.arange(place.size), place]), _NO_POINT, place)


@dataclass(frozen=True, slots=True, eq=False)
class DoubleLosses(EdgeLosses):
    """Loss over the two main edges."""

    floor_db: Float
    """What was added, `(hops,)`, so that the loss is not below that of the principal edge alone; nearly always 0."""


@dataclass(frozen=True, slots=True, eq=False)
class _Trio:
    """The principal edge of each hop and the main one on either side; ν is −inf where a side has none.

    ``share_a`` and ``share_b`` are in which the edges towards A and B count.
    """

    main: Points
    to_a: Points
    to_b: Points
    nu: Float
    nu_a: Float
    nu_b: Float
    share_a: Float
    share_b: Float

    @classmethod
    def of(cls, hops: Hops, finder: Hops) -> _Trio:
        """Find the points by `finder`, and take rise and ν from `hops`, the same paths maybe over another radius."""
        found = finder.run(_three_points)
        main, to_a, to_b = (hops.points_at(index) for index in found)
        nu_a = _section_nu(hops, (to_a.t, main.t), (to_a.rise_m, main.rise_m), found[1])
        nu_b = _section_nu(hops, (1.0 - to_b.t, 1.0 - main.t), (to_b.rise_m, main.rise_m), found[2])
        share_a, share_b = (_fade(np.abs(main.t - side.t), main.t, hops.length_m) for side in (to_a, to_b))
        return cls(main, to_a, to_b, nu_at(hops, main.t, main.rise_m), nu_a, nu_b, share_a, share_b)


def _section_nu(hops: Hops, share: tuple[Float, Float], rise_m: tuple[Float, Float], index: Index) -> Float:
    """ν of a point seen from one end and the principal edge; both given as (point, edge), shares from that end."""
    there = index != _NO_POINT
    near = np.where(there, share[0], share[1] / 2.0)
    d1, d2 = hops.length_m * near, hops.length_m * (share[1] - near)
    nu = fresnel_parameter(rise_m[0] - rise_m[1] * near / share[1], d1, d2, hops.frequency_hz)
    return np.asarray(np.where(there, nu, -np.inf))


def cascaded_knife_edges(
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: ArrayLike,
    centre_b_m: ArrayLike,
    frequency_hz: ArrayLike,
    effective_radius_m: ArrayLike,
    edges_radius_m: ArrayLike | None = None,
) -> EdgeLosses:
    """Loss of up to three knife edges in cascade: the principal edge, and the main one on either side of it.

    L = J(νp) + T·(J(νt) + J(νr) + C) dB for νp > −0.78, else 0, with T = 1 − e^(−J(νp)/6) and C = 10 + 0.04·D, D in km.
    νt is of the section from A to the principal edge, νr of the section from there to B: of the points that cost most.
    An edge counts in proportion to its distance from the principal one, in full from 500 m, or from a tenth of that
    edge's way to the nearer end where that is less.

    Parameters
    ----------
    distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m
        As in `delta_bullington`.
    edges_radius_m
        Effective radius by which the edges are found, if not the one of the loss, m. The source recommends to find
        them at the median radius and to keep them for every other one, so that the loss does not jump between edges.

    Returns
    -------
    EdgeLosses
        The loss and three slots in the order of the path: towards A, principal, towards B; NaN where ν ≤ −0.78.

    Raises
    ------
    InputError, MissingGroundError
        As in `delta_bullington`.

    Examples
    --------
    >>> two = cascaded_knife_edges([0, 4e3, 5e3, 6e3, 10e3], [0, 120, 0, 110, 0], 100, 100, 6e9, 8500e3)
    >>> round(float(two.loss_db), 2), two.distance_m.tolist()
    (33.78, [nan, 4000.0, 6000.0])

    Notes
    -----
    Source: Rec. ITU-R P.526-15 §4.4.2, the cascaded knife edge method (from memory of the text).

    That text lets any point of the sections be an edge, so that one hill counts up to three times, the more the finer
    its points. That edges fade in with their distance is this project's own rule: in §4.4.1 neighbouring points up to
    250 m apart are one obstruction, so that the nearest other one is 500 m away; nearer to an end it shrinks with the
    way to that end, which alone says how far two edges act as one (α of §4.3). A top wider than that counts as two or
    three edges, as it should: waves lose more over it than over one edge.

    No loss jumps when ground moves or rises by a little, but for what the method itself decides: where two edges
    obstruct alike, which of them is the principal one. That makes at most 1.4 dB (ν up to 8, by random search).
    """
    hops = Hops.of(distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m)
    finder = hops if edges_radius_m is None else hops.with_radius(edges_radius_m)
    trio = _Trio.of(hops, finder)
    j, j_a, j_b = (knife_edge_loss(nu) for nu in (trio.nu, trio.nu_a, trio.nu_b))
    j_a, j_b = j_a * trio.share_a, j_b * trio.share_b
    loss = j - np.expm1(-j / 6.0) * (j_a + j_b + 10.0 + 0.04 * hops.length_m / 1000.0)
    counts = trio.nu > NU_NO_LOSS
    slots = [
        (counts & (trio.nu_a > NU_NO_LOSS), trio.to_a.t, trio.to_a.height_m, trio.nu_a, j_a),
        (counts, trio.main.t, trio.main.height_m, trio.nu, j),
        (counts & (trio.nu_b > NU_NO_LOSS), trio.to_b.t, trio.to_b.height_m, trio.nu_b, j_b),
    ]
    return edge_losses(hops, np.where(counts, loss, 0.0), slots)


def _pick(mask: NDArray[np.bool_], yes: Points, no: Points) -> Points:
    """Point `yes` where `mask` holds, else `no`."""
    pairs = ((yes.t, no.t), (yes.height_m, no.height_m), (yes.rise_m, no.rise_m))
    return Points(*(np.where(mask, *pair) for pair in pairs))


def double_edge(
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: ArrayLike,
    centre_b_m: ArrayLike,
    frequency_hz: ArrayLike,
    effective_radius_m: ArrayLike,
) -> DoubleLosses:
    """Loss of the profile's two main edges, by `double_edge_loss`.

    The first is the principal edge; the second is the one of `cascaded_knife_edges` that costs more, and what it adds
    to the loss of the principal edge alone counts in the share that it counts there. Where no second edge has
    ν > −0.78, the loss is that of the principal edge alone.

    Parameters
    ----------
    distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m
        As in `delta_bullington`.

    Returns
    -------
    DoubleLosses
        The loss and two slots in the order of the path; a single edge takes the first. The edges' own losses, in the
        share that the second one counts, leave out the correction between them, and the floor.

    Raises
    ------
    InputError, MissingGroundError
        As in `delta_bullington`.

    Examples
    --------
    >>> two = double_edge([0, 10e3, 15e3, 20e3, 30e3], [0, 140, 0, 140, 0], 100, 100, 6e9, float("inf"))
    >>> round(float(two.loss_db), 2), two.distance_m.tolist()
    (37.55, [10000.0, 20000.0])

    Notes
    -----
    Source: Rec. ITU-R P.526-15 §4.3 for the loss (from memory of the text). The choice of edges and their fading in are
    those of `cascaded_knife_edges`. Two choices of the text remain: which edge is the principal one where two obstruct
    alike (at most 0.9 dB), and from where edges are taken one after the other (at most 1.4 dB; both by random search).
    """
    hops = Hops.of(distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, effective_radius_m)
    trio = _Trio.of(hops, hops)
    counts = trio.nu > NU_NO_LOSS
    pair = counts & (np.maximum(trio.nu_a, trio.nu_b) > NU_NO_LOSS)
    towards_a = knife_edge_loss(trio.nu_a) * trio.share_a > knife_edge_loss(trio.nu_b) * trio.share_b
    first = _pick(pair & towards_a, trio.to_a, trio.main)
    last = _pick(pair & ~towards_a, trio.to_b, trio.main)
    share = np.where(pair, np.where(towards_a, trio.share_a, trio.share_b), 0.0)
    between = np.where(pair, last.t - first.t, 1.0)
    spacings = (hops.length_m * first.t, hops.length_m * between, hops.length_m * (1.0 - last.t))
    terms = double_edge_terms(first.rise_m, last.rise_m, spacings, hops.frequency_hz)
    alone = knife_edge_loss(trio.nu)
    j_1 = alone * ~(pair & towards_a) * (1.0 - share) + knife_edge_loss(terms.nu_1) * share
    j_2 = alone * (pair & towards_a) * (1.0 - share) + knife_edge_loss(terms.nu_2) * share
    loss = j_1 + j_2 + share * (terms.correction_db + terms.floor_db)
    slots = [
        (counts, first.t, first.height_m, np.where(pair, terms.nu_1, trio.nu), j_1),
        (pair, last.t, last.height_m, terms.nu_2, j_2),
    ]
    base = edge_losses(hops, loss, slots)
    floor = sealed(hops, share * terms.floor_db)
    return DoubleLosses(base.loss_db, base.distance_m, base.height_m, base.nu, base.edge_loss_db, floor)
