"""A surface beside a path, cut into patches on each of which it is a polynomial of the second degree.

Between four cell centres a bilinear surface is a polynomial in the grid's own coordinates, and within a cell the map
from these to distances along and across the path is affine to a millimetre. So the whole surface is a list of patches,
each the unit square of its own coordinates (p, q), whatever rasters, grids and coordinate systems it came from. Where
layers of different grids lie over one another the patches overlap a little: windows cut off what lies outside.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from profiler.units import Float

__all__ = ["Patches", "bilinear", "cut_patches", "join_patches"]

Index = NDArray[np.intp]

_ALIGNED = 1e-6
"""Grids whose lines turn by less in a cell are parallel: coordinates do not carry more digits."""


@dataclass(frozen=True, slots=True, eq=False)
class Patches:
    """Patches of surface, arrays (m, ...).

    ``along_m`` and ``across_m`` (m, 3) give the place as c0 + c1·p + c2·q, ``surface_m`` (m, 6) the height as
    c0 + c1·p + c2·q + c3·p·q + c4·p² + c5·q²; ``cover_m`` (m, 6) is the part of it that is cover. A point of the patch
    counts where 0 <= p, q <= 1 and every form of ``window`` (m, w, 3), c0 + c1·p + c2·q, is 0 to 1 too. ``whole`` says
    that all that stands there is known, the cover too.
    """

    along_m: Float
    across_m: Float
    surface_m: Float
    cover_m: Float
    window: Float
    whole: NDArray[np.bool_]

    @property
    def size(self) -> int:
        """How many patches there are."""
        return int(self.whole.size)

    @property
    def reach_m(self) -> tuple[Float, Float]:
        """Distances from A at which each begins and ends."""
        low = self.along_m[:, 0] + np.minimum(self.along_m[:, 1:], 0.0).sum(axis=1)
        return low, low + np.abs(self.along_m[:, 1:]).sum(axis=1)

    def take(self, which: Index | NDArray[np.bool_]) -> Patches:
        """Return the chosen patches, in the order chosen."""
        return Patches(
            self.along_m[which],
            self.across_m[which],
            self.surface_m[which],
            self.cover_m[which],
            self.window[which],
            self.whole[which],
        )

    def at(self, which: Index | np.intp, p: Float, q: Float) -> tuple[Float, Float, Float, Float]:
        """Distance along and across, surface and cover at places of patches."""
        along, across = (each[which].T for each in (self.along_m, self.across_m))
        heights = (_value(each[which].T, p, q) for each in (self.surface_m, self.cover_m))
        return along[0] + along[1] * p + along[2] * q, across[0] + across[1] * p + across[2] * q, *heights

    def cover_at(self, which: Index, along_m: Float, across_m: Float) -> Float:
        """Cover where patches lie at distances along and across the path."""
        a, y = self.along_m[which].T, self.across_m[which].T
        turn, along, across = a[1] * y[2] - a[2] * y[1], along_m - a[0], across_m - y[0]
        p, q = (along * y[2] - across * a[2]) / turn, (across * a[1] - along * y[1]) / turn
        return _value(self.cover_m[which].T, p, q)


def _value(c: Float, p: Float, q: Float) -> Float:
    """Value of polynomials (6, ...) of the second degree."""
    return np.asarray(c[0] + (c[1] + c[3] * q + c[4] * p) * p + (c[2] + c[5] * q) * q)


def bilinear(forms: Float, corners: Float) -> Float:
    """Polynomial (m, 6) of a bilinear surface over another unit square, whose coordinates are two forms (m, 2, 3).

    ``corners`` (m, 4) are its heights at (0, 0), (1, 0), (0, 1) and (1, 1) of that square.

    Examples
    --------
    >>> own = np.array([[[0.0, 1.0, 0.0], [0.0, 0.0, 1.0]]])
    >>> bilinear(own, np.array([[1.0, 2.0, 4.0, 9.0]])).tolist()
    [[1.0, 1.0, 3.0, 4.0, 0.0, 0.0]]
    """
    z00, z10, z01, z11 = corners.T
    x, w = forms[:, 0].T, forms[:, 1].T
    slope_x, slope_w, twist = z10 - z00, z01 - z00, z00 + z11 - z10 - z01
    return np.stack(
        [
            z00 + slope_x * x[0] + slope_w * w[0] + twist * x[0] * w[0],
            slope_x * x[1] + slope_w * w[1] + twist * (x[0] * w[1] + x[1] * w[0]),
            slope_x * x[2] + slope_w * w[2] + twist * (x[0] * w[2] + x[2] * w[0]),
            twist * (x[1] * w[2] + x[2] * w[1]),
            twist * x[1] * w[1],
            twist * x[2] * w[2],
        ],
        axis=1,
    )


def cut_patches(patches: Patches, forms: Float) -> tuple[Patches, Index]:
    """Cut each patch down to a parallelogram: the part where its two forms (m, 2, 3) are 0 to 1.

    Returns
    -------
    patches, which
        What is left, each with coordinates of its own that just hold it, and of which patch it is a part. Windows are
        added where the parallelogram is not the whole of them.
    """
    c0, c1, c2 = np.moveaxis(forms, 2, 0)  # (m, 2) each
    turn = c1[:, 0] * c2[:, 1] - c1[:, 1] * c2[:, 0]
    # the box around the parallelogram, from its middle and half sides: solve forms = 1/2 and bound the inverse
    dx, dw = 0.5 - c0[:, 0], 0.5 - c0[:, 1]
    middle_p, middle_q = (dx * c2[:, 1] - dw * c2[:, 0]) / turn, (dw * c1[:, 0] - dx * c1[:, 1]) / turn
    half_p = 0.5 * (np.abs(c2[:, 0]) + np.abs(c2[:, 1])) / np.abs(turn)
    half_q = 0.5 * (np.abs(c1[:, 0]) + np.abs(c1[:, 1])) / np.abs(turn)
    low_p, low_q = np.maximum(middle_p - half_p, 0.0), np.maximum(middle_q - half_q, 0.0)
    wide_p, wide_q = np.minimum(middle_p + half_p, 1.0) - low_p, np.minimum(middle_q + half_q, 1.0) - low_q
    left = np.flatnonzero((wide_p > 0.0) & (wide_q > 0.0))
    at, wide = (low_p[left], low_q[left]), (wide_p[left], wide_q[left])
    kept = _moved(patches.take(left), at, wide)
    forms = _moved_forms(forms[left], at, wide)
    # forms that vary along one side alone are cut by the box itself
    skew = np.minimum(np.abs(forms[:, :, 1]), np.abs(forms[:, :, 2])).max(initial=0.0)
    if skew > _ALIGNED:
        kept = replace(kept, window=np.concatenate((kept.window, forms), axis=1))
    return kept, left


def join_patches(parts: Sequence[Patches]) -> Patches:
    """Put lists of patches together; those with fewer windows get some that leave nothing out."""
    most = max(part.window.shape[1] for part in parts)
    open_window = np.array([0.5, 0.0, 0.0])
    windows = [
        np.concatenate((part.window, np.broadcast_to(open_window, (part.size, most - part.window.shape[1], 3))), axis=1)
        for part in parts
    ]
    return Patches(
        np.concatenate([part.along_m for part in parts]),
        np.concatenate([part.across_m for part in parts]),
        np.concatenate([part.surface_m for part in parts]),
        np.concatenate([part.cover_m for part in parts]),
        np.concatenate(windows),
        np.concatenate([part.whole for part in parts]),
    )


def _moved(patches: Patches, at: tuple[Float, Float], wide: tuple[Float, Float]) -> Patches:
    """Take the box [at, at + wide] of each patch for its unit square."""
    return Patches(
        _moved_forms(patches.along_m[:, None], at, wide)[:, 0],
        _moved_forms(patches.across_m[:, None], at, wide)[:, 0],
        _moved_polynomial(patches.surface_m, at, wide),
        _moved_polynomial(patches.cover_m, at, wide),
        _moved_forms(patches.window, at, wide),
        patches.whole,
    )


def _moved_forms(forms: Float, at: tuple[Float, Float], wide: tuple[Float, Float]) -> Float:
    (p, q), (dp, dq) = at, wide
    c0, c1, c2 = np.moveaxis(forms, 2, 0)
    moved = (c0 + c1 * p[:, None] + c2 * q[:, None], c1 * dp[:, None], c2 * dq[:, None])
    return np.stack(moved, axis=2)


def _moved_polynomial(surface: Float, at: tuple[Float, Float], wide: tuple[Float, Float]) -> Float:
    (p, q), (dp, dq) = at, wide
    _, c1, c2, c3, c4, c5 = surface.T
    return np.stack(
        [
            _value(surface.T, p, q),
            (c1 + c3 * q + 2.0 * c4 * p) * dp,
            (c2 + c3 * p + 2.0 * c5 * q) * dq,
            c3 * dp * dq,
            c4 * dp**2,
            c5 * dq**2,
        ],
        axis=1,
    )
