"""What somebody else needs to get the same numbers: files with their hashes, and versions."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime
from functools import cache, lru_cache
from importlib.metadata import version
from pathlib import Path
from platform import python_version

from profiler import __version__
from profiler.models import Hop
from profiler.study.result import Provenance
from profiler.terrain import file_hash, library_versions

__all__ = ["provenance"]

_LIBRARIES = ("numpy", "scipy", "rasterio", "pyproj", "matplotlib", "pydantic")


@cache
def _versions() -> tuple[tuple[str, str], ...]:
    """Versions of hopwright, Python and the libraries that numbers pass through, with what stands behind them."""
    libraries = tuple((name, version(name)) for name in _LIBRARIES)
    return (("hopwright", __version__), ("python", python_version()), *libraries, *library_versions())


@lru_cache(maxsize=4096)
def _hash(path: Path, size: int, changed_ns: int) -> str:
    """Hash a file once for all studies, as long as its size and time of change stay."""
    del size, changed_ns
    return file_hash(path)


def _identity(path: Path) -> tuple[str, int, str]:
    status = path.stat()
    return path.name, status.st_size, _hash(path.resolve(), status.st_size, status.st_mtime_ns)


def provenance(hop: Hop, files: Sequence[Path]) -> Provenance:
    """Name, size and SHA-256 of every file that the study used, and the versions that made it.

    Parameters
    ----------
    hop
        The hop, for its file's hash.
    files
        The rasters that gave heights, each once.

    Returns
    -------
    Provenance
    """
    return Provenance(
        created=datetime.now(UTC).isoformat(timespec="seconds"),
        versions=_versions(),
        hop_file=Path(hop.source).name,
        hop_sha256=hop.source_sha256,
        rasters=tuple(_identity(path) for path in files),
    )
