"""Run a screening: pairs ordered in space and cut into chunks, each kept as soon as it is done, on any number of cores.

What was done stays done: every finished chunk is a file of its own beside the results, signed with what it was made
from, and a screening that is started again takes it up. The rows do not depend on who computed them or in what order.
"""

from __future__ import annotations

import hashlib
import io
import multiprocessing
import os
import pickle
import signal
import threading
import zipfile
from collections.abc import Callable, Iterator, Sequence
from contextlib import suppress
from dataclasses import fields
from pathlib import Path
from typing import Any

import numpy as np

from profiler import __version__
from profiler.errors import InputError
from profiler.screen.chunk import Template, screen_chunk
from profiler.screen.lines import Ints
from profiler.screen.pairs import Pairs
from profiler.screen.rows import Rows
from profiler.study import open_hop_terrain
from profiler.terrain import Terrain, files_behind

__all__ = ["CHUNK", "chunks_of", "remove_chunks", "screen"]

CHUNK = 2048
"""Pairs of a chunk: a second or less of work that a crash can cost, and enough to share what opening ground costs."""

_GRID = 1 << 16
_SIGNED = "signature.txt"

Progress = Callable[[int, int], None]
"""Told how many pairs of how many are done."""


def chunks_of(pairs: Pairs) -> list[Ints]:
    """Cut pairs into chunks of neighbours: in the order of a curve that fills the plane, by the middle of each path.

    Examples
    --------
    >>> at = np.array([[8.0, 46.0], [60.0, 10.0], [8.1, 46.1]])
    >>> pairs = Pairs(["1", "2", "3"], [""] * 3, *at.T, *(at + 0.1).T, *np.full((3, 3), np.nan))
    >>> [chunk.tolist() for chunk in chunks_of(pairs)]
    [[1, 0, 2]]
    """
    turn = (pairs.longitude_b - pairs.longitude_a + 180.0) % 360.0 - 180.0
    east = (np.nan_to_num(pairs.longitude_a + 0.5 * turn) + 180.0) % 360.0 / 360.0
    north = (np.nan_to_num(0.5 * (pairs.latitude_a + pairs.latitude_b)) + 90.0) / 180.0
    key = np.zeros(len(pairs), dtype=np.int64)
    for part, place in ((0, east), (1, north)):
        digits = np.minimum((place * _GRID).astype(np.int64), _GRID - 1)
        for bit in range(16):
            key |= (digits >> bit & 1) << (2 * bit + part)
    order = np.argsort(key, kind="stable")
    return [order[start : start + CHUNK] for start in range(0, order.size, CHUNK)]


def screen(
    template: Template,
    pairs: Pairs,
    folder: Path,
    *,
    workers: int = 1,
    progress: Progress | None = None,
) -> Rows:
    """Screen pairs and give a row for each, in their order.

    Parameters
    ----------
    template
        What the pairs share.
    pairs
        The pairs.
    folder
        Where finished chunks are kept; made if it is not there. What an earlier run of the same screening left is
        taken up; the caller removes it when the results are written.
    workers
        Processes on this machine.
    progress
        Told after every chunk.

    Returns
    -------
    Rows

    Raises
    ------
    InputError
        If the folder holds another screening's chunks, or a chunk cannot be written.
    """
    chunks = chunks_of(pairs)
    _claim(folder, _signature(template, pairs))
    rows = Rows.empty(len(pairs), len(template.hop.rules))
    left: list[int] = []
    done = 0
    for number, chunk in enumerate(chunks):
        kept = _kept(folder / f"{number:06d}.npz", chunk)
        if kept is None:
            left.append(number)
        else:
            rows.put(chunk, kept)
            done += chunk.size
    if progress is not None:
        progress(done, len(pairs))
    jobs = [(number, pairs.take(chunks[number])) for number in left]
    run = _in_processes(workers) if workers > 1 else _here
    for number, found in run(template, jobs):
        _keep(folder / f"{number:06d}.npz", found)
        rows.put(chunks[number], found)
        done += chunks[number].size
        if progress is not None:
            progress(done, len(pairs))
    return rows


Job = tuple[int, Pairs]
Runner = Callable[[Template, Sequence[Job]], Iterator[tuple[int, Rows]]]


def _here(template: Template, jobs: Sequence[Job]) -> Iterator[tuple[int, Rows]]:
    """Screen chunks one after the other."""
    with open_hop_terrain(template.hop) as terrain:
        for number, pairs in jobs:
            yield number, screen_chunk(template, pairs, terrain)


_OF_WORKER: list[tuple[Template, Terrain]] = []
"""What a worker process was started for."""


def _start_worker(template: Template) -> None:
    """Open the terrain once, let Ctrl-C end the process without a word, and end it when who started it is gone."""
    signal.signal(signal.SIGINT, signal.SIG_DFL)
    threading.Thread(target=_end_with_starter, daemon=True).start()
    _OF_WORKER.append((template, open_hop_terrain(template.hop)))


def _end_with_starter() -> None:
    """End this process, which would wait for work for ever, when the one that started it was killed."""
    starter = multiprocessing.parent_process()
    if starter is not None:
        starter.join()
        os._exit(1)


def _one(job: Job) -> tuple[int, Rows]:
    """Screen one chunk in a worker process."""
    template, terrain = _OF_WORKER[0]
    return job[0], screen_chunk(template, job[1], terrain)


def _in_processes(workers: int) -> Runner:
    """Screen chunks in several processes of this machine."""

    def run(template: Template, jobs: Sequence[Job]) -> Iterator[tuple[int, Rows]]:
        from concurrent.futures import ProcessPoolExecutor, as_completed

        spawn = multiprocessing.get_context("spawn")
        pool = ProcessPoolExecutor(
            min(workers, len(jobs)) or 1, mp_context=spawn, initializer=_start_worker, initargs=(template,)
        )
        try:
            for future in as_completed([pool.submit(_one, job) for job in jobs]):
                yield future.result()
        finally:
            pool.shutdown(cancel_futures=True)

    return run


def _signature(template: Template, pairs: Pairs) -> str:
    """Hash of all that the rows depend on: version, template, pairs, and the state of the terrain's files."""
    digest = hashlib.sha256(f"{__version__} {CHUNK} {template!r}".encode())
    cover = template.hop.cover
    classes = () if cover.landcover is None else (cover.landcover,)
    for file in files_behind([*template.hop.terrain.paths, *cover.canopy, *classes]):
        state = file.stat()
        digest.update(f"{file} {state.st_size} {state.st_mtime_ns}".encode(errors="surrogateescape"))
    digest.update(pickle.dumps((list(pairs.ids), list(pairs.problem))))
    for field in fields(pairs)[2:]:
        digest.update(np.ascontiguousarray(getattr(pairs, field.name)).tobytes())
    return digest.hexdigest()


def _claim(folder: Path, signature: str) -> None:
    """Make the folder of chunks, or make sure that it is that of this screening."""
    folder.mkdir(exist_ok=True)
    signed = folder / _SIGNED
    if not signed.exists() and any(folder.iterdir()):
        raise InputError(f"{folder}: must be a folder of this program's own; remove it, or name other results")
    if signed.exists() and signed.read_text(encoding="utf-8").strip() != signature:
        raise InputError(
            f"{folder}: holds chunks of another screening (other pairs, template, terrain or version); remove it, or"
            " name other results"
        )
    _write(signed, signature.encode())


def remove_chunks(folder: Path) -> None:
    """Remove what `screen` kept, once the results are written; what is not its own stays."""
    for file in [*folder.glob("[0-9]*.npz"), folder / _SIGNED]:
        file.unlink(missing_ok=True)
    with suppress(OSError):
        folder.rmdir()


def _write(path: Path, data: bytes) -> None:
    """Write a file whole or not at all."""
    temporary = path.with_name(f".{path.name}.{os.getpid()}")
    try:
        temporary.write_bytes(data)
        temporary.replace(path)
    except OSError as error:
        with suppress(OSError):
            temporary.unlink()
        raise InputError(
            f"{path}: {error.strerror}: must be a place that can be written; make room or name another"
        ) from error


def _keep(path: Path, rows: Rows) -> None:
    """Write the rows of one chunk."""
    memory = io.BytesIO()
    columns: dict[str, Any] = {name: np.asarray(getattr(rows, name)) for name in Rows.__slots__}
    np.savez(memory, **columns)
    _write(path, memory.getvalue())


def _kept(path: Path, chunk: Ints) -> Rows | None:
    """Read the rows of a chunk that an earlier run finished; None where there are none, or not all of them."""
    try:
        with np.load(io.BytesIO(path.read_bytes()), allow_pickle=False) as found:
            columns = [found[name] for name in Rows.__slots__]
    except (OSError, ValueError, KeyError, EOFError, zipfile.BadZipFile):
        return None
    texts, numbers = [column.tolist() for column in columns[:2]], columns[2:]
    return Rows(*texts, *numbers) if len(texts[0]) == chunk.size else None
