"""The units that a figure shows, and how numbers are written in them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from typing import overload

from profiler.models import Rule
from profiler.units import FOOT_M, STATUTE_MILE_M, Float

__all__ = ["Scale", "k_text", "minus", "position_text", "required_text"]


@dataclass(frozen=True, slots=True)
class Scale:
    """Metres and kilometres, or feet and statute miles."""

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

    def distance_text(self, value_m: float) -> str:
        """Write a distance with its unit, to about 10 m.

        Examples
        --------
        >>> Scale().distance_text(12_431.0), Scale(feet=True).distance_text(12_431.0)
        ('12.43 km', '7.72 mi')
        """
        return f"{self.distance(float(value_m)):.2f} {self.distance_unit}"

    def height_text(self, value_m: float) -> str:
        """Write a height with its unit, to a tenth, and finer below 1 so that a small number is not written as 0.

        Examples
        --------
        >>> Scale().height_text(-12.34), Scale().height_text(0.034), Scale(feet=True).height_text(1.0)
        ('−12.3 m', '0.03 m', '3.3 ft')
        """
        value = self.height(float(value_m))
        digits = 1 if abs(value) >= 1 or value == 0 else 2 if abs(value) >= 0.01 else 4
        return f"{minus(f'{value:.{digits}f}')} {self.height_unit}"


def minus(number: str) -> str:
    """Write the minus sign as such, not as a hyphen; a zero has none.

    Examples
    --------
    >>> minus("-3.1"), minus("-0.0")
    ('−3.1', '0.0')
    """
    zero = number.startswith("-") and not number.strip("-0.")
    return number[1:] if zero else number.replace("-", "−")


def k_text(k: float) -> str:
    """Write a factor k as the trade does.

    Examples
    --------
    >>> k_text(4 / 3), k_text(0.667), k_text(0.85), k_text(math.inf)
    ('4/3', '2/3', '0.85', '∞')
    """
    if math.isinf(k):
        return "∞"
    third = Fraction(k).limit_denominator(3)
    if third.denominator == 3 and abs(k - float(third)) < 5e-4:
        return f"{third.numerator}/3"
    return f"{k:.3g}"


def required_text(rule: Rule, scale: Scale) -> str:
    """Say what a rule asks for: the part of the zone, the margin and k.

    Examples
    --------
    >>> required_text(Rule(k=4 / 3, fresnel_fraction=0.6, margin_m=3.0), Scale())
    '0.6 F1 + 3 m at k = 4/3'
    >>> required_text(Rule(k=1.0, fresnel_fraction=1.0), Scale(feet=True))
    '1.0 F1 at k = 1'
    """
    fraction = rule.fresnel_fraction
    parts = [f"{fraction:.1f} F1" if round(fraction, 1) == fraction else f"{fraction:g} F1"] if fraction else []
    if rule.margin_m or not parts:
        margin = scale.height(abs(rule.margin_m))
        sign = ("− " if rule.margin_m < 0 else "+ ") if parts else ("−" if rule.margin_m < 0 else "")
        parts.append(f"{sign}{margin:.3g} {scale.height_unit}")
    return f"{' '.join(parts)} at k = {k_text(rule.k)}"


def position_text(longitude: float, latitude: float) -> str:
    """Write a position, latitude first, to about a metre.

    Examples
    --------
    >>> position_text(-112.5, 36.25)
    '36.25000° N, 112.50000° W'
    """
    north, east = "N" if latitude >= 0 else "S", "E" if longitude >= 0 else "W"
    return f"{abs(latitude):.5f}° {north}, {abs(longitude):.5f}° {east}"
