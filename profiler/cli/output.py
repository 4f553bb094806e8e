"""What the commands share: writing files whole or not at all, and the terminal."""

from __future__ import annotations

import json
import math
import os
import sys
import tempfile
from contextlib import suppress
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from profiler.errors import InputError

if TYPE_CHECKING:
    from rich.console import Console

__all__ = ["console", "json_text", "put", "write_whole"]


def write_whole(path: Path, content: bytes | str) -> None:
    """Write a file whole or not at all: into a temporary file beside it, which then replaces it.

    Raises
    ------
    InputError
        If the folder cannot be written.
    """
    data = content.encode() if isinstance(content, str) else content
    if path.is_dir() or not path.parent.is_dir():
        raise InputError(f"{path}: must be a file in a folder that exists; make the folder first or name another")
    handle, name = tempfile.mkstemp(prefix=f".{path.name}.", dir=path.parent)
    try:
        with os.fdopen(handle, "wb") as temporary:
            temporary.write(data)
        umask = os.umask(0)
        os.umask(umask)
        Path(name).chmod(0o666 & ~umask)
        Path(name).replace(path)
    except BaseException:
        with suppress(OSError):
            Path(name).unlink()
        raise


def put(target: str, text: str) -> None:
    """Send text to a file, or to standard output when the target is ``-``."""
    if target == "-":
        click.echo(text, nl=not text.endswith("\n"))
    else:
        write_whole(Path(target), text if text.endswith("\n") else text + "\n")


def json_text(document: dict[str, Any]) -> str:
    """One JSON document; numbers that are not finite become null, since JSON has no word for them."""
    return json.dumps(_finite(document), indent=2, ensure_ascii=False, allow_nan=False)


def _finite(value: Any) -> Any:
    """Replace every number that is not finite, however deep, by None."""
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, dict):
        return {key: _finite(each) for key, each in value.items()}
    if isinstance(value, list | tuple):
        return [_finite(each) for each in value]
    return value


def console(*, color: bool) -> Console:
    """Open the terminal for tables; width and colour follow the terminal unless colour is refused."""
    from rich.console import Console

    width = None if sys.stdout.isatty() else 110
    return Console(no_color=not color, highlight=False, width=width, soft_wrap=False)
