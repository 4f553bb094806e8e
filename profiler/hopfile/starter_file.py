"""The hop file to start from."""

from __future__ import annotations

from pathlib import Path

__all__ = ["starter"]


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
    return Path(__file__).with_name("starter.toml").read_text(encoding="utf-8")
