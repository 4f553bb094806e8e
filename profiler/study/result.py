"""What a study finds, whole and immutable: everything that a figure, a document or the terminal shows is in here."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:  # what the hop does not ask for is not loaded
    from profiler.budget import Budget
    from profiler.confidence import Confidence
    from profiler.diffraction import DiffractionLoss
    from profiler.geometry import CorridorCheck, Reflection, RuleCheck
    from profiler.models import Hop, Profile
    from profiler.path import PathLine
    from profiler.study.climate_numbers import ClimateUse
    from profiler.study.link import Air
    from profiler.study.outage import OutageResult
    from profiler.terrain import SourceUse
    from profiler.units import Float

__all__ = ["Corridor", "Place", "Provenance", "Relief", "RuleResult", "Study", "TerrainUse", "Verdict"]


@dataclass(frozen=True, slots=True)
class Place:
    """Where a rule is tight: ``distance_m`` from A, ``offset_m`` across the path (positive to the right of A→B).

    ``index`` is the point of the profile there; position, ground and cover are those of the place itself, and
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


@dataclass(frozen=True, slots=True, eq=False)
class RuleResult:
    """One rule along the path and across it, with the angles and the reflections at its k.

    ``corridor`` is None for a rule that asks for no part of the Fresnel zone: nothing beside the path matters to it.
    ``places`` are the separate tight places, on the path or beside it, tightest first.
    """

    check: RuleCheck
    corridor: CorridorCheck | None
    places: tuple[Place, ...]
    elevation_a_deg: float
    elevation_b_deg: float
    reflections: tuple[Reflection, ...]

    @property
    def passes(self) -> bool:
        """Whether the rule is met along the path and across it."""
        return self.check.passes and (self.corridor is None or self.corridor.passes)

    @property
    def critical(self) -> Place:
        """The place of least surplus."""
        return self.places[0]


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
    notes: tuple[str, ...]
    cover_notes: tuple[str, ...]
    sea_share: float = 0.0
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Corridor:
    """Surface and cover beside the path, (n, across), out to the edge of the widest zone that a rule asks for."""

    offset_m: Float
    surface_m: Float
    cover_m: Float


@dataclass(frozen=True, slots=True, eq=False)
class Relief:
    """The ground seen from above along the path: heights (n, across), offsets positive to the right of A→B."""

    along_m: Float
    offset_m: Float
    ground_m: Float


@dataclass(frozen=True, slots=True)
class Verdict:
    """Whether the hop passes, and the sentence that says why, in metres and in feet.

    ``passes`` needs every rule met, a fade margin of 0 dB or more where one is known, and the objective met where one
    is set. ``has_margin`` is None without a radio that has a threshold.
    """

    passes: bool
    clears: bool
    has_margin: bool | None
    meets_objective: bool | None
    headline: str
    headline_feet: str


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

    ``elevation_a_deg`` and ``elevation_b_deg`` are at the median k; every rule has its own.
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
    corridor: Corridor | None
    climate: ClimateUse
    relief: Relief | None
    verdict: Verdict
    provenance: Provenance
    assumptions: tuple[str, ...]
    warnings: tuple[str, ...]

    @property
    def governing(self) -> RuleResult:
        """The rule with the least surplus at its critical place."""
        return min(self.rules, key=lambda result: result.critical.surplus_m)
