"""Frozen values passed between the stages. What a user decides lives here; what a stage finds lives beside the stage.

Conventions: profiles run from site A to site B and distance 0 is A; longitude and latitude are WGS 84 degrees, east
and north positive; heights named ``*_m`` are above the vertical datum of the terrain unless the name says otherwise
(``antenna_m`` and ``cover_m`` are above ground). ``None`` means "not given": nothing is invented for it.

What a user states in a hop file is stated here, once: see `profiler.models.stated`.
"""

from profiler.models.availability import (
    AirChoice,
    AvailabilityChoice,
    DiversityChoice,
    KPeriod,
    MultipathMethod,
    Objective,
    VigantsClimate,
)
from profiler.models.confidence import ConfidenceChoice
from profiler.models.heights import HeightsChoice, Obstruction, TowerChoice
from profiler.models.hop import DiffractionChoice, DiffractionMethod, DocumentFacts, Hop, Override, Polarization
from profiler.models.profile import Profile, frozen_array, lengths_between
from profiler.models.radio import Radio, RadioMode, Signature, Terminal
from profiler.models.rules import Rule
from profiler.models.site import Site
from profiler.models.terrain import CoverChoice, FillPolicy, Obstacle, SampleMethod, TerrainChoice

__all__ = [
    "AirChoice",
    "AvailabilityChoice",
    "ConfidenceChoice",
    "CoverChoice",
    "DiffractionChoice",
    "DiffractionMethod",
    "DiversityChoice",
    "DocumentFacts",
    "FillPolicy",
    "HeightsChoice",
    "Hop",
    "KPeriod",
    "MultipathMethod",
    "Objective",
    "Obstacle",
    "Obstruction",
    "Override",
    "Polarization",
    "Profile",
    "Radio",
    "RadioMode",
    "Rule",
    "SampleMethod",
    "Signature",
    "Site",
    "Terminal",
    "TerrainChoice",
    "TowerChoice",
    "VigantsClimate",
    "frozen_array",
    "lengths_between",
]
