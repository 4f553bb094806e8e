"""`hopwright starter`: a commented hop file to start from."""

from __future__ import annotations

import json
from pathlib import Path

import click

from profiler.cli.output import put, tell
from profiler.errors import InputError

__all__ = ["command"]


_OUTPUTS = ("study", "heights", "losses", "reach", "compare", "terrain")


@click.command("starter")
@click.argument("file", metavar="[FILE.toml]", required=False)
@click.option("--force", is_flag=True, help="Replace the file if it exists.")
@click.option("--schema", "kind", flag_value="schema", help="The JSON Schema of a hop file, for editors.")
@click.option("--keys", "kind", flag_value="keys", help="The page of all keys, in Markdown.")
@click.option("--schema-of", type=click.Choice(_OUTPUTS), help="The JSON Schema of what a command gives as --json.")
def command(file: str | None, force: bool, kind: str | None, schema_of: str | None) -> int:
    """Write a commented hop file to start from, with every key in it.

    Give - for standard output. With --schema, --schema-of or --keys it is a JSON Schema or the page of keys that is
    written, to standard output where no file is named.
    """
    from profiler.hopfile import hop_schema, keys_page, starter

    if schema_of is not None:
        from profiler.document import output_schema

        kind = "output"
    if file is None and kind is None:
        raise InputError("command line: FILE.toml: must be given; - is standard output")
    if file not in (None, "-") and Path(file).exists() and not force:
        raise InputError(f"{file}: exists already: must be a new file; name another, or replace it with --force")
    texts = {
        "schema": lambda: json.dumps(hop_schema(), indent=2, ensure_ascii=False) + "\n",
        "output": lambda: output_schema(schema_of or ""),
        "keys": keys_page,
    }
    put(file or "-", texts.get(kind or "", starter)())
    if kind is None and file != "-":
        tell(f"Wrote {file}: put in your sites and terrain, then run: hopwright study {file}")
    return 0
