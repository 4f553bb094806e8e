"""The profile of a study point by point, for CSV."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from profiler.geometry import ray_height
from profiler.units import FOOT_M, Float

if TYPE_CHECKING:
    from profiler.study import Study

__all__ = ["point_table"]


def point_table(study: Study, *, feet: bool = False) -> tuple[list[str], Float]:
    """Give the point table: the names of its columns and the numbers, one row for each point of the path.

    Columns: position, ground, cover, ray, and for each rule (numbered from 1 in the order of the study) bulge, F1,
    clearance, required clearance, surplus and ratio on the path, the least surplus over the width of the zone and the
    offset where that is; with a confidence analysis, the 5 % and 95 % surplus too. With ``feet`` every length is in
    feet, and the names of the columns say so.
    """
    profile = study.profile
    columns: dict[str, Any] = {
        "distance_m": profile.distance_m,
        "longitude": profile.longitude,
        "latitude": profile.latitude,
        "ground_m": profile.ground_m,
        "cover_m": profile.cover_m,
        "ray_m": ray_height(profile.distance_m, study.centre_a_m, study.centre_b_m),
        "filled": profile.filled.astype(float),
    }
    for number, result in enumerate(study.rules, start=1):
        check, held = result.check, result.held
        for name in ("bulge_m", "f1_m", "clearance_m", "required_m", "surplus_m", "ratio"):
            columns[f"rule{number}_{name}"] = getattr(check, name)
        columns[f"rule{number}_least_surplus_m"] = held.least_surplus_m
        columns[f"rule{number}_offset_m"] = held.offset_m
        if study.confidence is not None:
            band = study.confidence.rules[number - 1].surplus
            columns[f"rule{number}_surplus_5_percent_m"] = band.low_m
            columns[f"rule{number}_surplus_95_percent_m"] = band.high_m
    if feet:
        columns = {
            name.removesuffix("_m") + "_ft" if name.endswith("_m") else name: values / FOOT_M
            if name.endswith("_m")
            else values
            for name, values in columns.items()
        }
    return list(columns), np.column_stack(list(columns.values()))
