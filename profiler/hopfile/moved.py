"""Let the paths in a hop file's text start from another folder, leaving all else as it is."""

from __future__ import annotations

import json
import os
import re
import tomllib
from collections.abc import Iterator
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any

from profiler.errors import InputError
from profiler.hopfile.reader import parse_hop

__all__ = ["with_paths_from"]

_LITERAL = re.compile(
    r'''(?P<other>\#[^\n]*|"""(?:[^\\]|\\.)*?"""|\'\'\'.*?\'\'\')|"(?:[^"\\\n]|\\.)*"|'[^'\n]*\'''', re.DOTALL
)
"""Text in quotes on one line; comments and long texts first, since quotes may stand in them too."""


def with_paths_from(text: str, old: Path, new: Path) -> str:
    """Copy of a hop file's text for another folder: from there its relative paths lead to the same places.

    Parameters
    ----------
    text
        A hop file.
    old, new
        Folders that the paths in the text start from, and are to start from.

    Returns
    -------
    str
        The new text. It has been read again and compared: it says the same hop.

    Raises
    ------
    InputError
        If the paths cannot be rewritten safely, or the text is no hop file.
    """
    if old.resolve() == new.resolve():
        return text
    hop = parse_hop(text, base_dir=old)
    there = {os.path.relpath(path, old): path.resolve() for path in _leaves(hop) if isinstance(path, Path)}

    def moved(found: re.Match[str]) -> str:
        value = "" if found["other"] else tomllib.loads(f"value = {found[0]}")["value"]
        path = None if Path(value).is_absolute() else there.get(os.path.normpath(value))
        return found[0] if path is None else json.dumps(os.path.relpath(path, new.resolve()), ensure_ascii=False)

    copy = _LITERAL.sub(moved, text)
    by_hand = InputError("the paths in the hop file: must be written in full for a copy in another folder")
    try:
        again = parse_hop(copy, base_dir=new)
    except InputError:
        raise by_hand from None
    if [_settled(leaf) for leaf in _leaves(again)] != [_settled(leaf) for leaf in _leaves(hop)]:
        raise by_hand
    return copy


def _leaves(value: Any) -> Iterator[Any]:
    """Give every plain value in a hop, in order."""
    if is_dataclass(value):
        value = [getattr(value, field.name) for field in fields(value)]
    if isinstance(value, tuple | list):
        for each in value:
            yield from _leaves(each)
    else:
        yield value


def _settled(leaf: Any) -> Any:
    return leaf.resolve() if isinstance(leaf, Path) else leaf
