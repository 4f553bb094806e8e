"""What stages remark on their results, and how numbers are written in it: one notation for each kind of number."""

from profiler.remarks.note import Length, Note, Remark, Topic, note, prefixed
from profiler.remarks.numerals import (
    chance_text,
    cost_text,
    db_text,
    k_text,
    listed,
    minus,
    outage_text,
    percent_text,
    position_text,
    ratio_text,
    superscript,
    target_text,
    time_text,
    without_signs,
)

__all__ = [
    "Length",
    "Note",
    "Remark",
    "Topic",
    "chance_text",
    "cost_text",
    "db_text",
    "k_text",
    "listed",
    "minus",
    "note",
    "outage_text",
    "percent_text",
    "position_text",
    "prefixed",
    "ratio_text",
    "superscript",
    "target_text",
    "time_text",
    "without_signs",
]
