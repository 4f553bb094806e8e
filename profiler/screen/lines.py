"""Many geodesics over one grid at once: where each crosses the columns of cell centres, as polynomials.

The axis of the grid that a path crosses most is its *main* axis, the other its *cross* axis; both count cells from the
first centre. The cross coordinate and the distance from A are polynomials of the main coordinate, through the geodesic
at Chebyshev-Lobatto nodes, so that a crossing with a line of cell centres is one evaluation at a whole number.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from profiler.path import geodesic, points_along
from profiler.units import Float

__all__ = ["GridLines", "Ints", "grid_lines"]

Ints = NDArray[np.int64]

_NODES = 5
"""Good to a micrometre for 40 km at up to 65° latitude, and to 0.1 mm for 100 km."""

_ASIDE_M = 20.0
"""How far beside the path the grid is asked which way is right: about as far as the zones of this trade reach."""

_SNAP_CELLS = 1e-6
"""As for single points: coordinates do not carry more digits."""


@dataclass(frozen=True, slots=True, eq=False)
class GridLines:
    """Paths of many hops over one grid; arrays (hops,) or (nodes, hops).

    ``column_a`` and ``row_a`` (likewise B) are the sites in cells from the first centre. ``turned`` says that the main
    axis is that of the rows. ``main`` holds the nodes along the main axis, the others the coefficients of Newton's form
    over them: the cross coordinate, the distance, and what a metre to the right of the path adds along both axes.
    """

    distance_m: Float
    azimuth_a_deg: Float
    azimuth_b_deg: Float
    column_a: Float
    row_a: Float
    column_b: Float
    row_b: Float
    turned: NDArray[np.bool_]
    main: Float
    cross_by_main: Float
    metres_by_main: Float
    right_main_by_main: Float
    right_cross_by_main: Float

    @property
    def first_main(self) -> Float:
        """Lesser of both ends along the main axis."""
        return np.asarray(np.minimum(self.main[0], self.main[-1]))

    @property
    def last_main(self) -> Float:
        """Greater of both ends along the main axis."""
        return np.asarray(np.maximum(self.main[0], self.main[-1]))

    def take(self, hops: Ints) -> GridLines:
        """Return the lines of some hops, in the order given."""
        return GridLines(*(getattr(self, name)[..., hops] for name in self.__slots__))

    def moved(self, columns: int, rows: int) -> GridLines:
        """Return the same lines over a grid whose first cell lies some columns and rows further on."""
        along, across = (np.where(self.turned, rows, columns), np.where(self.turned, columns, rows))
        cross = self.cross_by_main.copy()
        cross[0] -= across
        return replace(
            self,
            column_a=self.column_a - columns,
            row_a=self.row_a - rows,
            column_b=self.column_b - columns,
            row_b=self.row_b - rows,
            main=self.main - along,
            cross_by_main=cross,
        )

    def cross(self, main: Float, hop: Ints) -> Float:
        """Cross coordinate where hops meet coordinates of their main axis; ``hop`` is (n,), ``main`` (n,) or (n, m)."""
        return self._evaluated(self.cross_by_main, main, hop)

    def metres(self, main: Float, hop: Ints) -> Float:
        """Distance from A where hops meet coordinates of their main axis, as `cross`."""
        return self._evaluated(self.metres_by_main, main, hop)

    def beside(self, main: Float, hop: Ints) -> tuple[Float, Float]:
        """Give, where hops meet coordinates of their main axis, what one cell across the grid is for the path.

        Metres to the right of the path, and metres further along it.
        """
        right_main, right_cross = (
            self._evaluated(each, main, hop) for each in (self.right_main_by_main, self.right_cross_by_main)
        )
        step = 1e-3
        slope, metres = (
            (self._evaluated(each, main + step, hop) - self._evaluated(each, main - step, hop)) / (2.0 * step)
            for each in (self.cross_by_main, self.metres_by_main)
        )
        # a metre to the right moves along the main axis too, and with it along the path
        across = 1.0 / (right_cross - slope * right_main)
        return across, -right_main * metres * across

    def _evaluated(self, coefficients: Float, main: Float, hop: Ints) -> Float:
        """Evaluate Newton's form by Horner's scheme."""
        wide = (slice(None), hop) + (None,) * (main.ndim - 1)
        nodes, terms = self.main[wide], coefficients[wide]
        value = terms[-1] * np.ones_like(main)
        for node, term in zip(nodes[-2::-1], terms[-2::-1], strict=True):
            value *= main - node
            value += term
        return np.asarray(value)


def grid_lines(
    longitude_a: Float,
    latitude_a: Float,
    longitude_b: Float,
    latitude_b: Float,
    to_cells: Callable[[Float, Float], tuple[Float, Float]],
) -> GridLines:
    """Lay the geodesics of many hops over a grid.

    Parameters
    ----------
    longitude_a, latitude_a, longitude_b, latitude_b
        The sites, WGS 84 degrees, (hops,); two sites of a hop are apart.
    to_cells
        Gives column and row, counted in cells from the first centre, of longitudes and latitudes of any shape.

    Returns
    -------
    GridLines

    Examples
    --------
    Along the equator a degree is as many columns as it has cells:

    >>> lines = grid_lines(*(np.array([value]) for value in (10.0, 0.0, 11.0, 0.0)), lambda lon, lat: (100 * lon, lat))
    >>> hop = np.array([0])
    >>> lines.metres(np.array([1050.0]), hop).round(1).tolist(), lines.cross(np.array([1050.0]), hop).tolist()
    ([55659.7], [0.0])
    """
    distance_m, azimuth_a_deg, azimuth_b_deg = geodesic(longitude_a, latitude_a, longitude_b, latitude_b)
    share = 0.5 - 0.5 * np.cos(np.pi * np.arange(_NODES) / (_NODES - 1))
    along_m = share[:, None] * distance_m
    longitude, latitude, azimuth_deg = points_along(longitude_a, latitude_a, azimuth_a_deg, along_m)
    column, row = (_snapped(each) for each in to_cells(longitude, latitude))
    beside = to_cells(*points_along(longitude, latitude, azimuth_deg + 90.0, _ASIDE_M)[:2])
    right_column, right_row = ((there - here) / _ASIDE_M for there, here in zip(beside, (column, row), strict=True))
    turned = np.abs(column[-1] - column[0]) < np.abs(row[-1] - row[0])
    main, cross = np.where(turned, row, column), np.where(turned, column, row)
    return GridLines(
        distance_m=distance_m,
        azimuth_a_deg=azimuth_a_deg,
        azimuth_b_deg=azimuth_b_deg,
        column_a=column[0],
        row_a=row[0],
        column_b=column[-1],
        row_b=row[-1],
        turned=turned,
        main=main,
        cross_by_main=_divided_differences(main, cross),
        metres_by_main=_divided_differences(main, along_m),
        right_main_by_main=_divided_differences(main, np.where(turned, right_row, right_column)),
        right_cross_by_main=_divided_differences(main, np.where(turned, right_column, right_row)),
    )


def _snapped(count: Float) -> Float:
    """Put a place on a line of cell centres that it misses by rounding: at the grid's edge there is nothing beyond."""
    whole = np.rint(count)
    return np.where(np.abs(count - whole) < _SNAP_CELLS, whole, count)


def _divided_differences(x: Float, y: Float) -> Float:
    """Coefficients of Newton's form of the polynomials through (x, y), (nodes, hops)."""
    terms = y.copy()
    for order in range(1, len(x)):
        terms[order:] = (terms[order:] - terms[order - 1 : -1]) / (x[order:] - x[:-order])
    return terms
