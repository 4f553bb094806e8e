"""How sure a verdict is: chances, bands, sure heights, shares of doubt and what to survey, from seeded draws.

Errors are true minus given height, in metres; ranges of correlation are practical ranges (5 % correlation left).
"""

from profiler.confidence.assess import SURE_CHANCES, assess
from profiler.confidence.doubt import draw_doubt, surplus_errors
from profiler.confidence.fields import Covariance, correlation, draw_field, draw_inverse_k
from profiler.confidence.result import (
    Band,
    Chance,
    Confidence,
    DoubtShares,
    RuleConfidence,
    SureHeights,
    SurveyPoint,
)
from profiler.confidence.summary import chance_of
from profiler.terrain_error import TERRAIN_ERRORS, TerrainError, sigma_from_le90, sigma_from_rmse

__all__ = [
    "SURE_CHANCES",
    "TERRAIN_ERRORS",
    "Band",
    "Chance",
    "Confidence",
    "Covariance",
    "DoubtShares",
    "RuleConfidence",
    "SureHeights",
    "SurveyPoint",
    "TerrainError",
    "assess",
    "chance_of",
    "correlation",
    "draw_doubt",
    "draw_field",
    "draw_inverse_k",
    "sigma_from_le90",
    "sigma_from_rmse",
    "surplus_errors",
]
