"""What a reader must be warned of about the ground: coarse, interpolated, far from a survey, or not seen."""

from __future__ import annotations

from collections.abc import Sequence

from profiler.models import Hop
from profiler.remarks import Length, Note, note, percent_text
from profiler.study.result import RuleResult, TerrainUse

__all__ = ["ground_warnings"]

_COARSE_CELL_M = 100.0
_LARGE_DIFFERENCE_M = 10.0


def ground_warnings(hop: Hop, terrain: TerrainUse, rules: Sequence[RuleResult]) -> tuple[Note, ...]:
    """Warn of ground that is coarse, interpolated, far from a survey, or not seen.

    Parameters
    ----------
    hop
        The hop.
    terrain
        The terrain as it was used.
    rules
        Every rule held against it.

    Returns
    -------
    tuple of Note
    """
    found = []
    cells = Length(terrain.finest_cell_m, 0)
    if terrain.filled_points:
        share = percent_text(terrain.filled_share)
        found.append(
            note(
                "terrain",
                f"ground is interpolated at {terrain.filled_points} points, {share} of the path: what stands there is"
                " unknown",
            )
        )
    if terrain.finest_cell_m > _COARSE_CELL_M:
        found.append(
            note("terrain", "the finest terrain has cells of {}: hills narrower than that are not in it", cells)
        )
    differences = ((hop.site_a, terrain.surveyed_difference_a_m), (hop.site_b, terrain.surveyed_difference_b_m))
    for site, difference_m in differences:
        if difference_m is not None and abs(difference_m) > _LARGE_DIFFERENCE_M:
            words = (
                f"the surveyed ground at {{}} is {{}} {'above' if difference_m > 0 else 'below'} the terrain: check the"
                " survey, the position and the datum"
            )
            found.append(note("site", words, site.name, Length(abs(difference_m))))
    unseen = max((rule.held.missing_share for rule in rules), default=0.0)
    if unseen:
        share = percent_text(unseen)
        words = f"beside the path {share} of the zone has no height and was not checked"
        found.append(note("terrain", words))
    return tuple(found)
