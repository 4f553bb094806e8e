"""`hopwright starter`: a commented hop file to start from."""

from __future__ import annotations

from pathlib import Path

import click

from profiler.cli.output import put, tell
from profiler.errors import InputError

__all__ = ["command"]


@click.command("starter")
@click.argument("file", metavar="FILE.toml")
@click.option("--force", is_flag=True, help="Replace the file if it exists.")
def command(file: str, force: bool) -> int:
    """Write a commented hop file to start from, with every key in it.

    Give - for standard output.
    """
    from profiler.hopfile import starter

    if file != "-" and Path(file).exists() and not force:
        raise InputError(f"{file}: exists already: must be a new file; name another, or replace it with --force")
    put(file, starter())
    if file != "-":
        tell(f"Wrote {file}: put in your sites and terrain, then run: hopwright study {file}")
    return 0
