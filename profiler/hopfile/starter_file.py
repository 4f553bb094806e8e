"""The hop file to start from: an invented hop, with the words of every key and an offer of those that it leaves out."""

from __future__ import annotations

import json
import textwrap
import tomllib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from profiler.models import Hop
from profiler.models.stated import Entry, States, entries

__all__ = ["starter", "toml_value"]

_HEAD = """\
# A hop file: one radio path between two sites, and all that hopwright should know about it.
#
# Everything below is invented: the sites stand in a country that does not exist, in the middle of an ocean, and the
# radio is nobody's. Put your own values in their place.
#
# - The unit is in the key. Every length may end in _m, _ft, _km or _mi (antenna_m or antenna_ft), every frequency in
#   _hz, _khz, _mhz or _ghz, every bit rate in _bps, _kbps, _mbps or _gbps, every temperature in _k or _c; and every k
#   may be given by its gradient (median_k or median_gradient_n_km).
# - A line that begins with "#" right before a key is another way, or one more thing to say: take the "#" away to use it
#   (and put one before what it replaces).
# - What you leave out is not invented: the result says what was assumed, or leaves out what it cannot know.

"""
_WIDTH = 120


def starter() -> str:
    """Text of a complete, commented hop file of an invented scenario.

    Only the terrain must be filled in before it can be read as a hop. Lines with a ``#`` right before a key are valid
    alternatives.

    Returns
    -------
    str
        TOML.

    Examples
    --------
    >>> starter().splitlines()[0]
    '# A hop file: one radio path between two sites, and all that hopwright should know about it.'
    """
    scenario = tomllib.loads(Path(__file__).with_name("scenario.toml").read_text(encoding="utf-8"))
    return _HEAD + "\n".join(_lines(Hop, scenario, "", set())) + "\n"


def _lines(states: States, said: Mapping[str, Any], at: str, offered: set[str]) -> Iterator[str]:
    """Lines of a table: its own keys, then the tables inside it. Each key is explained and offered once."""
    inner = [entry for entry in entries(states) if _tables(entry)]
    for entry in entries(states):
        if entry not in inner:
            yield from _key(entry, said, f"{states.__name__}.{entry.field}", offered)
    for entry in inner:
        yield from _inside(entry, said, f"{at}.{entry.usual.key}".lstrip("."), offered)


def _tables(entry: Entry) -> bool:
    """Whether a field is written as tables of its own."""
    return entry.kind.sort in ("table", "named") or (entry.kind.sort == "list" and entry.kind.of.sort == "table")


def _key(entry: Entry, said: Mapping[str, Any], name: str, offered: set[str]) -> Iterator[str]:
    """Write the line of a key, with its words where it stands for the first time."""
    first = name not in offered
    offered.add(name)
    key = next((way.key for way in entry.ways if way.key in said), None)
    if key is not None or first:
        line = f"{key} = {toml_value(said[key])}" if key else f"#{entry.usual.key} = {toml_value(entry.key.example)}"
        yield from _commented(line, entry.explained if first else "")


def _commented(line: str, words: str) -> Iterator[str]:
    """Put words behind a line, or above it where they are too long."""
    behind = f"{line} # {words}" if words else line
    if len(behind) <= _WIDTH:
        yield behind
    else:
        yield from textwrap.wrap(words, _WIDTH, initial_indent="# ", subsequent_indent="#   ")
        yield line


def _inside(entry: Entry, said: Mapping[str, Any], at: str, offered: set[str]) -> Iterator[str]:
    """Write the tables of a field: those of the scenario, or the first of its kind as an offer."""
    key = entry.usual.key
    listed, states = entry.kind.sort == "list", entry.kind.of.of if entry.kind.sort == "list" else entry.kind.of
    heading = f"[[{at}]]" if listed else f"[{at}]"
    if "." not in at:
        dashes = f"# ---- {at} "
        yield f"\n{dashes}{'-' * (120 - len(dashes))}"
    if entry.kind.sort == "named":
        mark = "" if key in said else "#"
        yield ""
        yield from _commented(mark + heading, entry.key.words)
        values: Mapping[str, Any] = said.get(key, entry.key.example)
        yield from (f"{mark}{_name(name)} = {toml_value(value)}" for name, value in values.items())
        return
    tables: list[Any] = said.get(key, []) if listed else [said[key]] if key in said else []
    for index, table in enumerate(tables):
        yield ""
        yield from _commented(heading, "" if index else entry.key.words)
        yield from _lines(states, table, at, offered)
    if not tables and not any(name.startswith(f"{states.__name__}.") for name in offered):
        yield ""
        yield from _commented(f"#{heading}", entry.key.words)
        yield from (line if line[:1] in ("", "#") else f"#{line}" for line in _lines(states, {}, at, offered))


def _name(text: str) -> str:
    return text if text.isidentifier() or text.isdecimal() else json.dumps(text)


def toml_value(value: Any) -> str:
    """Write a value as TOML does.

    Examples
    --------
    >>> toml_value([["a", True], {"41": 18}])
    '[["a", true], { 41 = 18 }]'
    """
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{_name(key)} = {toml_value(each)}" for key, each in value.items()) + " }"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(map(toml_value, value)) + "]"
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False)
    return str(value).lower() if isinstance(value, bool) else repr(value)
