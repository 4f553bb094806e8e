"""One front door to every method, for one hop at one k: a loss, the edges that set it, and what to doubt about it."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import positive
from profiler.diffraction.doubts import cascaded_doubts, double_doubts, rounded_doubts
from profiler.diffraction.edges import EdgeLosses
from profiler.diffraction.general import bullington, delta_bullington
from profiler.diffraction.obstacles import cascaded_knife_edges, double_edge, single_knife_edge
from profiler.diffraction.rounded import RoundedLosses, rounded_obstacle
from profiler.errors import InputError
from profiler.models import DiffractionMethod, Polarization
from profiler.remarks import Length, Remark, note, prefixed
from profiler.units import K_MEDIAN, MEAN_EARTH_RADIUS_M, Float

__all__ = [
    "METHODS",
    "DiffractionLoss",
    "Edge",
    "Inputs",
    "Method",
    "RoundTop",
    "diffract",
    "diffract_over_k",
    "losses_over_k",
]


@dataclass(frozen=True, slots=True)
class Edge:
    """One point of the ground, or of a construction over it, that set a loss."""

    distance_m: float
    """From A."""
    height_m: float
    """Above the datum, without the bulge of the earth."""
    nu: float
    """Fresnel parameter by which the method sees it."""
    loss_db: float | None
    """What it was charged; None for a point that only shapes the construction."""


@dataclass(frozen=True, slots=True)
class RoundTop:
    """The top of the main obstacle, as the method of the rounded obstacle fits it."""

    radius_m: float | None
    """On the bulged earth; 0 where fewer than 3 points are on the top, None where it is not convex."""
    roundness: float | None
    """The m of Rec. ITU-R P.526-15 §4.2; None where the radius is."""
    from_m: float
    """Its extent, from A."""
    to_m: float


@dataclass(frozen=True, slots=True)
class DiffractionLoss:
    """Diffraction loss of one hop at one k by one method."""

    k: float
    method: DiffractionMethod
    loss_db: float
    edges: tuple[Edge, ...]
    """In the order of the path; empty where nothing is near enough to the ray to cost anything."""
    warnings: tuple[Remark, ...]
    top: RoundTop | None = None
    """Of the rounded obstacle alone, where it costs anything."""


@dataclass(frozen=True, slots=True, eq=False)
class Inputs:
    """One profile at one frequency over one effective radius or many, and what only one method needs."""

    distance_m: Float
    height_m: Float
    centre_a_m: float
    centre_b_m: float
    frequency_hz: float
    radius_m: Float
    polarization: Polarization
    sea_fraction: float
    cell_m: float

    @property
    def path(self) -> tuple[Float, Float, float, float, float, Float]:
        """The arguments that all methods share."""
        return self.distance_m, self.height_m, self.centre_a_m, self.centre_b_m, self.frequency_hz, self.radius_m


Found = tuple[Float, EdgeLosses | None]
"""The loss over each effective radius, and the edges that set it where the method has edges."""


@dataclass(frozen=True, slots=True)
class Method:
    """A method that can be chosen by name, and the ranges its source states for it."""

    name: DiffractionMethod
    title: str
    source: str
    run: Callable[[Inputs], Found]
    frequency_hz: tuple[float, float]
    frequency_source: str
    distance_m: tuple[float, float] | None = None
    distance_source: str = ""
    doubts: Callable[[Inputs, Any], list[Remark]] | None = None
    """Why a profile is not what the method was made for; of one effective radius, with the edges found over it."""

    def range_warnings(self, distance_m: float, frequency_hz: float) -> list[Remark]:
        """One line for each of frequency and distance that is outside the range stated for the method."""
        lines: list[Remark] = []
        low, high = self.frequency_hz
        if not low <= frequency_hz <= high:
            stated = f"{low / 1e9:g} GHz and above" if np.isinf(high) else f"{low / 1e9:g} to {high / 1e9:g} GHz"
            lines.append(f"frequency {frequency_hz / 1e9:g} GHz is outside {stated} ({self.frequency_source})")
        if self.distance_m is not None and not self.distance_m[0] <= distance_m <= self.distance_m[1]:
            lengths = (Length(each_m, far=True) for each_m in (distance_m, *self.distance_m))
            words = f"distance {{}} is outside {{}} to {{}} ({self.distance_source})"
            lines.append(note("diffraction", words, *lengths))
        return lines


def _delta(inputs: Inputs) -> Found:
    found = delta_bullington(*inputs.path, inputs.polarization, inputs.sea_fraction)
    return found.total_db, found.edges


def _sphere(inputs: Inputs) -> Found:
    return delta_bullington(*inputs.path, inputs.polarization, inputs.sea_fraction).spherical_db, None


def _rounded(inputs: Inputs) -> Found:
    found = rounded_obstacle(*inputs.path, inputs.cell_m)
    return found.loss_db, found


def _over_edges(method: Callable[..., EdgeLosses]) -> Callable[[Inputs], Found]:
    """Run a method that takes nothing but the path and gives its edges with the loss."""

    def run(inputs: Inputs) -> Found:
        found = method(*inputs.path)
        return found.loss_db, found

    return run


_EDGES_RANGE = ((30e6, float("inf")), "Rec. ITU-R P.526-15 §4: mainly above 30 MHz")
_GENERAL_RANGE = (
    (30e6, 50e9),
    "Rec. ITU-R P.526-15 §4, and P.452 for the same model",
    (250.0, 3_000_000.0),
    "Rec. ITU-R P.1812, for the same model; P.526-15 states none",
)
_SPHERE_RANGE = ((10e6, float("inf")), "Rec. ITU-R P.526-15 §3.2")

_knife = _over_edges(single_knife_edge)
_double = _over_edges(double_edge)
_cascaded = _over_edges(partial(cascaded_knife_edges, edges_radius_m=K_MEDIAN * MEAN_EARTH_RADIUS_M))

_P526 = "Rec. ITU-R P.526-15"
_ALL = (
    Method("delta-bullington", "Delta-Bullington", f"{_P526} §4.5", _delta, *_GENERAL_RANGE),
    Method("bullington", "Bullington", f"{_P526} §4.5.1", _over_edges(bullington), *_GENERAL_RANGE),
    Method("spherical-earth", "Smooth spherical earth", f"{_P526} §3.2", _sphere, *_SPHERE_RANGE),
    Method("knife-edge", "Single knife edge", f"{_P526} §4.1", _knife, *_EDGES_RANGE),
    Method(
        "rounded-obstacle",
        "Single rounded obstacle",
        f"{_P526} §4.2",
        _rounded,
        *_EDGES_RANGE,
        doubts=rounded_doubts,
    ),
    Method("double-edge", "Two isolated edges", f"{_P526} §4.3", _double, *_EDGES_RANGE, doubts=double_doubts),
    Method(
        "cascaded-edges", "Cascaded knife edges", f"{_P526} §4.4.2", _cascaded, *_EDGES_RANGE, doubts=cascaded_doubts
    ),
)

METHODS: Mapping[str, Method] = MappingProxyType({method.name: method for method in _ALL})
"""Every method by its name, the default first."""


def _prepared(
    method: str,
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    k: ArrayLike,
    polarization: Polarization,
    sea_fraction: float,
    cell_m: float,
) -> tuple[Method, Inputs]:
    """Find the method by its name, and put one profile over several effective radii before it."""
    if method not in METHODS:
        raise InputError(f"diffraction method = {method!r}: must be one of {', '.join(METHODS)}")
    radius = np.atleast_1d(positive("k", k, infinite=True)) * MEAN_EARTH_RADIUS_M
    distance, height = np.asarray(distance_m, dtype=float), np.asarray(height_m, dtype=float)
    if height.ndim != 1 or distance.ndim != 1:
        raise InputError("height_m must be one profile, (points,): call the method's own function for a batch")
    site = (distance, height, centre_a_m, centre_b_m, frequency_hz)
    return METHODS[method], Inputs(*site, radius, polarization, sea_fraction, cell_m)


def losses_over_k(
    method: str,
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    k: ArrayLike,
    *,
    polarization: Polarization = "vertical",
    sea_fraction: float = 0.0,
    cell_m: float = 0.0,
) -> Float:
    """Diffraction losses of one hop at many k, dB, `(k,)`: those of `diffract_over_k`, without edges and doubts.

    Examples
    --------
    >>> hop = ([0, 5e3, 10e3], [100, 130, 100], 130, 130, 6e9)
    >>> losses_over_k("knife-edge", *hop, [0.6, 4 / 3]).round(2).tolist()
    [9.58, 7.65]
    """
    site = (distance_m, height_m, centre_a_m, centre_b_m, frequency_hz)
    chosen, inputs = _prepared(method, *site, k, polarization, sea_fraction, cell_m)
    return chosen.run(inputs)[0]


def diffract_over_k(
    method: str,
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    k: Sequence[float],
    *,
    polarization: Polarization = "vertical",
    sea_fraction: float = 0.0,
    cell_m: float = 0.0,
) -> tuple[DiffractionLoss, ...]:
    """Diffraction losses of one hop at several k in one go, by a method chosen by name.

    Parameters
    ----------
    method, distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, polarization, sea_fraction, cell_m
        As in `diffract`.
    k
        Effective-earth-radius factors, each above 0; infinity is allowed.

    Returns
    -------
    tuple of DiffractionLoss
        One for each k, as `diffract` gives it.

    Raises
    ------
    InputError, MissingGroundError
        As in `diffract`.

    Examples
    --------
    >>> hop = ([0, 5e3, 10e3], [100, 130, 100], 130, 130, 6e9)
    >>> [round(loss.loss_db, 2) for loss in diffract_over_k("knife-edge", *hop, [0.6, 4 / 3])]
    [9.58, 7.65]
    """
    site = (distance_m, height_m, centre_a_m, centre_b_m, frequency_hz)
    chosen, inputs = _prepared(method, *site, k, polarization, sea_fraction, cell_m)
    loss_db, found = chosen.run(inputs)
    ranges = chosen.range_warnings(float(inputs.distance_m[-1]), frequency_hz)
    losses = []
    for i, factor in enumerate(k):
        edges = None if found is None else found.of_hop(i)
        doubts: list[Remark] = []
        if edges is not None and chosen.doubts is not None:
            doubts = chosen.doubts(replace(inputs, radius_m=inputs.radius_m[i]), edges)
        warnings = tuple(prefixed(method, line) for line in (*ranges, *doubts))
        losses.append(
            DiffractionLoss(float(factor), chosen.name, float(loss_db[i]), _edges(edges), warnings, _top(edges))
        )
    return tuple(losses)


def diffract(
    method: str,
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    k: float,
    *,
    polarization: Polarization = "vertical",
    sea_fraction: float = 0.0,
    cell_m: float = 0.0,
) -> DiffractionLoss:
    """Diffraction loss of one hop by a method chosen by name.

    Parameters
    ----------
    method
        A name of `METHODS`: ``"delta-bullington"`` (the default elsewhere), ``"bullington"``, ``"spherical-earth"``,
        ``"knife-edge"``, ``"rounded-obstacle"``, ``"double-edge"``, ``"cascaded-edges"``.
    distance_m, height_m
        One profile, `(points,)`: distances from A and surface above the datum without any bulge, m.
    centre_a_m, centre_b_m
        Antenna centres above the datum, m.
    frequency_hz
        Frequency, Hz.
    k
        Effective-earth-radius factor, above 0; may be infinite.
    polarization, sea_fraction
        As in `delta_bullington`; only the spherical earth depends on them.
    cell_m
        Length of a cell of the terrain, as in `rounded_obstacle`, which alone depends on it.

    Returns
    -------
    DiffractionLoss
        The loss, the edges that set it in the order of the path, and a warning for each doubt: frequency or distance
        outside the range stated for the method, or a profile that is not what the method was made for.
        ``"spherical-earth"`` takes the heights above the smooth surface that delta-Bullington fits, and has no edges.
        ``"delta-bullington"`` and ``"bullington"`` give the points that the horizon rays touch (no loss of their own)
        and between them the equivalent edge.

    Raises
    ------
    InputError
        The method is not known, or an argument is out of range.
    MissingGroundError
        A height is not a finite number.

    Examples
    --------
    >>> loss = diffract("knife-edge", [0, 5e3, 10e3], [100, 180, 100], 130, 130, 6e9, 4 / 3)
    >>> round(loss.loss_db, 2), [(edge.distance_m, round(edge.nu, 2)) for edge in loss.edges]
    (29.11, [(5000.0, 6.51)])
    >>> print(diffract("bullington", [0, 50, 300], [0, 0, 0], 10, 10, 80e9, 1).warnings[0])
    bullington: frequency 80 GHz is outside 0.03 to 50 GHz (Rec. ITU-R P.526-15 §4, and P.452 for the same model)
    """
    only = (float(k),)
    [loss] = diffract_over_k(
        method,
        distance_m,
        height_m,
        centre_a_m,
        centre_b_m,
        frequency_hz,
        only,
        polarization=polarization,
        sea_fraction=sea_fraction,
        cell_m=cell_m,
    )
    return loss


def _edges(found: EdgeLosses | None) -> tuple[Edge, ...]:
    """Return the used slots of a single hop as edges."""
    if found is None:
        return ()
    columns = (found.distance_m, found.height_m, found.nu, found.edge_loss_db)
    rows = zip(*(column.tolist() for column in columns), strict=True)
    return tuple(Edge(d, h, nu, None if np.isnan(loss) else loss) for d, h, nu, loss in rows if not np.isnan(d))


def _top(found: EdgeLosses | None) -> RoundTop | None:
    """Return the fitted top of a single hop, if its method fits one and it costs anything."""
    if not isinstance(found, RoundedLosses) or not found.loss_db > 0:
        return None
    fit = None if np.isnan(found.radius_m) else float(found.radius_m)
    return RoundTop(fit, None if fit is None else float(found.roundness), *found.top_m.tolist())
