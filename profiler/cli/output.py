"""What the commands share: writing files whole or not at all, and the terminal."""

from __future__ import annotations

import json
import math
import os
import sys
import tempfile
from collections.abc import Sequence
from contextlib import suppress
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from profiler.errors import InputError

if TYPE_CHECKING:
    from rich.console import Console

__all__ = ["check_targets", "console", "json_text", "put", "write_whole"]


def check_targets(*targets: str | Path | None, figures: Sequence[Path] = (), hop_file: Path | None = None) -> None:
    """Stop before any work, and before any file is written, when the outputs asked for cannot all be written.

    Parameters
    ----------
    targets
        Files, ``-`` for standard output, or None.
    figures
        Files whose ending must be that of a picture.
    hop_file
        The input, which no output may replace.

    Raises
    ------
    InputError
        For two documents on standard output, an ending that is no picture's, a folder that is not there, or a file
        named twice.
    """
    files = [Path(target) for target in targets if target not in (None, "-")]
    if sum(target == "-" for target in targets) > 1:
        raise InputError("command line: -: must stand once, since standard output takes one document; name a file")
    if figures:
        from profiler.figures import FORMATS

        for figure in figures:
            if figure.suffix.lower() not in FORMATS:
                raise InputError(f"{figure}: must end in one of {', '.join(FORMATS)} to be a figure")
    taken = {} if hop_file is None else {_real(hop_file): "the hop file"}
    for file in (*files, *figures):
        _require_folder(file)
        real = _real(file)
        if real in taken:
            raise InputError(f"{file}: must not be {taken[real]} too; name another file")
        if real.is_file() or not real.exists():  # a device takes any number of outputs
            taken[real] = "another output"


def _real(path: Path) -> Path:
    return Path(os.path.realpath(path))  # unlike Path.resolve, it does not stop at a link to itself


def _require_folder(path: Path) -> None:
    if path.is_dir() or not path.parent.is_dir():
        raise InputError(f"{path}: must be a file in a folder that exists; make the folder first or name another")


def write_whole(path: Path, content: bytes | str) -> None:
    """Write a file whole or not at all: into a temporary file beside it, which then replaces it.

    A link is followed; a device or a pipe is written to, never replaced.

    Raises
    ------
    InputError
        If the folder or the file cannot be written.
    """
    data = content.encode() if isinstance(content, str) else content
    _require_folder(path)
    target = _real(path)
    try:
        if target.exists() and not target.is_file():
            target.write_bytes(data)
        else:
            _replace(target, data)
    except OSError as error:
        raise InputError(f"{path}: {error.strerror}: must be a file that can be written here; name another") from error


def _replace(path: Path, data: bytes) -> None:
    """Put a new file in the place of the old one."""
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
    """Send text to a file, or to standard output when the target is ``-``; UTF-8 whatever the terminal speaks."""
    data = (text if text.endswith("\n") else text + "\n").encode()
    if target == "-":
        click.echo(data, nl=False)
    else:
        write_whole(Path(target), data)


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
    """Open the terminal for tables; width and color follow the terminal unless color is refused."""
    from rich.console import Console

    width = None if sys.stdout.isatty() else 110
    # names and labels are text: no markup and no emoji codes in them
    return Console(no_color=not color, highlight=False, width=width, soft_wrap=False, markup=False, emoji=False)
