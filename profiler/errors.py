"""The error tree. An error holds where, field, value, allowed and remedy as data; its one line is made from them."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import fields
from typing import Any

from profiler.printable import printable

__all__ = [
    "MISSING",
    "Bare",
    "DatumError",
    "HopwrightError",
    "InputError",
    "MissingExtraError",
    "MissingGroundError",
    "RasterError",
    "field_error",
    "show",
    "under",
]

_LONGEST_SHOWN = 60


class Bare(str):
    """Words that stand for a value in a message and are shown without quotes."""

    __slots__ = ()


MISSING = Bare("(missing)")
"""The value of a field that is not there."""


class HopwrightError(Exception):
    """Root of every error that hopwright raises on purpose; the command line turns it into exit code 2.

    Parameters
    ----------
    problem
        What is wrong, in words, where it is not the value of one field.
    where
        The file (or ``"command line"``) that holds the field.
    field
        Dotted name of the field, as the user wrote it.
    value
        The offending value.
    allowed
        What would be accepted, with units.
    remedy
        What to do about it, if more than "give an allowed value".

    Examples
    --------
    >>> error = InputError(where="a.toml", field="site_a.antenna_m", value=-3, allowed="more than 0 m")
    >>> print(error)
    a.toml: site_a.antenna_m = -3: must be more than 0 m
    >>> error.field, error.value
    ('site_a.antenna_m', -3)
    """

    def __init__(
        self,
        problem: str = "",
        *,
        where: str = "",
        field: str = "",
        value: object = MISSING,
        allowed: str = "",
        remedy: str = "",
    ) -> None:
        super().__init__(problem)
        self.problem, self.where, self.field = problem, where, field
        self.value, self.allowed, self.remedy = value, allowed, remedy

    def __str__(self) -> str:
        """Make the one line."""
        line = self.problem or f"{self.field} = {show(self.value)}: must be {self.allowed}"
        whole = (f"{self.where}: " if self.where else "") + line + (f"; {self.remedy}" if self.remedy else "")
        return printable(whole)


class InputError(HopwrightError, ValueError):
    """A value from outside (hop file, option, argument) is not allowed."""


class RasterError(HopwrightError, OSError):
    """A raster cannot be used: unreadable, without a CRS, not heights."""


class DatumError(InputError):
    """Heights on different vertical datums meet on one path."""


class MissingGroundError(InputError):
    """The terrain has no height where the path needs one."""


class MissingExtraError(HopwrightError, ImportError):
    """An optional dependency is needed and absent; the message names the extra to install."""


def field_error(where: str, field: str, value: object, allowed: str, remedy: str = "") -> InputError:
    """Build the error for a bad field, from the parts of `HopwrightError`.

    Examples
    --------
    >>> print(field_error("a.toml", "frequency_ghz", 0, "more than 0", "give GHz, not Hz"))
    a.toml: frequency_ghz = 0: must be more than 0; give GHz, not Hz
    """
    return InputError(where=where, field=field, value=value, allowed=allowed, remedy=remedy)


def show(value: object, deep: int = 4) -> str:
    """Write a value as TOML does, on one line and not too long.

    Examples
    --------
    >>> show("12"), show(True), show(12.0), show({"a": 1}), show(Bare("not given"))
    ("'12'", 'true', '12.0', '{a = 1}', 'not given')
    """
    if isinstance(value, Bare) or not deep:
        text = str(value) if deep else "…"
    elif isinstance(value, bool):
        text = "true" if value else "false"
    elif isinstance(value, Mapping):
        text = "{" + ", ".join(f"{key} = {show(each, deep - 1)}" for key, each in value.items()) + "}"
    elif isinstance(value, list | tuple):
        text = "[" + ", ".join(show(each, deep - 1) for each in value) + "]"
    elif isinstance(value, float):
        text = repr(float(value))  # also numpy's, whose own form names its type
    elif isinstance(value, str | int):
        text = repr(value)
    else:
        text = str(value)
    text = " ".join(text.split())
    return text if len(text) <= _LONGEST_SHOWN else text[: _LONGEST_SHOWN - 1] + "…"


@contextmanager
def under(table: str, choice: Any = None) -> Iterator[None]:
    """Put the name of a hop file's table before the field of every error that is raised inside.

    Stages that take plain numbers do not know where those stand in a hop file; whoever hands them on does.

    Parameters
    ----------
    table
        Dotted name of the table.
    choice
        Dataclass of the table, if it has one: an error in words that begins with one of its fields goes on with a
        point.

    Examples
    --------
    >>> with under("confidence"):
    ...     raise InputError(field="draws", value=3, allowed="100 or more")
    Traceback (most recent call last):
    ...
    profiler.errors.InputError: confidence.draws = 3: must be 100 or more
    """
    try:
        yield
    except HopwrightError as error:
        if error.problem:
            keys = () if choice is None else [each.name for each in fields(choice)]
            joint = "." if error.problem.partition(" ")[0].rstrip(":") in keys else ": "
            error.problem = f"{table}{joint}{error.problem}"
        else:
            error.field = f"{table}.{error.field}"
        raise
