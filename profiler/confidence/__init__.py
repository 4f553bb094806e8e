"""How sure a verdict is: chances, bands, sure heights, shares of doubt and what to survey, from seeded draws.

Errors are true minus given height, in metres; ranges of correlation are practical ranges (5 % correlation left).
"""

from profiler.confidence.assess import assess
from profiler.confidence.draws import Doubt, draw_doubt
from profiler.confidence.findings import Chance, Confidence, SureHeights, SurveyPlace
from profiler.confidence.summary import chance_of

__all__ = [
    "Chance",
    "Confidence",
    "Doubt",
    "SureHeights",
    "SurveyPlace",
    "assess",
    "chance_of",
    "draw_doubt",
]
