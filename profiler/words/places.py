"""Rules and places in words: what is asked, where, and what stands there."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.models import Rule
from profiler.remarks import k_text, minus, position_text
from profiler.words.scale import Scale

if TYPE_CHECKING:
    from profiler.study.result import Place

__all__ = [
    "along_text",
    "beside_text",
    "place_text",
    "rule_text",
    "spare_text",
    "spot_text",
    "stands_text",
    "where_text",
]

_NOTICED_M = 2.0
"""Less than this beside the path, nobody who stands there with a hand-held receiver could tell."""


def rule_text(rule: Rule, scale: Scale) -> str:
    """Say what a rule asks for: the part of the zone, the margin and k.

    Examples
    --------
    >>> rule_text(Rule(k=4 / 3, fresnel_fraction=0.6, margin_m=3.0), Scale())
    '0.6 F1 + 3 m at k = 4/3'
    >>> rule_text(Rule(k=1.0, fresnel_fraction=1.0), Scale(feet=True))
    '1.0 F1 at k = 1'
    """
    fraction = rule.fresnel_fraction
    parts = [f"{fraction:.1f} F1" if round(fraction, 1) == fraction else f"{fraction:g} F1"] if fraction else []
    if rule.margin_m or not parts:
        margin = f"{scale.height(abs(rule.margin_m)):.1f}".removesuffix(".0") + f" {scale.height_unit}"
        sign = "-" if rule.margin_m < 0 else "+" if parts else ""
        parts.append(minus(f"{sign} {margin}" if parts else f"{sign}{margin}"))
    return f"{' '.join(parts)} at k = {k_text(rule.k)}"


def beside_text(place: Place, scale: Scale) -> str:
    """Say how far beside the path a place is, as a part of a sentence; nothing for a place on it."""
    if abs(place.offset_m) < _NOTICED_M:
        return ""
    return f", {scale.height_text(abs(place.offset_m), 0)} {place.side} of the path"


def along_text(place: Place, scale: Scale) -> str:
    """Say where a place is, for a cell of a table whose distances all are from A."""
    return f"{scale.distance_text(place.distance_m)}{beside_text(place, scale)}".removesuffix(" of the path")


def where_text(place: Place, scale: Scale) -> str:
    """Say where a place is.

    Examples
    --------
    >>> from profiler.study.result import Place
    >>> where = Place(0, 3892.0, -12.4, "left", -38.95, 46.02, 568.0, 12.0, False, 0.0, 9.0, 1.0, 2.0, -1.0, 0.1)
    >>> where_text(where, Scale())
    '3.89 km from A, 12 m left of the path'
    """
    return f"{scale.distance_text(place.distance_m)} from A{beside_text(place, scale)}"


def stands_text(place: Place, scale: Scale) -> str:
    """Say how high the ground is at a place and what stands on it."""
    cover = f" + cover {scale.height_text(place.cover_m)}" if place.cover_m > 0 else ""
    filled = " (interpolated)" if getattr(place, "filled", False) else ""
    return f"ground {scale.height_text(place.ground_m)}{filled}{cover}"


def spot_text(place: Place) -> str:
    """Write the position of a place."""
    return position_text(place.longitude, place.latitude)


def place_text(place: Place, scale: Scale) -> str:
    """Say where a place is, with its position, and what stands there."""
    return f"{where_text(place, scale)} ({spot_text(place)}), {stands_text(place, scale)}"


def spare_text(surplus_m: float, scale: Scale) -> str:
    """Say what is to spare, or by how much it is short.

    Examples
    --------
    >>> spare_text(22.71, Scale()), spare_text(-1.0, Scale(feet=True))
    ('22.7 m to spare', '3.3 ft short')
    """
    return f"{scale.height_text(abs(surplus_m))} {'short' if surplus_m < 0 else 'to spare'}"
