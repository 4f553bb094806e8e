"""Which files heights may be read from: what no output may replace."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from contextlib import suppress
from pathlib import Path

from profiler.errors import HopwrightError
from profiler.terrain.describe import NotHeightsError, Reading, describe, settled
from profiler.terrain.files import RasterFile, find_rasters
from profiler.terrain.gdal import gdal_session, open_raster
from profiler.terrain.pieces import find_pieces

__all__ = ["files_behind"]


def files_behind(paths: Iterable[Path]) -> Iterator[Path]:
    """Every file that reading rasters and folders of them may touch, each once.

    The rasters with what stands beside them (a world file, statistics), archives as a whole, and the sources of
    mosaics, and theirs in turn. What a folder holds besides heights is not among them: it is left out when they are
    read. A raster that cannot be opened is given by its own name; whoever reads it says what is wrong with it.
    """
    seen = set[Path]()
    with gdal_session():
        for path in paths:
            for file in _rasters(path):
                fresh = [each for each in _touched(file) if each not in seen]
                seen.update(fresh)
                yield from fresh


def _rasters(path: Path) -> list[RasterFile]:
    try:
        return [file for file in find_rasters([path]).rasters if file.named or _holds_heights(file)]
    except HopwrightError:
        return []


def _holds_heights(file: RasterFile) -> bool:
    try:
        describe(file, Reading(eight_bit=True))
    except NotHeightsError:
        return False
    except HopwrightError:  # it may: the study stops at it
        return True
    return True


def _touched(file: RasterFile) -> dict[Path, None]:
    touched = {file.path: None}
    with suppress(HopwrightError):
        plain = settled(file, Reading(allow_network=True))
        with open_raster(plain) as dataset:
            touched |= dict.fromkeys(find_pieces(plain, dataset).files)
    return touched
