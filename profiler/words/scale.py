"""The units that a reader asked for, and lengths in them: metres and kilometres, or feet and statute miles."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import overload

from profiler.remarks import Length, Note, minus
from profiler.units import FOOT_M, STATUTE_MILE_M, Float

__all__ = ["METRES", "Scale"]


@dataclass(frozen=True, slots=True)
class Scale:
    """Metres and kilometres, or feet and statute miles; the terminal, the figures and the documents write with it."""

    feet: bool = False

    @property
    def distance_unit(self) -> str:
        """Unit of distances along and across the path."""
        return "mi" if self.feet else "km"

    @property
    def height_unit(self) -> str:
        """Unit of heights, clearances and radii."""
        return "ft" if self.feet else "m"

    @overload
    def distance(self, value_m: float) -> float: ...
    @overload
    def distance(self, value_m: Float) -> Float: ...
    def distance(self, value_m: float | Float) -> float | Float:
        """Convert metres into kilometres or miles."""
        return value_m / (STATUTE_MILE_M if self.feet else 1e3)

    @overload
    def height(self, value_m: float) -> float: ...
    @overload
    def height(self, value_m: Float) -> Float: ...
    def height(self, value_m: float | Float) -> float | Float:
        """Convert metres into metres or feet."""
        return value_m / (FOOT_M if self.feet else 1.0)

    def height_number(self, value_m: float, digits: int = 1) -> str:
        """Write a height without its unit, for a table whose title has it."""
        return minus(f"{self.height(float(value_m)):.{digits}f}")

    def distance_number(self, value_m: float, digits: int = 2) -> str:
        """Write a distance without its unit, for a table whose title has it."""
        return minus(f"{self.distance(float(value_m)):.{digits}f}")

    def height_text(self, value_m: float, digits: int | None = None) -> str:
        """Write a height with its unit, to a tenth, and finer below 1 so that a small number is not written as 0.

        Examples
        --------
        >>> Scale().height_text(-12.34), Scale().height_text(0.034), Scale(feet=True).height_text(1.0)
        ('−12.3 m', '0.03 m', '3.3 ft')
        """
        return Length(float(value_m), digits).text(feet=self.feet)

    def distance_text(self, value_m: float) -> str:
        """Write a distance with its unit, to about 10 m, and in metres or feet where it is short.

        Examples
        --------
        >>> Scale().distance_text(12_431.0), Scale(feet=True).distance_text(12_431.0), Scale().distance_text(40.0)
        ('12.43 km', '7.72 mi', '40 m')
        """
        return Length(float(value_m), far=True).text(feet=self.feet)

    def raise_text(self, value_m: float) -> str:
        """Write by how much something must rise, rounded up to a tenth so that it is enough.

        Examples
        --------
        >>> Scale().raise_text(65.01), Scale(feet=True).raise_text(3.0)
        ('65.1 m', '9.9 ft')
        """
        tenths = math.ceil(round(10.0 * self.height(float(value_m)), 6))
        return f"{minus(f'{tenths / 10.0:.1f}')} {self.height_unit}"

    def text(self, remark: Note | str) -> str:
        """Write a remark in these units."""
        return remark if isinstance(remark, str) else remark.text(feet=self.feet)


METRES = Scale()
