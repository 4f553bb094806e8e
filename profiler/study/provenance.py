"""What somebody else needs to get the same numbers: files with their hashes, and versions."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime
from functools import cache
from importlib.metadata import version
from pathlib import Path
from platform import python_version

from profiler import __version__
from profiler.models import Hop
from profiler.study.result import Provenance
from profiler.terrain import file_hash, library_versions

__all__ = ["provenance"]

_LIBRARIES = ("numpy", "scipy", "rasterio", "pyproj", "matplotlib")


@cache
def _versions() -> tuple[tuple[str, str], ...]:
    """Versions of hopwright, Python and the libraries that numbers pass through, with what stands behind them."""
    libraries = tuple((name, version(name)) for name in _LIBRARIES)
    return (("hopwright", __version__), ("python", python_version()), *libraries, *library_versions())


@cache
def _identity(path: Path, size: int, _changed_ns: int) -> tuple[str, int, str]:
    """Name, size and hash of a file, read once for all studies while its size and time of change stay."""
    return path.name, size, file_hash(path)


def provenance(hop: Hop, files: Sequence[Path]) -> Provenance:
    """Name, size and SHA-256 of every file that the study used, and the versions that made it.

    Parameters
    ----------
    hop
        The hop, for its file's hash.
    files
        The rasters that gave heights.

    Returns
    -------
    Provenance
    """
    states = ((path, path.stat()) for path in dict.fromkeys(path.absolute() for path in files))
    return Provenance(
        created=datetime.now(UTC).isoformat(timespec="seconds"),
        versions=_versions(),
        hop_file=Path(hop.source).name,
        hop_sha256=hop.source_sha256,
        rasters=tuple(_identity(path, state.st_size, state.st_mtime_ns) for path, state in states),
    )
