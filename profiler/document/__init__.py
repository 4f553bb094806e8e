"""Results as plain data that other people script against: JSON documents and the point table.

The document of a heights plan is in `profiler.document.heights_document`: a study does without it, and starts faster.
"""

from profiler.document.output_schemas import output_schema
from profiler.document.plain_values import plain
from profiler.document.point_table import point_table
from profiler.document.study_document import to_document

__all__ = ["output_schema", "plain", "point_table", "to_document"]
