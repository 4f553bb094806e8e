"""Where in a hop file something stands, and how messages write it."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass

from profiler.errors import InputError, field_error

__all__ = ["MISSING", "Spot", "show"]

MISSING = "(missing)"
"""Stands for the value in messages about a key that is not there."""

_LONGEST_SHOWN = 60


@dataclass(frozen=True, slots=True)
class Spot:
    """One table of one file: what messages call the file, and the dotted name of the table."""

    where: str
    at: str = ""

    def key(self, name: str) -> str:
        """Dotted name of a key of this table, with what does not print escaped."""
        name = name if name.isprintable() else repr(name)[1:-1]
        return f"{self.at}.{name}" if self.at else name

    def into(self, name: str) -> Spot:
        """Return the spot of a table inside this one."""
        return Spot(self.where, self.key(name))

    def error(self, name: str, value: object, allowed: str, remedy: str = "") -> InputError:
        """Build the one-line error about a key of this table."""
        return field_error(self.where, self.key(name), value if value == MISSING else show(value), allowed, remedy)

    @contextmanager
    def blame(self) -> Iterator[None]:
        """Put the file and this table before the message of an error that starts with a key's name."""
        try:
            yield
        except InputError as error:
            at = f"{self.at}." if self.at else ""
            raise InputError(f"{self.where}: {at}{error}") from None


def show(value: object) -> str:
    """Write a value as TOML does, on one line and not too long.

    Examples
    --------
    >>> show("12"), show(True), show(12.0), show({"a": 1})
    ("'12'", 'true', '12.0', '{a = 1}')
    """
    if isinstance(value, bool):
        text = "true" if value else "false"
    elif isinstance(value, dict):
        text = "{" + ", ".join(f"{key} = {show(each)}" for key, each in value.items()) + "}"
    elif isinstance(value, list):
        text = "[" + ", ".join(show(each) for each in value) + "]"
    elif isinstance(value, str | float | int):
        text = repr(value)
    else:
        text = str(value)
    text = " ".join(text.split())
    return text if len(text) <= _LONGEST_SHOWN else text[: _LONGEST_SHOWN - 1] + "…"
