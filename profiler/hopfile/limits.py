"""How much a hop file may hold: enough for any hop, and so little that whatever is in it is read in a moment."""

from __future__ import annotations

import re
import stat
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from profiler.errors import InputError

__all__ = ["read_limited", "require_bounded", "require_shallow"]

_MOST_BYTES = 1_000_000
_LONGEST_TEXT = 1000
_MOST_PARTS = 32
_PART = r"""(?:[A-Za-z0-9_-]++|"[^"\n]*+"|'[^'\n]*+')"""
_DEEP_KEY = re.compile(rf"(?<![A-Za-z0-9_\-])(?:{_PART}[ \t]*+\.[ \t]*+){{{_MOST_PARTS}}}")
"""So many parts of a dotted key; a start inside a word is no start, so that the search takes one pass."""


def read_limited(path: Path) -> bytes:
    """Bytes of a regular file that is not too large; a pipe or a device, which might never end, is not opened.

    Raises
    ------
    InputError
        For anything else that is there.
    OSError
        Where there is nothing, or it cannot be read.
    """
    kind = path.stat().st_mode
    if not stat.S_ISREG(kind) and not stat.S_ISDIR(kind):  # a folder has an error of its own
        raise InputError(f"{path}: must be a regular file, not a pipe or a device; save it as a file first")
    with path.open("rb") as stream:
        content = stream.read(_MOST_BYTES + 1)
    if len(content) > _MOST_BYTES:
        raise InputError(f"{path}: must be a hop file of at most {_MOST_BYTES / 1e6:g} MB; is it a hop file at all?")
    return content


def require_shallow(text: str, where: str) -> None:
    """Refuse TOML whose dotted keys nest so deep that reading them would take minutes."""
    deep = _DEEP_KEY.search(text)
    if deep:
        line = text.count("\n", 0, deep.start()) + 1
        raise InputError(
            f"{where}: line {line}: must be TOML that is nested a few levels deep; a key of it is nested too deeply"
        )


def require_bounded(raw: Any, where: str) -> None:
    """Refuse text, in any table, that is longer than a name or a path needs.

    Examples
    --------
    >>> require_bounded({"site_a": {"name": "x" * 1001}}, "hop.toml")
    Traceback (most recent call last):
    profiler.errors.InputError: hop.toml: site_a.name = xxxxxxxxxxxxxxxxxxxx…: must be at most 1000 characters, not 1001
    """
    places: list[tuple[str, Any]] = [("", raw)]
    while places:
        at, value = places.pop()
        if isinstance(value, Mapping):
            for key, inner in value.items():
                if len(key) > _LONGEST_TEXT:
                    raise _too_long(f"{where}: the key {at}{key[:20]}…", key)
                places.append((f"{at}{key}.", inner))
        elif isinstance(value, list):
            places += [(f"{at.removesuffix('.')}[{number}].", inner) for number, inner in enumerate(value)]
        elif isinstance(value, str) and len(value) > _LONGEST_TEXT:
            raise _too_long(f"{where}: {at.removesuffix('.')} = {value[:20]}…", value)


def _too_long(what: str, text: str) -> InputError:
    return InputError(f"{what}: must be at most {_LONGEST_TEXT} characters, not {len(text)}")
