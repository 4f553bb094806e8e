"""How long a hop is out: multipath, selective fading, rain and obstruction, in the worst month and in the year.

Put a hop together with `outage_model`, ask it with `predict` for its fade margin and with `outage_curve` for a figure.
Outage is in percent of the period everywhere. The methods stand on their own too, one function for each published
formula, with its source.
"""

from profiler.availability.diversity import (
    add_diversity_outages,
    amplitude_correlation,
    improvement_p530,
    protected_selective,
)
from profiler.availability.facts import PathFacts
from profiler.availability.model import OutageModel, outage_model
from profiler.availability.months import worst_month_from_year, year_from_worst_month
from profiler.availability.multipath import (
    fade_percent,
    geoclimatic_factor_17,
    geoclimatic_factor_17_quick,
    occurrence_17,
    occurrence_17_quick,
    occurrence_18,
    transition_fade,
    year_conversion,
)
from profiler.availability.notes import InputUsed
from profiler.availability.objective import ObjectiveResult, TargetResult
from profiler.availability.obstruction import obstruction_percent, unknown_percent
from profiler.availability.outages import MECHANISMS, Mechanism, Outages, outages_at
from profiler.availability.predict import Availability, OutageCurve, outage_curve, predict
from profiler.availability.rain import effective_distance, rain_fade, rain_percent
from profiler.availability.roughness import TerrainRoughness, roughness_grid, terrain_roughness
from profiler.availability.selective import mean_delay, multipath_activity, selective_percent
from profiler.availability.vigants import (
    climate_factor,
    improvement_vigants,
    occurrence_vigants,
    path_roughness,
    season_share,
)

__all__ = [
    "MECHANISMS",
    "Availability",
    "InputUsed",
    "Mechanism",
    "ObjectiveResult",
    "OutageCurve",
    "OutageModel",
    "Outages",
    "PathFacts",
    "TargetResult",
    "TerrainRoughness",
    "add_diversity_outages",
    "amplitude_correlation",
    "climate_factor",
    "effective_distance",
    "fade_percent",
    "geoclimatic_factor_17",
    "geoclimatic_factor_17_quick",
    "improvement_p530",
    "improvement_vigants",
    "mean_delay",
    "multipath_activity",
    "obstruction_percent",
    "occurrence_17",
    "occurrence_17_quick",
    "occurrence_18",
    "occurrence_vigants",
    "outage_curve",
    "outage_model",
    "outages_at",
    "path_roughness",
    "predict",
    "protected_selective",
    "rain_fade",
    "rain_percent",
    "roughness_grid",
    "season_share",
    "selective_percent",
    "terrain_roughness",
    "transition_fade",
    "unknown_percent",
    "worst_month_from_year",
    "year_conversion",
    "year_from_worst_month",
]
