"""Results as plain data that other people script against: JSON documents and the point table.

The document of a heights plan is in `profiler.document.heights_document`: a study does without it, and starts faster.
"""

from profiler.document.plain_values import plain
from profiler.document.point_table import point_table
from profiler.document.study_document import to_document

__all__ = ["plain", "point_table", "to_document"]
