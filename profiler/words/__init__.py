"""The one place that puts results into words: rules, places, verdict, next step, outage, numbers with their units.

Terminal, figures and documents take their words from here, in metres and kilometres or in feet and miles.
"""

from profiler.words.heights_words import pair_words, remedies_words
from profiler.words.next_step_words import step_words, steps_words, survey_words
from profiler.words.outage_words import (
    PROPAGATION_ONLY,
    achieved_text,
    asked_text,
    limit_text,
    margin_words,
    needs_text,
    outage_sentence,
)
from profiler.words.places import beside_text, place_text, rule_text, spare_text, spot_text, stands_text, where_text
from profiler.words.scale import METRES, Scale
from profiler.words.verdict_words import (
    chance_words,
    clearance_words,
    feet_words,
    headline,
    outcome_word,
    reason_words,
    verdict_words,
)

__all__ = [
    "METRES",
    "PROPAGATION_ONLY",
    "Scale",
    "achieved_text",
    "asked_text",
    "beside_text",
    "chance_words",
    "clearance_words",
    "feet_words",
    "headline",
    "limit_text",
    "margin_words",
    "needs_text",
    "outage_sentence",
    "outcome_word",
    "pair_words",
    "place_text",
    "reason_words",
    "remedies_words",
    "rule_text",
    "spare_text",
    "spot_text",
    "stands_text",
    "step_words",
    "steps_words",
    "survey_words",
    "verdict_words",
    "where_text",
]
