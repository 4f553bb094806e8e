"""How long a hop is out: multipath, selective fading, rain and obstruction, in the worst month and in the year.

Put a hop together with `outage_model`, ask it with `predict` for its fade margin and with `outage_curve` for a figure.
Outage is in percent of the period everywhere. The methods stand on their own too, one function for each published
formula, with its source.
"""

from profiler.availability.facts import PathFacts
from profiler.availability.model import OutageModel, outage_model
from profiler.availability.objective import ObjectiveResult
from profiler.availability.obstruction import KStatistics, k_statistics
from profiler.availability.outages import MECHANISMS, Outages
from profiler.availability.predict import Availability, MultipathEstimate, OutageCurve, outage_curve, predict
from profiler.availability.roughness import roughness_grid, terrain_roughness
from profiler.availability.vigants import path_roughness

__all__ = [
    "MECHANISMS",
    "Availability",
    "KStatistics",
    "MultipathEstimate",
    "ObjectiveResult",
    "OutageCurve",
    "OutageModel",
    "Outages",
    "PathFacts",
    "k_statistics",
    "outage_curve",
    "outage_model",
    "path_roughness",
    "predict",
    "roughness_grid",
    "terrain_roughness",
]
