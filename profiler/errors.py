"""The error tree. Every message is one line: what is wrong, the value, what is allowed, and what to do."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import fields
from typing import Any

from profiler.printable import printable

__all__ = [
    "DatumError",
    "HopwrightError",
    "InputError",
    "MissingExtraError",
    "MissingGroundError",
    "RasterError",
    "field_error",
    "under",
]


class HopwrightError(Exception):
    """Root of every error that hopwright raises on purpose; the command line turns it into exit code 2.

    Whatever a file, its name or an argument put into the message is made safe to print here, once for all.
    """

    def __init__(self, message: str) -> None:
        super().__init__(printable(message))


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
    """Build the one-line error for a bad field.

    Parameters
    ----------
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

    Returns
    -------
    InputError
        Ready to raise.

    Examples
    --------
    >>> print(field_error("a.toml", "site_a.antenna_m", -3, "more than 0 m"))
    a.toml: site_a.antenna_m = -3: must be more than 0 m
    >>> print(field_error("a.toml", "frequency_ghz", 0, "more than 0", "give GHz, not Hz"))
    a.toml: frequency_ghz = 0: must be more than 0; give GHz, not Hz
    """
    line = f"{where}: {field} = {value}: must be {allowed}"
    return InputError(f"{line}; {remedy}" if remedy else line)


@contextmanager
def under(table: str, choice: Any = None) -> Iterator[None]:
    """Put the name of a hop file's table before the message of every error that is raised inside.

    Stages that take plain numbers do not know where those stand in a hop file; whoever hands them on does.

    Parameters
    ----------
    table
        Dotted name of the table.
    choice
        Dataclass of the table, if it has one: a message that begins with one of its fields goes on with a point.

    Examples
    --------
    >>> from profiler.models import ConfidenceChoice
    >>> with under("confidence", ConfidenceChoice):
    ...     raise InputError("draws = 3: must be 100 or more")
    Traceback (most recent call last):
    ...
    profiler.errors.InputError: confidence.draws = 3: must be 100 or more
    """
    try:
        yield
    except HopwrightError as error:
        text = str(error)
        keys = () if choice is None else [each.name for each in fields(choice)]
        joint = "." if text.partition(" ")[0].rstrip(":") in keys else ": "
        raise type(error)(f"{table}{joint}{text}") from error
