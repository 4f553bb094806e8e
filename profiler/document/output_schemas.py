"""The JSON Schemas of what the commands give."""

from __future__ import annotations

from pathlib import Path

__all__ = ["output_schema"]


def output_schema(command: str) -> str:
    """Give the JSON Schema of what a command gives as ``--json``.

    Parameters
    ----------
    command
        ``study``, ``heights``, ``losses``, ``reach``, ``compare`` or ``terrain``.

    Returns
    -------
    str
        JSON, draft 2020-12.

    Examples
    --------
    >>> import json
    >>> json.loads(output_schema("study"))["title"]
    'hopwright study --json'
    """
    folder = Path(__file__).with_name("schemas")
    return (folder / f"{command}.json").read_text(encoding="utf-8")
