"""What a study finds, whole and immutable: everything that a figure, a document or the terminal shows is in here."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:  # what the hop does not ask for is not loaded
    from profiler.availability import Availability, OutageCurve
    from profiler.budget import Budget
    from profiler.confidence import Confidence
    from profiler.diffraction import DiffractionLoss
    from profiler.geometry import CorridorCheck, Reflection, RuleCheck
    from profiler.models import Hop, Profile
    from profiler.path import PathLine
    from profiler.study.climate import ClimateUse
    from profiler.study.link import Air
    from profiler.study.outage import ModeOutage
    from profiler.terrain import SourceUse
    from profiler.units import Float

__all__ = ["Corridor", "Place", "Provenance", "Relief", "RuleResult", "Study", "TerrainUse", "Verdict"]


@dataclass(frozen=True, slots=True, eq=False)
class RuleResult:
    """One rule along the path and across it, with the angles and the reflections at its k.

    ``corridor`` is None for a rule that asks for no part of the Fresnel zone: nothing beside the path matters to it.
    """

    check: RuleCheck
    corridor: CorridorCheck | None
    elevation_a_deg: float
    elevation_b_deg: float
    reflections: tuple[Reflection, ...]

    @property
    def passes(self) -> bool:
        """Whether the rule is met along the path and across it."""
        return self.check.passes and (self.corridor is None or self.corridor.passes)


@dataclass(frozen=True, slots=True)
class TerrainUse:
    """Where the ground came from and what was done to it."""

    method: str
    spacing_m: float
    finest_cell_m: float
    vertical_datum: str | None
    sources: tuple[SourceUse, ...]
    filled_points: int
    surveyed_difference_a_m: float | None
    surveyed_difference_b_m: float | None
    notes: tuple[str, ...]
    cover_notes: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Corridor:
    """Surface beside the path, (n, across), out to the edge of the widest zone that a rule asks for."""

    offset_m: Float
    surface_m: Float


@dataclass(frozen=True, slots=True, eq=False)
class Relief:
    """The ground seen from above along the path: heights (n, across), offsets positive to the right of A→B."""

    along_m: Float
    offset_m: Float
    ground_m: Float


@dataclass(frozen=True, slots=True)
class Place:
    """A point of the path with its position."""

    index: int
    distance_m: float
    longitude: float
    latitude: float


@dataclass(frozen=True, slots=True)
class Verdict:
    """Whether the hop passes, and the sentence that says why, in metres and in feet.

    ``passes`` needs every rule met and, where an objective is given, the objective met too.
    """

    passes: bool
    clears: bool
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
    availability: Availability | None
    outage_curve: OutageCurve | None
    mode_outages: tuple[ModeOutage, ...]
    confidence: Confidence | None
    corridor: Corridor | None
    climate: ClimateUse
    relief: Relief | None
    verdict: Verdict
    provenance: Provenance
    assumptions: tuple[str, ...]
    warnings: tuple[str, ...]

    def place(self, index: int) -> Place:
        """Give the position of a point of the profile."""
        profile = self.profile
        return Place(
            index, float(profile.distance_m[index]), float(profile.longitude[index]), float(profile.latitude[index])
        )

    @property
    def governing(self) -> RuleResult:
        """The rule with the least surplus at its critical point, along the path or across it."""
        return min(self.rules, key=least_surplus)


def least_surplus(result: RuleResult) -> float:
    """Least surplus of a rule, along the path and across it, metres.

    The corridor includes the points of the path itself, so it is never the greater of the two where it exists.
    """
    along = float(result.check.surplus_m[result.check.critical])
    return along if result.corridor is None else min(along, result.corridor.surplus_m)
