"""From the paths a user names to the rasters in them: folders walked, archives listed."""

from __future__ import annotations

import hashlib
import os
import zipfile
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from profiler.errors import InputError, RasterError

__all__ = ["RasterFile", "file_hash", "find_rasters"]

_SUFFIXES = frozenset({
    ".tif", ".tiff", ".gtiff", ".hgt", ".dt0", ".dt1", ".dt2", ".dt3", ".asc", ".vrt", ".img", ".bil", ".flt", ".bt",
    ".dem", ".ddf", ".grd", ".nc", ".bag", ".ter", ".jp2", ".hf2", ".sdat", ".rst", ".sigdem", ".xyz", ".ntf", ".gxf",
    ".kea", ".png", ".jpg", ".jpeg", ".zip", ".gz",
})  # fmt: skip
"""What is tried in a folder; anything at all may be named on its own."""


@dataclass(frozen=True, slots=True)
class RasterFile:
    """A raster on disk: the file, what GDAL opens to reach it, and whether the user named it or a folder held it."""

    path: Path
    member: str
    source: str
    named: bool

    @property
    def name(self) -> str:
        """What messages call it."""
        return f"{self.path}/{self.member}" if self.member else str(self.path)


def find_rasters(paths: Sequence[Path]) -> list[RasterFile]:
    """List the rasters that files, folders (walked to the bottom) and zip archives hold, in a stable order.

    An archive that cannot be listed is given as a raster itself: whoever opens it says what is wrong with it.

    Raises
    ------
    InputError
        When a path does not exist, or none is given.
    RasterError
        When nothing in the paths looks like a raster.
    """
    if not paths:
        raise InputError("no path given: give a raster, or a folder of rasters")
    found: dict[str, RasterFile] = {}
    for path in paths:
        if not path.exists():
            raise InputError(f"{path}: no such file or folder; give a raster, or a folder of rasters")
        files = _walk(path) if path.is_dir() else iter([path])
        for file in files:
            for raster in _rasters_in(file, named=not path.is_dir()):
                found.setdefault(raster.source, raster)
    if not found:
        where = ", ".join(str(path) for path in paths)
        raise RasterError(f"{where}: holds no raster (GeoTIFF, .hgt, DTED, .asc, .vrt, …); give one that does")
    return list(found.values())


def _walk(folder: Path) -> Iterator[Path]:
    for root, folders, files in os.walk(folder):
        folders[:] = sorted(name for name in folders if not name.startswith("."))
        for name in sorted(files):
            if not name.startswith(".") and Path(name).suffix.lower() in _SUFFIXES:
                yield Path(root) / name


def _rasters_in(path: Path, *, named: bool) -> Iterator[RasterFile]:
    suffix = path.suffix.lower()
    members = _members(path) if suffix == ".zip" else None
    if members is not None:
        for member in members:
            name = Path(member)
            if not name.name.startswith(".") and name.suffix.lower() in _SUFFIXES - {".zip", ".gz"}:
                yield RasterFile(path, member, f"/vsizip/{path.as_posix()}/{member}", named)
    elif suffix == ".gz":
        if named or Path(path.stem).suffix.lower() in _SUFFIXES:
            yield RasterFile(path, "", f"/vsigzip/{path.as_posix()}", named)
    else:
        yield RasterFile(path, "", str(path), named)


def _members(archive: Path) -> list[str] | None:
    """Names in a zip archive, sorted; None when it cannot be listed."""
    try:
        with zipfile.ZipFile(archive) as opened:
            return sorted(opened.namelist())
    except (zipfile.BadZipFile, OSError):
        return None


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
