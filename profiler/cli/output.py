"""What the commands share: where outputs may go, and figures, tables and documents to put there."""

from __future__ import annotations

import csv
import io
import json
import math
import re
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any

import click

from profiler.cli.files import real_path, require_writable, write_all
from profiler.cli.process import load_matplotlib
from profiler.errors import InputError
from profiler.models import Hop
from profiler.printable import printable

__all__ = ["check_targets", "csv_text", "deliver", "json_text", "put", "rendered", "tell"]


def check_targets(*targets: str | Path | None, figures: Sequence[Path] = (), reads: Any = ()) -> None:
    """Stop before any work, and before any file is written, when the outputs asked for cannot all be written.

    Parameters
    ----------
    targets
        Files, ``-`` for standard output, or None.
    figures
        Files whose ending must be that of a picture.
    reads
        What the command reads, which no output may replace: a hop, paths of rasters, or several of these.

    Raises
    ------
    InputError
        For two documents on standard output, an ending that is no picture's, a folder that is not there, a file that
        is protected, named twice, or read.
    """
    if sum(target == "-" for target in targets) > 1:
        raise InputError("command line: -: must stand once, since standard output takes one document; name a file")
    if figures:
        load_matplotlib()
        from profiler.figures import FORMATS

        for figure in figures:
            if figure.suffix.lower() not in FORMATS:
                raise InputError(f"{figure}: must end in one of {', '.join(FORMATS)} to be a figure")
    files = [Path(target) for target in targets if target not in (None, "-")] + list(figures)
    taken: dict[object, Path] = {}
    for file in files:
        require_writable(file)
        if file.is_file() or not file.exists():  # a device takes any number of outputs
            if (same := _identity(file)) in taken:
                raise InputError(f"{file}: must not be another output too; name another file")
            taken[same] = file
    if any(file.exists() for file in taken.values()):  # what is not there yet is not read either
        _require_unread(taken, reads)


def _identity(path: Path) -> object:
    """Give what is the same for all names of a file, links of either kind among them."""
    try:
        state = path.stat()
    except OSError:
        return real_path(path)
    return state.st_dev, state.st_ino


def _require_unread(taken: dict[object, Path], reads: Any) -> None:
    from profiler.terrain import files_behind

    named = list(_named_in(reads))
    for file in (hop_file for hop_file, is_raster in named if not is_raster):
        if (output := taken.get(_identity(file))) is not None:
            raise InputError(f"{output}: must not be the hop file too; name another file")
    for file in files_behind(path for path, is_raster in named if is_raster):
        if (output := taken.get(_identity(file))) is not None:
            same = "" if output == file else f" ({file})"
            raise InputError(f"{output}: must not be a raster that is read{same} too; name another file")


def _named_in(reads: Any) -> Iterator[tuple[Path, bool]]:
    """Every path in a value, however deep, and whether it is one of rasters; the other is the hop file."""
    if isinstance(reads, Path):
        yield reads, True
    elif isinstance(reads, tuple | list):
        for each in reads:
            yield from _named_in(each)
    elif is_dataclass(reads):
        if isinstance(reads, Hop) and reads.source_sha256 is not None:
            yield Path(reads.source), False
        for field in fields(reads):
            yield from _named_in(getattr(reads, field.name))


def put(target: str, text: str) -> None:
    """Send text to a file, or to standard output when the target is ``-``; UTF-8 whatever the terminal speaks."""
    _put_all([(target, text)])


def _put_all(outputs: Sequence[tuple[str | Path, bytes | str]]) -> None:
    """Write all outputs or none: standard output first, which may be full or read slowly; then the files."""
    ready = [(target, _bytes(content)) for target, content in outputs]
    for target, data in ready:
        if target == "-":
            click.echo(data, nl=False)
    write_all([(Path(target), data) for target, data in ready if target != "-"])


def _bytes(content: bytes | str) -> bytes:
    if isinstance(content, bytes):
        return content
    return (content if content.endswith("\n") else content + "\n").encode()


def tell(message: str, *, err: bool = False) -> None:
    """Print one line; names in it are made safe to print."""
    click.echo(printable(message), err=err)


def json_text(document: Any) -> str:
    r"""One JSON document of whatever `profiler.document.plain` takes; what could steer a terminal is escaped.

    Examples
    --------
    >>> print(json_text("\x1b\x9b \u202e \udcff \U000e0001 é"))
    "\u001b\u009b \u202e \udcff \udb40\udc01 é"
    """
    from profiler.document import plain

    text = json.dumps(plain(document), indent=2, ensure_ascii=False, allow_nan=False)
    return re.sub(r"[^ -~\n]", lambda found: found[0] if printable(found[0]) == found[0] else _code(found[0]), text)


def _code(letter: str) -> str:
    """Write a character as JSON's escape of it."""
    return json.dumps(letter)[1:-1]


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
    """Write all that was asked for or nothing, and say whether standard output is still free for the terminal's tables.

    Parameters
    ----------
    files
        Files and what goes into them, made before the first is written.
    csv_to, json_to
        Files, ``-`` for standard output, or None.
    table, document
        Make what goes there.
    """
    outputs: list[tuple[str | Path, bytes | str]] = list(files)
    if csv_to is not None:
        outputs.append((csv_to, table()))
    if json_to is not None:
        outputs.append((json_to, json_text(document())))
    _put_all(outputs)
    return "-" not in (csv_to, json_to)
