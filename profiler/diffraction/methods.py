"""One front door to every method, for one hop at one k: a loss, the edges that set it, and what to doubt about it."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike

from profiler.diffraction.edges import EdgeLosses
from profiler.diffraction.formulas import MOST_ROUND
from profiler.diffraction.general import bullington, delta_bullington
from profiler.diffraction.obstacles import cascaded_knife_edges, double_edge, single_knife_edge
from profiler.diffraction.rounded import rounded_obstacle
from profiler.errors import InputError
from profiler.units import K_MEDIAN, MEAN_EARTH_RADIUS_M, Float

__all__ = ["DEFAULT_METHOD", "METHODS", "DiffractionLoss", "Edge", "Method", "compare", "diffract", "losses_over_k"]


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
class DiffractionLoss:
    """Diffraction loss of one hop at one k by one method."""

    k: float
    method: str
    loss_db: float
    edges: tuple[Edge, ...]
    """In the order of the path; empty where nothing is near enough to the ray to cost anything."""
    warnings: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class _Inputs:
    """What a solver needs: the six arguments that all methods share, and those that only the spherical earth needs."""

    common: tuple[ArrayLike, ArrayLike, ArrayLike, ArrayLike, float, ArrayLike]
    polarization: str
    sea_fraction: float


_Solution = tuple[float, EdgeLosses | None, tuple[str, ...]]


@dataclass(frozen=True, slots=True)
class Method:
    """A method that can be chosen by name, and the ranges its source states for it."""

    name: str
    title: str
    source: str
    losses_db: Callable[[_Inputs], Float]
    """Losses alone, of as many hops as the inputs broadcast to."""
    solve: Callable[[_Inputs], _Solution]
    """Loss of one hop with its edges and the doubts about it."""
    frequency_hz: tuple[float, float]
    frequency_source: str
    distance_m: tuple[float, float] | None = None
    distance_source: str = ""

    def range_warnings(self, distance_m: float, frequency_hz: float) -> tuple[str, ...]:
        """One line for each of frequency and distance that is outside the range stated for the method."""
        lines = []
        low, high = self.frequency_hz
        if not low <= frequency_hz <= high:
            stated = f"{low / 1e9:g} GHz and above" if np.isinf(high) else f"{low / 1e9:g} to {high / 1e9:g} GHz"
            lines.append(f"frequency {frequency_hz / 1e9:g} GHz is outside {stated} ({self.frequency_source})")
        if self.distance_m is not None and not self.distance_m[0] <= distance_m <= self.distance_m[1]:
            stated = f"{self.distance_m[0] / 1000:g} to {self.distance_m[1] / 1000:g} km"
            lines.append(f"distance {distance_m / 1000:g} km is outside {stated} ({self.distance_source})")
        return tuple(lines)


def _cascade_at_median(inputs: _Inputs) -> EdgeLosses:
    return cascaded_knife_edges(*inputs.common, edges_radius_m=K_MEDIAN * MEAN_EARTH_RADIUS_M)


def _delta(inputs: _Inputs) -> _Solution:
    result = delta_bullington(*inputs.common, inputs.polarization, inputs.sea_fraction)
    return float(result.total_db), result.edges, ()


def _bullington(inputs: _Inputs) -> _Solution:
    result = bullington(*inputs.common)
    return float(result.loss_db), result, ()


def _sphere(inputs: _Inputs) -> _Solution:
    result = delta_bullington(*inputs.common, inputs.polarization, inputs.sea_fraction)
    return float(result.spherical_db), None, ()


def _knife(inputs: _Inputs) -> _Solution:
    result = single_knife_edge(*inputs.common)
    return float(result.loss_db), result, ()


def _rounded(inputs: _Inputs) -> _Solution:
    result = rounded_obstacle(*inputs.common)
    lines = []
    if result.loss_db > 0:
        if np.isnan(result.radius_m):
            lines.append(
                "the top of the main obstacle is not convex, so no radius fits it: the loss is that of a knife edge"
            )
        if result.roundness > MOST_ROUND:
            lines.append(
                f"roundness m = {float(result.roundness):.1f} is above {MOST_ROUND:g}, where the fit of "
                "Rec. ITU-R P.526-15 §4.2 turns over: take spherical-earth or delta-bullington"
            )
        if not result.isolated:
            first, last = (float(x) / 1000 for x in result.top_m)
            lines.append(
                f"more than one obstacle: the horizon rays do not both touch the top from {first:.3f} to {last:.3f} km"
            )
    return float(result.loss_db), result, tuple(lines)


def _double(inputs: _Inputs) -> _Solution:
    result = double_edge(*inputs.common)
    others = cascaded_knife_edges(*inputs.common).distance_m
    left_out = set(others[~np.isnan(others)].tolist()) - set(result.distance_m.tolist())
    lines = tuple(f"a third edge, {at / 1000:.3f} km from A, is left out: cascaded-edges counts it" for at in left_out)
    return float(result.loss_db), result, lines


def _cascaded(inputs: _Inputs) -> _Solution:
    result = _cascade_at_median(inputs)
    worst, kept = single_knife_edge(*inputs.common), np.nan_to_num(result.nu[1], nan=-np.inf)
    lines: tuple[str, ...] = ()
    if worst.nu[0] > kept:
        lines = (
            f"the edges are those of k = 4/3, as Rec. ITU-R P.526-15 §4.4.2 recommends; at this k the ground "
            f"{float(worst.distance_m[0]) / 1000:.3f} km from A obstructs more, ν = {float(worst.nu[0]):.2f}",
        )
    return float(result.loss_db), result, lines


_EDGES_HZ = (30e6, float("inf"))
_EDGES_SOURCE = "Rec. ITU-R P.526-15 §4: mainly above 30 MHz"
_GENERAL_HZ = (30e6, 50e9)
_GENERAL_SOURCE = "Rec. ITU-R P.526-15 §4, and P.452 for the same model"
_GENERAL_M = (250.0, 3_000_000.0)
_GENERAL_M_SOURCE = "Rec. ITU-R P.1812, for the same model; P.526-15 states none"

DEFAULT_METHOD = "delta-bullington"

_ALL = (
    Method(
        "delta-bullington",
        "Delta-Bullington",
        "Rec. ITU-R P.526-15 §4.5",
        lambda i: delta_bullington(*i.common, i.polarization, i.sea_fraction).total_db,
        _delta,
        _GENERAL_HZ,
        _GENERAL_SOURCE,
        _GENERAL_M,
        _GENERAL_M_SOURCE,
    ),
    Method(
        "bullington",
        "Bullington",
        "Rec. ITU-R P.526-15 §4.5.1",
        lambda i: bullington(*i.common).loss_db,
        _bullington,
        _GENERAL_HZ,
        _GENERAL_SOURCE,
        _GENERAL_M,
        _GENERAL_M_SOURCE,
    ),
    Method(
        "spherical-earth",
        "Smooth spherical earth",
        "Rec. ITU-R P.526-15 §3.2",
        lambda i: delta_bullington(*i.common, i.polarization, i.sea_fraction).spherical_db,
        _sphere,
        (10e6, float("inf")),
        "Rec. ITU-R P.526-15 §3.2",
    ),
    Method(
        "knife-edge",
        "Single knife edge",
        "Rec. ITU-R P.526-15 §4.1",
        lambda i: single_knife_edge(*i.common).loss_db,
        _knife,
        _EDGES_HZ,
        _EDGES_SOURCE,
    ),
    Method(
        "rounded-obstacle",
        "Single rounded obstacle",
        "Rec. ITU-R P.526-15 §4.2",
        lambda i: rounded_obstacle(*i.common).loss_db,
        _rounded,
        _EDGES_HZ,
        _EDGES_SOURCE,
    ),
    Method(
        "double-edge",
        "Two isolated edges",
        "Rec. ITU-R P.526-15 §4.3",
        lambda i: double_edge(*i.common).loss_db,
        _double,
        _EDGES_HZ,
        _EDGES_SOURCE,
    ),
    Method(
        "cascaded-edges",
        "Cascaded knife edges",
        "Rec. ITU-R P.526-15 §4.4.2",
        lambda i: _cascade_at_median(i).loss_db,
        _cascaded,
        _EDGES_HZ,
        _EDGES_SOURCE,
    ),
)

METHODS: Mapping[str, Method] = MappingProxyType({method.name: method for method in _ALL})
"""Every method by its name, the default first."""


def _edges(found: EdgeLosses | None) -> tuple[Edge, ...]:
    """Return the used slots of a single hop as edges."""
    if found is None:
        return ()
    columns = (found.distance_m, found.height_m, found.nu, found.edge_loss_db)
    rows = zip(*(column.tolist() for column in columns), strict=True)
    return tuple(Edge(d, h, nu, None if np.isnan(loss) else loss) for d, h, nu, loss in rows if not np.isnan(d))


def _require_known(method: str) -> None:
    """Stop unless the method has a name that is known."""
    if method not in METHODS:
        raise InputError(f"diffraction method = {method!r}: must be one of {', '.join(METHODS)}")


def diffract(
    method: str,
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    k: float,
    *,
    polarization: str = "vertical",
    sea_fraction: float = 0.0,
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
    _require_known(method)
    if not k > 0:
        raise InputError(
            f"k = {k:g}: must be above 0 for diffraction (infinity is allowed; a negative k has no horizon)"
        )
    if np.ndim(height_m) != 1 or np.ndim(distance_m) != 1:
        raise InputError("height_m must be one profile, (points,): call the method's own function for a batch")
    chosen = METHODS[method]
    common = (distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, k * MEAN_EARTH_RADIUS_M)
    loss_db, found, doubts = chosen.solve(_Inputs(common, polarization, sea_fraction))
    ranges = chosen.range_warnings(float(np.asarray(distance_m)[-1]), frequency_hz)
    warnings = tuple(f"{method}: {line}" for line in (*ranges, *doubts))
    return DiffractionLoss(float(k), method, loss_db, _edges(found), warnings)


def losses_over_k(
    method: str,
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    k: ArrayLike,
    *,
    polarization: str = "vertical",
    sea_fraction: float = 0.0,
) -> Float:
    """Diffraction losses of one hop at many k at once, by a method chosen by name; without edges and warnings.

    Parameters
    ----------
    method, distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, polarization, sea_fraction
        As in `diffract`.
    k
        Effective-earth-radius factors, (m,), each above 0.

    Returns
    -------
    ndarray
        Losses in dB, (m,).

    Raises
    ------
    InputError, MissingGroundError
        As in `diffract`.

    Examples
    --------
    >>> losses_over_k("knife-edge", [0, 5e3, 10e3], [100, 130, 100], 130, 130, 6e9, [0.6, 4 / 3]).round(2).tolist()
    [9.58, 7.65]
    """
    factors = np.asarray(k, dtype=float)
    _require_known(method)
    if factors.ndim != 1 or np.any(~(factors > 0)):
        raise InputError(f"k = {k!r}: must be a row of factors above 0")
    common = (distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, factors * MEAN_EARTH_RADIUS_M)
    return np.asarray(METHODS[method].losses_db(_Inputs(common, polarization, sea_fraction)))


def compare(
    distance_m: ArrayLike,
    height_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    k: float,
    *,
    polarization: str = "vertical",
    sea_fraction: float = 0.0,
) -> tuple[DiffractionLoss, ...]:
    """Diffraction loss of one hop by every method, in the order of `METHODS`; parameters and errors as in `diffract`.

    Examples
    --------
    >>> losses = compare([0, 5e3, 10e3], [100, 180, 100], 130, 130, 6e9, 4 / 3)
    >>> for loss in losses:
    ...     print(f"{loss.method:17}{loss.loss_db:5.1f}")
    delta-bullington  39.2
    bullington        39.2
    spherical-earth    0.0
    knife-edge        29.1
    rounded-obstacle  29.1
    double-edge       29.1
    cascaded-edges    39.4
    """
    hop = (distance_m, height_m, centre_a_m, centre_b_m, frequency_hz, k)
    return tuple(diffract(name, *hop, polarization=polarization, sea_fraction=sea_fraction) for name in METHODS)
