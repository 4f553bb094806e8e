"""Why a profile is not what a diffraction method was made for, one remark each."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from profiler.diffraction.edges import EdgeLosses
from profiler.diffraction.formulas import MOST_ROUND, knife_edge_loss
from profiler.diffraction.obstacles import DoubleLosses, cascaded_knife_edges, single_knife_edge
from profiler.diffraction.rounded import RoundedLosses
from profiler.remarks import Length, Remark, db_text, minus, note

if TYPE_CHECKING:
    from profiler.diffraction.methods import Inputs

__all__ = ["cascaded_doubts", "double_doubts", "rounded_doubts"]


def rounded_doubts(inputs: Inputs, found: RoundedLosses) -> list[Remark]:
    """Say where the rounded obstacle does not fit the ground."""
    lines: list[Remark] = []
    if not found.loss_db > 0:
        return lines
    if np.isnan(found.radius_m):
        lines.append(
            "the top of the main obstacle is not convex, so no radius fits it: the loss is that of a knife edge"
        )
    if found.narrow:
        knife_db = float(single_knife_edge(*inputs.path).loss_db)
        words = (
            "the top is narrower than the {} over which its radius is fitted, as cells of {} do not show it: a sharp"
            f" edge would lose {db_text(knife_db)}"
        )
        width_m = (found.top_m[1] - found.top_m[0]).item()
        lines.append(note("diffraction", words, Length(width_m, 0), Length(inputs.cell_m or 0.0, 0)))
    if found.roundness > MOST_ROUND:
        lines.append(
            f"roundness m = {float(found.roundness):.1f} is above {MOST_ROUND:g}, where the fit of "
            "Rec. ITU-R P.526-15 §4.2 turns over: take spherical-earth or delta-bullington"
        )
    first_m, last_m = map(float, found.top_m)
    top = Length(first_m, far=True), Length(last_m, far=True)
    if found.arc_m > last_m - first_m:
        words = (
            "the top from {} to {} is too short for the radius that fits it, which would bend the ray over {}: the most"
            " that has room is taken, and the loss is too high"
        )
        lines.append(note("diffraction", words, *top, Length(float(found.arc_m), far=True)))
    if not found.isolated:
        words = "more than one obstacle: the horizon rays do not both touch the top from {} to {}"
        lines.append(note("diffraction", words, *top))
    return lines


_LEFT_OUT_DB = 3.0
"""Loss of an edge left out that is worth a line."""

_FADED_DB = 7.0
"""The same of an edge that counts in part: every hill has ground beside its top that would cost 6 dB, J(0)."""


def _faded(found: EdgeLosses) -> list[Remark]:
    """Say which edges of a cascade count in part only, where that makes a difference."""
    gap_db = knife_edge_loss(found.nu) - found.edge_loss_db
    rows = zip(found.distance_m.tolist(), gap_db.tolist(), strict=True)
    return [
        note(
            "diffraction",
            "the edge {} from A stands near the principal one and counts in part: in full it would cost"
            f" {db_text(gap)} more. That an edge counts in full from {{}}, or a tenth of the way to the nearer end, is"
            " this project's own rule",
            Length(at, far=True),
            Length(500.0, 0),
        )
        for at, gap in rows
        if gap > _FADED_DB
    ]


def double_doubts(inputs: Inputs, found: DoubleLosses) -> list[Remark]:
    """Say where two edges are not all that counts."""
    cascade = cascaded_knife_edges(*inputs.path)
    lines = _faded(cascade)
    for at, loss_db in zip(cascade.distance_m.tolist(), cascade.edge_loss_db.tolist(), strict=True):
        if loss_db > _LEFT_OUT_DB and at not in found.distance_m:
            words = "a third edge, {} from A, is left out: cascaded-edges counts it"
            lines.append(note("diffraction", words, Length(at, far=True)))
    if found.floor_db > 0:
        published_db = float(found.loss_db - found.floor_db)
        lines.append(
            f"Rec. ITU-R P.526-15 §4.3 gives {published_db:.2f} dB, less than the greater edge alone loses, which is "
            "taken instead"
        )
    return lines


def cascaded_doubts(inputs: Inputs, found: EdgeLosses) -> list[Remark]:
    """Say which edges of the cascade count in part, and where another k has a worse one."""
    worst, kept = single_knife_edge(*inputs.path), np.nan_to_num(found.nu[1], nan=-np.inf)
    if not worst.nu[0] > kept:
        return _faded(found)
    return [
        *_faded(found),
        note(
            "diffraction",
            "the edges are those of k = 4/3, as Rec. ITU-R P.526-15 §4.4.2 recommends; at this k the ground {} from A"
            f" obstructs more, ν = {minus(f'{float(worst.nu[0]):.2f}')}",
            Length(float(worst.distance_m[0]), far=True),
        ),
    ]
