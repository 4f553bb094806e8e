"""Where in a hop file something stands, and what is known of the hop so far."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from profiler.errors import InputError, field_error
from profiler.models import Site

__all__ = ["Reading", "Spot"]


@dataclass(slots=True)
class Reading:
    """One file being read: what messages call it, where its paths start, its sites once read, and what was assumed."""

    where: str
    base_dir: Path
    sites: list[Site] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class Spot:
    """One table of the file, by its dotted name."""

    reading: Reading
    at: str = ""

    def key(self, name: str) -> str:
        """Dotted name of a key of this table, with what does not print escaped."""
        name = name if name.isprintable() else repr(name)[1:-1]
        return f"{self.at}.{name}" if self.at else name

    def into(self, name: str) -> Spot:
        """Return the spot of a table inside this one."""
        return Spot(self.reading, self.key(name))

    def error(self, name: str, value: object, allowed: str, remedy: str = "") -> InputError:
        """Build the error about a key of this table."""
        return field_error(self.reading.where, self.key(name), value, allowed, remedy)
