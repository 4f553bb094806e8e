"""What the commands share: figures, tables and documents, written whole or not at all."""

from __future__ import annotations

import csv
import io
import json
import math
import os
import tempfile
from collections.abc import Callable, Iterable, Sequence
from contextlib import suppress
from pathlib import Path
from typing import Any

import click

from profiler.errors import InputError

__all__ = ["check_targets", "csv_text", "deliver", "json_text", "put", "rendered", "write_whole"]


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


def json_text(document: Any) -> str:
    """One JSON document of whatever `profiler.study.plain` can turn into one."""
    from profiler.study import plain

    return json.dumps(plain(document), indent=2, ensure_ascii=False, allow_nan=False)


def csv_text(names: Sequence[str], rows: Iterable[Iterable[float]]) -> str:
    """One header row and numbers in full precision; what is not known stays empty."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(names)
    writer.writerows([["" if math.isnan(value) else value for value in row] for row in rows])
    return text.getvalue()


def rendered(paths: Sequence[Path], draw: Callable[[], Any]) -> list[tuple[Path, bytes]]:
    """Draw a figure of `profiler.figures` once and render it for every file asked for; for none, draw nothing."""
    if not paths:
        return []
    from profiler.figures import render

    figure = draw()
    return [(path, render(figure, path.suffix)) for path in paths]


def deliver(
    files: Sequence[tuple[Path, bytes | str]],
    *,
    csv_to: str | None,
    table: Callable[[], str],
    json_to: str | None,
    document: Callable[[], dict[str, Any]],
) -> bool:
    """Write all that was asked for, and say whether standard output is still free for the terminal's tables.

    Parameters
    ----------
    files
        Files and what goes into them, made before the first is written.
    csv_to, json_to
        Files, ``-`` for standard output, or None.
    table, document
        Make what goes there.
    """
    for path, content in files:
        write_whole(path, content)
    if csv_to is not None:
        put(csv_to, table())
    if json_to is not None:
        put(json_to, json_text(document()))
    return "-" not in (csv_to, json_to)
