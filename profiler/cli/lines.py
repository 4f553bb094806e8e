"""Lines of a link budget as a table, a column for each direction."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING

from profiler.cli.screen import compact_table
from profiler.remarks import minus

if TYPE_CHECKING:
    from rich.table import Table

    from profiler.receiver import Line
    from profiler.words import Scale

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


def lines_table(title: str, lines: Mapping[str, Sequence[Line]], scale: Scale) -> Table:
    """Tabulate lines by direction, such as "A to B": a row for each name by `seen_from`, a dash for none."""
    table = compact_table(title, *lines, "unit", "by", words=("unit",), wraps="by")
    named = {way: {seen_from(line.name, way): line for line in each} for way, each in lines.items()}
    for name in _in_order(named.values()):
        row = {way: each[name] for way, each in named.items() if name in each}
        first, notes = next(iter(row.values())), {scale.text(line.note): way for way, line in row.items()}
        note = "; ".join(f"{way} {note}" for note, way in notes.items()) if len(notes) > 1 else next(iter(notes))
        table.add_row(name, *(_value(row.get(way)) for way in named), first.unit, note)
    return table


def _in_order(each: Iterable[Iterable[str]]) -> list[str]:
    """Names of several lists, each once, in an order that keeps that of every list."""
    found: list[str] = []
    for names in each:
        after = 0
        for name in names:
            if name not in found:
                found.insert(after, name)
            after = found.index(name) + 1
    return found


def _value(line: Line | None) -> str:
    if line is None:
        return "–"
    return minus(f"{line.value:+.2f}") if round(line.value, 2) else "0.00"
