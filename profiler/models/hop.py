"""All that a user says about one hop."""

from dataclasses import dataclass
from typing import Annotated, Literal, get_args

from profiler.errors import Bare
from profiler.models.availability import AirChoice, AvailabilityChoice, Objective
from profiler.models.confidence import ConfidenceChoice
from profiler.models.heights import HeightsChoice
from profiler.models.radio import Radio
from profiler.models.rules import PresetName, Rule, RulesTable
from profiler.models.site import Site
from profiler.models.stated import Bounds, Form, Key, Stated, require
from profiler.models.terrain import CoverChoice, TerrainChoice

__all__ = ["DiffractionChoice", "DiffractionMethod", "DocumentFacts", "Hop", "Override", "Polarization"]

Polarization = Literal["vertical", "horizontal"]
DiffractionMethod = Literal[
    "delta-bullington",
    "bullington",
    "spherical-earth",
    "knife-edge",
    "rounded-obstacle",
    "double-edge",
    "cascaded-edges",
]


@dataclass(frozen=True, slots=True)
class DiffractionChoice(Stated):
    """How diffraction loss is computed."""

    method: Annotated[DiffractionMethod, Key("of diffraction loss", example="delta-bullington")] = "delta-bullington"
    sea_fraction: Annotated[float, Key("of the path that is sea", least=0, most=1, example=0.0)] = 0.0


@dataclass(frozen=True, slots=True)
class ReturnFrequency(Stated):
    """How a hop file states that the two directions have a frequency each."""

    return_frequency_hz: Annotated[
        float | None,
        Key("from B to A, where it is another", least=1e7, most=1e12, usual="ghz", left_out="the same", example=7.66),
    ] = None


@dataclass(frozen=True, slots=True)
class DocumentFacts(Stated):
    """What a data sheet or an application says about the hop besides; nothing is computed from it."""

    project: Annotated[str, Key("name or number of the project", left_out="not said", example="none")] = ""
    applicant: Annotated[str, Key("who applies or asks", left_out="not said", example="nobody")] = ""
    preparer: Annotated[
        str, Key("who prepared it", left_out="not said", example="nobody", also=("prepared_by", "author", "engineer"))
    ] = ""
    reviewer: Annotated[
        str, Key("who checked it", left_out="not said", example="nobody", also=("checked_by", "reviewed_by"))
    ] = ""
    drawing_number: Annotated[
        str, Key("of the drawing", left_out="not said", example="D-1", also=("drawing", "sheet"))
    ] = ""
    revision: Annotated[str, Key("of the document", left_out="not said", example="0", also=("rev",))] = ""
    date: Annotated[str, Key("of the document, as it is to be printed", left_out="not said", example="2020-01-31")] = ""


@dataclass(frozen=True, slots=True)
class Override:
    """A key that was set beside the hop file: its dotted name, the value, and what the file said (None: nothing)."""

    key: str
    value: str
    instead_of: str | None = None


@dataclass(frozen=True, slots=True)
class Hop(Stated):
    """All that a user says about one hop. Built by `profiler.hopfile` or in code; `profiler.study` runs it.

    With ``two_frequencies_hz``, from A to B and from B to A, ``frequency_hz`` is the lower, which needs the wider
    clearance. ``median_k`` is for losses, budget and angles; None means that of the climate maps where they are used,
    else 4/3. The rules have their own k.
    """

    name: Annotated[str, Key("of the hop", left_out="the names of its sites", example="Western ridge to eastern ridge")]
    site_a: Annotated[Site, Key("one end; profiles run from here")]
    site_b: Annotated[Site, Key("the other end")]
    frequency_hz: Annotated[
        float,
        Key("of the carrier", least=1e7, most=1e12, usual="ghz", example=7.5, also=("freq", "f", "carrier", "band")),
    ]
    rules: Annotated[
        tuple[Rule, ...],
        Key(
            f"what must be clear: a preset ({', '.join(get_args(PresetName))}), rules of your own, or both",
            kind=RulesTable,
        ),
    ]
    terrain: Annotated[TerrainChoice, Key("where ground heights come from")]
    polarization: Annotated[Polarization, Key("of the wave", example="vertical", also=("pol", "polarisation"))] = (
        "vertical"
    )
    median_k: Annotated[float | None, Bounds(above=0)] = None
    diffraction: Annotated[DiffractionChoice, Key("how the loss of an obstructed path is computed")] = (
        DiffractionChoice()
    )
    cover: Annotated[CoverChoice, Key("what stands on the ground", left_out="nothing")] = CoverChoice()
    air: Annotated[AirChoice, Key("what is left out comes from the reference atmosphere at the path's height")] = (
        AirChoice()
    )
    availability: Annotated[AvailabilityChoice | None, Key("climate, method, objective", left_out="no outage")] = None
    radio: Annotated[Radio | None, Key("what the budget needs", left_out="no budget")] = None
    heights: Annotated[HeightsChoice, Key("what the towers allow")] = HeightsChoice()
    confidence: Annotated[
        ConfidenceChoice | None, Key("how wrong the terrain may be", left_out="doubt is not examined")
    ] = None
    two_frequencies_hz: Annotated[tuple[float, float] | None, Form(ReturnFrequency)] = None
    document: Annotated[
        DocumentFacts, Key("what a document about the hop says besides; carried as it stands", left_out="nothing")
    ] = DocumentFacts()
    overrides: tuple[Override, ...] = ()
    assumptions: tuple[str, ...] = ()
    source: str = "code"
    source_sha256: str | None = None

    def _agree(self) -> None:
        require(len(self.rules) > 0, "rules", Bare("none"), "at least one rule or a named preset")

    @property
    def frequencies_hz(self) -> dict[str, float]:
        """Frequency of each direction, by the keys of a budget."""
        there, back = self.two_frequencies_hz or (self.frequency_hz, self.frequency_hz)
        return {"a_to_b": there, "b_to_a": back}

    @property
    def ends(self) -> tuple[float, float, float, float]:
        """Longitude and latitude of A, then of B."""
        return self.site_a.longitude, self.site_a.latitude, self.site_b.longitude, self.site_b.latitude

    @property
    def has_objective(self) -> bool:
        """Whether the hop, or one of its modes, must meet an availability target."""
        asked = [] if self.availability is None else [self.availability.objective]
        asked += [] if self.radio is None else [mode.objective or Objective() for mode in self.radio.modes]
        return any(objective != Objective() for objective in asked)
