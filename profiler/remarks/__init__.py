"""What stages remark on their results, and how numbers are written in it: one notation for each kind of number."""

from profiler.remarks.note import Length, Note, Topic, note
from profiler.remarks.numerals import (
    chance_text,
    db_text,
    k_text,
    listed,
    minus,
    outage_text,
    percent_text,
    position_text,
    ratio_text,
    superscript,
    time_text,
    without_signs,
)

__all__ = [
    "Length",
    "Note",
    "Topic",
    "chance_text",
    "db_text",
    "k_text",
    "listed",
    "minus",
    "note",
    "outage_text",
    "percent_text",
    "position_text",
    "ratio_text",
    "superscript",
    "time_text",
    "without_signs",
]
