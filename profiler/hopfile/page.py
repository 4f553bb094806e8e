"""The page of all keys of a hop file, in Markdown, from the same statement as its reader."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from profiler.hopfile.presets import PRESETS
from profiler.hopfile.starter_file import toml_value
from profiler.models import Hop
from profiler.models.stated import Entry, States, allowed, entries, forms, listed

__all__ = ["keys_page"]

_HEAD = """\
# The keys of a hop file

A hop file is TOML. This page is made from the statement that the reader itself follows: `hopwright starter --keys`
prints it, `hopwright starter` writes a commented file to begin with, and `hopwright starter --schema` prints the JSON
Schema by which editors complete and check a file.

- The unit is in the key. A length may end in `_m`, `_ft`, `_km` or `_mi`, a frequency or bandwidth in `_hz`, `_khz`,
  `_mhz` or `_ghz`, a bit rate in `_bps`, `_kbps`, `_mbps` or `_gbps`, a delay in `_s` or `_ns`, a temperature in `_k`
  or `_c`, a cost per length in `_per_m`, `_per_ft` and so on. Each key stands here once, as the trade writes it.
- A k may be given as `k` or by its gradient: `median_k = 1.33` or `median_gradient_n_km = -39`.
- A key that is not on this page is an error that offers the nearest one that is.
"""


def keys_page() -> str:
    """Give the page of keys.

    Returns
    -------
    str
        Markdown.

    Examples
    --------
    >>> keys_page().splitlines()[0]
    '# The keys of a hop file'
    """
    presets = "\n".join(f"- `{name}`: {preset.label}; {preset.source}" for name, preset in PRESETS.items())
    return "\n".join([_HEAD, *_section(Hop, "", "The top of the file", set()), "## Presets of rules", "", presets, ""])


def _section(states: States, at: str, words: str, told: set[type]) -> Iterator[str]:
    """Write one table: heading, its own keys, what they ask of one another; then the tables inside it."""
    yield f"## {words}\n"
    inner = [entry for entry in entries(states) if _class_of(entry) is not None]
    own = [entry for entry in entries(states) if entry not in inner]
    if own:
        yield "| key | allowed | what it is |\n| --- | --- | --- |"
        yield from (f"| `{entry.usual.key}` | {_allowed(entry)} | {_words(entry)} |" for entry in own)
        yield ""
    usual = {entry.field: entry.usual.key for entry in entries(states)}
    for each in forms(states):
        offer = "; or ".join(listed(f"`{usual[name]}`" for name in way) for way in each.required())
        how = "Exactly one of" if each.only else "At least one of"
        yield f"{how}: {offer}.\n" if len(each.ways) > 1 else f"Together or not at all: {offer}.\n"
    told.add(states)
    for entry in inner:
        name, inside = f"{at}.{entry.usual.key}".lstrip("."), _class_of(entry)
        heading = f"`[[{name}]]`" if entry.kind.sort == "list" else f"`[{name}]`"
        if inside in told:
            yield f"## {heading}: {entry.key.words}\n\nThe keys are those of the same table above.\n"
        else:
            yield from _section(inside, name, f"{heading}: {entry.key.words}", told)


def _class_of(entry: Entry) -> States | None:
    """Class of the table or tables that an entry holds."""
    kind = entry.kind.of if entry.kind.sort == "list" else entry.kind
    found: Any = kind.of if kind.sort == "table" else None
    return found


def _allowed(entry: Entry) -> str:
    """Say what a key may hold."""
    kind = entry.kind
    said = {bool: "`true` or `false`", "pairs": "pairs of numbers", "named": "a table of numbers by name"}
    if kind.sort == "choice":
        return ", ".join(f"`{each}`" for each in kind.of)
    if kind.sort in (float, int):
        return allowed(kind, entry.key, entry.usual, sort=True)
    if kind.sort == "list":
        return "a list of paths" if not entry.usual.unit else f"a list of {allowed(kind.of, entry.key, entry.usual)}"
    return said.get(kind.sort, "text")


def _words(entry: Entry) -> str:
    """Say what a key is, and what is taken where it is left out."""
    left_out = entry.key.left_out
    if not left_out and not entry.required and entry.default not in ((), "", None):
        value = entry.usual.out(entry.default) if entry.kind.sort is float else entry.default
        left_out = f"{value:g}" if isinstance(value, float) else toml_value(value)
    words = f"{entry.key.words[0].upper()}{entry.key.words[1:]}"
    return f"{words}. {'**Needed.**' if entry.required else f'If left out: {left_out}.' if left_out else ''}".rstrip()
