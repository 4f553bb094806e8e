"""Lines of a link budget as a table, a column for each direction."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from profiler.cli.screen import compact_table
from profiler.remarks import minus

if TYPE_CHECKING:
    from rich.table import Table

    from profiler.receiver import Line

__all__ = ["lines_table", "seen_from"]


def seen_from(name: str, way: str) -> str:
    """Name a line by what its end does in a direction, so that the lines of both directions have the same names.

    Parameters
    ----------
    name
        Of a line; the letter of an end stands last in it, if one does.
    way
        The direction, such as "A to B".

    Examples
    --------
    >>> seen_from("antenna gain A", "A to B"), seen_from("antenna gain A", "B to A"), seen_from("gases", "A to B")
    ('antenna gain at the sender', 'antenna gain at the receiver', 'gases')
    """
    for end, does in ((way[0], "sender"), (way[-1], "receiver")):
        if name.endswith(f" {end}"):
            return f"{name.removesuffix(end)}at the {does}"
    return name


def lines_table(title: str, lines: Mapping[str, Sequence[Line]]) -> Table:
    """Tabulate lines by direction, such as "A to B"; they have the same names by `seen_from`."""
    table = compact_table(title, *lines, "unit", "by", words=("unit",), wraps="by")
    for row in zip(*lines.values(), strict=True):
        notes = {line.note: way for way, line in zip(lines, row, strict=True)}
        note = "; ".join(f"{way} {note}" for note, way in notes.items()) if len(notes) > 1 else row[0].note
        values = (minus(f"{line.value:+.2f}") if round(line.value, 2) else "0.00" for line in row)
        table.add_row(seen_from(row[0].name, next(iter(lines))), *values, row[0].unit, note)
    return table
