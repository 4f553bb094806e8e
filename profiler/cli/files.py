"""Files that are written whole, all of them or none, whatever happens meanwhile."""

from __future__ import annotations

import os
import secrets
import shutil
from collections.abc import Iterator, Sequence
from contextlib import contextmanager, suppress
from pathlib import Path

from profiler.cli.signals import signals_held
from profiler.errors import InputError

__all__ = ["real_path", "require_writable", "write_all"]


def real_path(path: Path) -> Path:
    """Follow links to their end; unlike Path.resolve, a link to itself is given as it is."""
    return Path(os.path.realpath(path))


def require_writable(path: Path) -> None:
    """Refuse a file that cannot be made or replaced here, among them one that its owner has protected.

    Raises
    ------
    InputError
        Naming what is in the way.
    """
    with _blamed(path):
        if path.is_dir() or not real_path(path).parent.is_dir():
            raise InputError(f"{path}: must be a file in a folder that exists; make the folder first or name another")
        if path.exists() and not (path.stat().st_mode & 0o222 and os.access(path, os.W_OK)):
            raise InputError(f"{path}: is write-protected: must be a file that may be replaced; name another")
        if not _is_stream(path) and not os.access(real_path(path).parent, os.W_OK | os.X_OK):
            raise InputError(f"{path}: Permission denied: must be in a folder that can be written to; name another")


def _is_stream(path: Path) -> bool:
    """Whether a path leads to a device or a pipe, which takes what is written and is never replaced."""
    return path.exists() and not path.is_file()


def write_all(files: Sequence[tuple[Path, bytes]]) -> None:
    """Write files, each of them whole and all of them or none.

    Devices and pipes come first, since what reads them may take its time. Then every other file is made beside its
    target, and only when all are on the disk do they take their places. A link is followed; a file that is replaced
    keeps its permissions.

    Raises
    ------
    InputError
        If one cannot be written; those that had been replaced are as they were.
    """
    for path, _ in files:
        require_writable(path)
    for path, data in files:
        if _is_stream(path):
            with _blamed(path):
                path.write_bytes(data)
    with signals_held():
        _replace_all([(path, real_path(path), data) for path, data in files if not _is_stream(path)])


def _replace_all(files: Sequence[tuple[Path, Path, bytes]]) -> None:
    made: list[Path] = []
    undo: list[tuple[Path, Path | None]] = []
    try:
        for path, target, data in files:
            with _blamed(path):
                made.append(_beside(target))
                _make(made[-1], target, data)
        for (path, target, _), temporary in zip(files, tuple(made), strict=True):
            with _blamed(path):
                old = None
                if target.exists():
                    made.append(old := _beside(target))
                    _keep(target, old)
                undo.append((target, old))
                temporary.replace(target)
        undo.clear()
    finally:
        for target, old in reversed(undo):
            with suppress(OSError):
                target.unlink() if old is None else old.replace(target)
        for leftover in made:
            with suppress(OSError):
                leftover.unlink()
    for folder in {target.parent for _, target, _ in files}:
        with suppress(OSError):  # the files are in place; not every file system can be asked to remember it now
            _sync(folder)


def _beside(target: Path) -> Path:
    return target.with_name(f".hopwright-{secrets.token_hex(8)}")


def _make(temporary: Path, target: Path, data: bytes) -> None:
    """Write a new file to the disk, with the permissions of the one whose place it will take."""
    with temporary.open("xb") as stream:
        stream.write(data)
        stream.flush()
        os.fsync(stream.fileno())
    if target.exists():
        temporary.chmod(target.stat().st_mode & 0o7777)


def _keep(target: Path, old: Path) -> None:
    """Give an old file a second name, or where the file system has no links, a copy."""
    try:
        old.hardlink_to(target)
    except OSError:
        shutil.copy2(target, old)


def _sync(folder: Path) -> None:
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


@contextmanager
def _blamed(path: Path) -> Iterator[None]:
    """Name the file, as the user did, in what the system says about it."""
    try:
        yield
    except OSError as error:
        raise InputError(f"{path}: {error.strerror}: must be a file that can be written here; name another") from error
