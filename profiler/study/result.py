"""What a study finds, whole and immutable: everything that a figure, a document or the terminal shows is in here."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

from profiler.geometry import ROUNDING_M
from profiler.remarks import Remark

if TYPE_CHECKING:  # what the hop does not ask for is not loaded
    from profiler.budget import Budget
    from profiler.confidence import Confidence
    from profiler.diffraction import DiffractionLoss
    from profiler.geometry import HeldRule, Reflection, RuleCheck, Surface
    from profiler.heights import ClearingRegion
    from profiler.models import Hop, Profile
    from profiler.path import PathLine
    from profiler.study.climate_numbers import ClimateUse
    from profiler.study.link import Air
    from profiler.study.outage import OutageResult
    from profiler.study.verdict import Verdict
    from profiler.terrain import SourceUse
    from profiler.units import Float

__all__ = ["Place", "Provenance", "Relief", "RuleResult", "Study", "TerrainUse"]


@dataclass(frozen=True, slots=True)
class Place:
    """A place that asks for clearance: ``distance_m`` from A, ``offset_m`` across the path (positive to its right).

    ``index`` is the nearest point of the profile; position, ground and cover are those of the place itself, and
    ``required_m`` is what the rule asks above its surface. ``filled``: the ground was missing and interpolated.
    """

    index: int
    distance_m: float
    offset_m: float
    side: str
    longitude: float
    latitude: float
    ground_m: float
    cover_m: float
    filled: bool
    bulge_m: float
    f1_m: float
    clearance_m: float
    required_m: float
    surplus_m: float
    ratio: float

    @property
    def surface_m(self) -> float:
        """Ground plus cover, above the vertical datum."""
        return self.ground_m + self.cover_m

    @property
    def tightness(self) -> tuple[bool, float]:
        """What orders places by how tight they are: short ones by how much, the others in proportion to the zone."""
        if self.surplus_m < -ROUNDING_M:
            return False, self.surplus_m
        return True, self.surplus_m / self.f1_m if self.f1_m > 0 else math.inf


@dataclass(frozen=True, slots=True, eq=False)
class RuleResult:
    """One rule along the path and across it, with the angles and the reflections at its k.

    ``critical`` is the place of least surplus anywhere. ``places`` are the separate tight places, on the path or beside
    it, the one that an engineer would name first: where something is short, that which is shortest; where all clears,
    the obstacle away from the masts' feet that comes nearest to the zone in proportion to it. ``feet`` are the places
    of least surplus around the foot of the mast at A and at B.
    """

    held: HeldRule
    critical: Place
    places: tuple[Place, ...]
    feet: tuple[Place, Place]
    elevation_a_deg: float
    elevation_b_deg: float
    reflections: tuple[Reflection, ...]

    @property
    def check(self) -> RuleCheck:
        """The rule along the path alone."""
        return self.held.check

    @property
    def passes(self) -> bool:
        """Whether the rule is met along the path and across it."""
        return self.held.passes

    @property
    def tightest(self) -> Place:
        """The place that an engineer would name."""
        return self.places[0]

    @property
    def least_surplus_m(self) -> Float:
        """Least surplus at each point of the path, over the width of the zone where that was checked, (n,)."""
        return self.held.least_surplus_m


@dataclass(frozen=True, slots=True)
class TerrainUse:
    """Where the ground came from and what was done to it; ``filled_share``, ``sea_share`` are of the path's length.

    ``spacing_m`` is the most that neighbouring points of the profile are apart; it has no say in what is found.
    """

    method: str
    spacing_m: float
    finest_cell_m: float
    vertical_datum: str | None
    sources: tuple[SourceUse, ...]
    filled_points: int
    filled_share: float
    surveyed_difference_a_m: float | None
    surveyed_difference_b_m: float | None
    notes: tuple[Remark, ...]
    cover_notes: tuple[Remark, ...]
    sea_share: float = 0.0
    warnings: tuple[Remark, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Relief:
    """The ground seen from above along the path: heights (n, across), offsets positive to the right of A→B."""

    along_m: Float
    offset_m: Float
    ground_m: Float


@dataclass(frozen=True, slots=True)
class Provenance:
    """What somebody else needs to get the same numbers."""

    created: str
    versions: tuple[tuple[str, str], ...]
    hop_file: str
    hop_sha256: str | None
    rasters: tuple[tuple[str, int, str], ...]


@dataclass(frozen=True, slots=True, eq=False)
class Study:
    """The whole analysis of one hop. A part that the hop gives no data for, or that was not asked for, is None.

    ``elevation_a_deg`` and ``elevation_b_deg`` are at the median k; every rule has its own. ``lower_regions`` are the
    heights at which the lower antennas of a diversity pair clear (`profiler.study.requirements`), empty without one.
    """

    hop: Hop
    line: PathLine
    profile: Profile
    centre_a_m: float
    centre_b_m: float
    elevation_a_deg: float
    elevation_b_deg: float
    terrain: TerrainUse
    rules: tuple[RuleResult, ...]
    diffraction: tuple[DiffractionLoss, ...]
    median_diffraction: DiffractionLoss | None
    air: Air
    budget: Budget | None
    outage: OutageResult
    confidence: Confidence | None
    surface: Surface
    lower_regions: tuple[ClearingRegion, ...]
    climate: ClimateUse
    relief: Relief | None
    verdict: Verdict
    provenance: Provenance
    assumptions: tuple[Remark, ...]
    warnings: tuple[Remark, ...]

    @property
    def governing(self) -> RuleResult:
        """The rule that decides: the one whose tightest place is tightest."""
        return self.by_tightness[0]

    @property
    def by_tightness(self) -> tuple[RuleResult, ...]:
        """The rules in the order in which a reader wants them, the one that decides first."""
        return tuple(sorted(self.rules, key=lambda result: result.tightest.tightness))
