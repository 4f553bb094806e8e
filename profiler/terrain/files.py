"""From the paths a user names to the rasters in them: folders walked, archives listed."""

from __future__ import annotations

import gzip
import hashlib
import os
import re
import stat
import zipfile
import zlib
from collections import Counter
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import IO

from profiler.errors import InputError, RasterError
from profiler.printable import printable

__all__ = [
    "Found",
    "Piece",
    "RasterFile",
    "Window",
    "file_hash",
    "find_rasters",
    "on_disk",
    "open_stream",
    "read_bytes",
]

Window = tuple[int, int, int, int]
"""First row, end row, first column, end column."""

_KINDS = {
    stat.S_IFIFO: "a pipe", stat.S_IFCHR: "a device", stat.S_IFBLK: "a device", stat.S_IFSOCK: "a socket",
    stat.S_IFDIR: "a folder",
}  # fmt: skip
_GIVE_FILE = "give a raster that is a file on this disk"

_SUFFIXES = frozenset({
    ".tif", ".tiff", ".gtiff", ".hgt", ".dt0", ".dt1", ".dt2", ".dt3", ".asc", ".vrt", ".img", ".bil", ".flt", ".bt",
    ".dem", ".ddf", ".grd", ".nc", ".bag", ".ter", ".jp2", ".hf2", ".sdat", ".rst", ".sigdem", ".xyz", ".ntf", ".gxf",
    ".kea", ".png", ".jpg", ".jpeg", ".zip", ".gz",
})  # fmt: skip
"""What is tried in a folder; anything at all may be named on its own."""


_NEVER_RASTERS = frozenset({
    ".prj", ".xml", ".aux", ".hdr", ".ovr", ".msk", ".tfw", ".wld", ".blx", ".clr", ".stx", ".sgrd", ".rdc", ".qml",
    ".txt", ".md", ".pdf", ".html", ".csv", ".json", ".geojson", ".toml", ".svg", ".py", ".sh", ".log", ".kml", ".gpx",
    ".shp", ".shx", ".dbf", ".cpg", ".doc", ".docx", ".xlsx", ".sha256", ".md5",
})  # fmt: skip
"""Endings of what commonly lies beside rasters; about any other that is passed over the user is told."""


@dataclass(frozen=True, slots=True)
class Piece:
    """A file that a virtual raster (VRT) is made from: what GDAL opens to reach it, and the window that it fills.

    `marker` is what the VRT takes for missing in place of what the file itself declares.
    """

    source: str
    window: Window
    marker: float | None = None


@dataclass(frozen=True, slots=True)
class RasterFile:
    """A raster on disk: the file, what GDAL opens to reach it, and whether the user named it or a folder held it.

    Of a virtual raster `source` is the text that GDAL is given, `pieces` the files behind it, `types` the types that
    its bands declare, `notes` what has to be said about it.
    """

    path: Path
    member: str
    source: str
    named: bool
    pieces: tuple[Piece, ...] = field(default=(), compare=False)
    types: tuple[str, ...] = field(default=(), compare=False)
    notes: tuple[str, ...] = field(default=(), compare=False)

    @property
    def name(self) -> str:
        """What messages call it."""
        return printable(f"{self.path}/{self.member}" if self.member else str(self.path))


@dataclass(frozen=True, slots=True)
class Found:
    """Rasters in the order that decides between equals, and what was passed over on the way, with the reason."""

    rasters: list[RasterFile]
    passed_over: list[tuple[Path, str]]


def find_rasters(paths: Sequence[Path]) -> Found:
    """List the rasters that files, folders (walked to the bottom) and zip archives hold, in a stable order.

    The order is that of the paths, inside a folder that of the names. An archive that cannot be listed is given as a
    raster itself: whoever opens it says what is wrong with it.

    Raises
    ------
    InputError
        When a path does not exist, or none is given.
    RasterError
        When a path is no regular file (a pipe or a device may never end), or nothing in the paths looks like a raster.
    """
    if not paths:
        raise InputError("no path given: give a raster, or a folder of rasters")
    found: dict[str, RasterFile] = {}
    passed_over: list[tuple[Path, str]] = []
    for path in paths:
        try:
            kind = path.stat().st_mode
        except (OSError, ValueError) as error:
            reason = "" if isinstance(error, FileNotFoundError) else f" ({getattr(error, 'strerror', None) or error})"
            raise InputError(f"{path}: no such file or folder{reason}; give a raster, or a folder of rasters") from None
        if not (stat.S_ISREG(kind) or stat.S_ISDIR(kind)):
            raise RasterError(
                f"{path}: is {_KINDS.get(stat.S_IFMT(kind), 'no file')}, not a regular file; {_GIVE_FILE}"
            )
        files = _walk(path, passed_over) if stat.S_ISDIR(kind) else iter([path])
        for file in files:
            for raster in _rasters_in(file, named=not stat.S_ISDIR(kind)):
                found.setdefault(raster.source, raster)
    if not found:
        where = ", ".join(str(path) for path in paths)
        told = "".join(f"; {path}: {reason}" for path, reason in passed_over[:3])
        raise RasterError(f"{where}: holds no raster (GeoTIFF, .hgt, DTED, .asc, .vrt, …); give one that does{told}")
    return Found(list(found.values()), passed_over)


def _walk(folder: Path, passed_over: list[tuple[Path, str]]) -> Iterator[Path]:
    """Regular files that look like rasters, in the order of names; the rest that might have been meant is told."""

    def unreadable(error: OSError) -> None:
        passed_over.append((Path(error.filename), f"folder not read ({error.strerror})"))

    for root, folders, files in os.walk(folder, onerror=unreadable):
        here = Path(root)
        folders[:] = sorted(name for name in folders if not name.startswith("."))
        passed_over.extend(
            (here / name, "link to a folder, not followed") for name in folders if (here / name).is_symlink()
        )
        other: Counter[str] = Counter()
        for name in sorted(files):
            path = here / name
            suffix = path.suffix.lower()
            if name.startswith("."):
                continue
            if suffix not in _SUFFIXES:
                other[suffix] += suffix not in _NEVER_RASTERS
                continue
            try:
                kind = path.stat().st_mode
            except OSError as error:
                passed_over.append((path, f"not read ({error.strerror})"))
                continue
            if stat.S_ISREG(kind):
                yield path
            elif not stat.S_ISDIR(kind):
                passed_over.append((path, f"is {_KINDS.get(stat.S_IFMT(kind), 'no file')}, not a regular file"))
        if count := other.total():
            endings = ", ".join(sorted(suffix or "none" for suffix, number in other.items() if number)[:5])
            files_are = "1 file has an ending" if count == 1 else f"{count} files have endings"
            passed_over.append((here, f"{files_are} that no raster has ({endings}): not looked at"))


def _rasters_in(path: Path, *, named: bool) -> Iterator[RasterFile]:
    """Rasters of a file; GDAL gets absolute paths, for it takes others that hold a colon for commands."""
    suffix, whole = path.suffix.lower(), str(path.absolute())
    members = _members(path) if suffix == ".zip" else None
    if members is not None:
        for member in members:
            name = Path(member)
            if not name.name.startswith(".") and name.suffix.lower() in _SUFFIXES - {".zip", ".gz"}:
                yield RasterFile(path, member, f"/vsizip/{whole}/{member}", named)
    elif suffix == ".gz":
        if named or Path(path.stem).suffix.lower() in _SUFFIXES:
            yield RasterFile(path, "", f"/vsigzip/{whole}", named)
    else:
        yield RasterFile(path, "", whole, named)


def _members(archive: Path) -> list[str] | None:
    """Names in a zip archive, sorted; None when it cannot be listed."""
    try:
        with zipfile.ZipFile(archive) as opened:
            return sorted(opened.namelist())
    except (zipfile.BadZipFile, OSError, ValueError, NotImplementedError):
        return None


def on_disk(source: str) -> Path | None:
    """File that holds what GDAL calls `source`, which may be inside an archive; None when there is none."""
    path = Path(re.sub(r"^(/vsi(zip|gzip|tar)/)+", "", source))
    return next((each for each in (path, *path.parents) if each.is_file()), None)


@contextmanager
def open_stream(source: str) -> Iterator[IO[bytes]]:
    """Open what GDAL calls `source` for reading as bytes, unpacked."""
    if not source.startswith("/vsi"):
        with Path(source).open("rb") as stream:
            yield stream
        return
    path = on_disk(source)
    if path is None:
        raise FileNotFoundError(source)
    if source.startswith("/vsizip/"):
        member = source.removeprefix(f"/vsizip/{path}").lstrip("/")
        with zipfile.ZipFile(path) as archive, archive.open(member) as stream:
            yield stream
    else:
        with gzip.open(path) as stream:
            yield stream  # type: ignore[misc]  # it is IO[bytes] in all but name


def read_bytes(source: str, most: int) -> bytes:
    """First bytes of what GDAL calls `source`, unpacked; none of what cannot be read (GDAL then says why)."""
    try:
        with open_stream(source) as stream:
            return stream.read(most)
    except (OSError, EOFError, ValueError, KeyError, RuntimeError, NotImplementedError, zipfile.BadZipFile, zlib.error):
        return b""


def file_hash(path: Path) -> str:
    """SHA-256 of a file in hexadecimal (of the archive when the raster is zipped), for the provenance.

    Examples
    --------
    >>> import tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     file = Path(folder) / "empty.tif"
    ...     _ = file.write_bytes(b"")
    ...     print(file_hash(file)[:16])
    e3b0c44298fc1c14
    """
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()
