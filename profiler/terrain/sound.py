"""Whether a raster's file is whole, before GDAL reads cells in it: it takes what is cut short for 0, or never ends."""

from __future__ import annotations

import re
from contextlib import suppress
from pathlib import Path
from typing import IO, Any

from profiler.errors import RasterError
from profiler.printable import printable
from profiler.terrain.files import on_disk, open_stream, read_bytes
from profiler.terrain.tiff import read_directory

__all__ = ["declared_marker", "require_plain_beside", "require_whole"]

_UNPACKED = frozenset({"SRTMHGT", "EHdr", "ENVI", "BT", "DTED", "SAGA", "RST", "GSBG", "GS7BG", "NWT_GRD", "PCRaster"})
"""Formats that store every cell as it is: a file shorter than its cells is cut short."""

_NUMBER = rb"[-+]?+(?:\d++[.,]?+\d*+|[.,]\d++)(?:[eE][-+]?+\d++)?+|[-+]?nan|[-+]?1\.#QNAN|[-+]?1\.#IND"
_NUMBERS = re.compile(rb"(?:\s*+(?:" + _NUMBER + rb")(?=\s|\Z))*+\s*+", re.IGNORECASE)
_HEADER = {
    "AAIGrid": re.compile(
        rb"(?:\s*(?:ncols|nrows|xllcorner|yllcorner|xllcenter|yllcenter|cellsize|dx|dy|nodata_value)\s+\S+)*",
        re.IGNORECASE,
    ),
    "GRASSASCIIGrid": re.compile(
        rb"(?:\s*(?:north|south|east|west|rows|cols|null|type|multiplier)\s*:\s*\S+)*", re.IGNORECASE
    ),
    "GSAG": re.compile(rb"\s*DSAA(?:\s+\S+){8}"),
}
_PIECE_BYTES = 4_000_000

_GET_AGAIN = "the file is damaged or cut short: get it again"


def declared_marker(source: str) -> float | None:
    """Find the marker of missing cells that a raster declares beside it (.aux.xml) or, a GeoTIFF, in itself."""
    beside = Path(source + ".aux.xml")
    if not source.startswith("/vsi") and beside.is_file():
        found = re.search(r"<NoDataValue[^>]*>([^<]*)<", beside.read_text("utf-8", "replace"))
        with suppress(ValueError):
            return None if found is None else float(found[1])
    directory = read_directory(source)
    return None if directory is None else directory.marker


def require_plain_beside(source: str, name: str) -> None:
    """Refuse files beside a raster (masks, overviews, metadata) that name other files; GDAL would follow them.

    Raises
    ------
    RasterError
        Naming the file beside it.
    """
    for ending in (".msk", ".ovr", ".aux.xml"):
        beside = Path(source + ending)
        if source.startswith("/vsi") or not beside.exists():
            continue
        if not beside.is_file():
            raise RasterError(f"{name}: {printable(beside.name)} beside it is no regular file; take it away")
        head = read_bytes(str(beside), 1_000_000)
        plain = not re.search(rb"OVERVIEW_FILE|<SourceFilename|<SourceDataset|/vsi|://", head)
        if not (plain if ending == ".aux.xml" else head[:4] in (b"II*\0", b"MM\0*", b"II+\0", b"MM\0+")):
            raise RasterError(f"{name}: {printable(beside.name)} beside it names other files; take it away")


def require_whole(dataset: Any, source: str, name: str) -> bool:
    """Refuse a file that is shorter than its cells, or a text grid in which a cell is no number.

    Parameters
    ----------
    dataset
        The open raster.
    source
        What GDAL opened.
    name
        What messages call it.

    Returns
    -------
    bool
        Whether every block was written; an Imagine file does not tell.

    Raises
    ------
    RasterError
        Naming what is there and what should be.
    """
    if dataset.driver == "GTiff":
        return _require_blocks(source, name)
    if dataset.driver in _HEADER:
        with open_stream(source) as stream:
            _require_numbers(stream, _HEADER[dataset.driver], dataset.width * dataset.height, name)
    elif dataset.driver in _UNPACKED and not source.startswith("/vsi"):
        cells = sum(int(re.sub(r"\D", "", kind) or 8) // 8 for kind in dataset.dtypes) * dataset.width * dataset.height
        sizes = [path.stat().st_size for each in dataset.files if (path := on_disk(each)) is not None]
        if max(sizes) < cells:
            raise RasterError(
                f"{name}: holds {max(sizes)} bytes where its {cells} bytes of cells do not fit; {_GET_AGAIN}"
            )
    return bool(dataset.driver != "HFA")


def _require_blocks(source: str, name: str) -> bool:
    """Refuse a GeoTIFF whose last block ends beyond the file's end; say whether all its blocks were written."""
    directory = read_directory(source)
    if directory is None:
        return False
    if not source.startswith("/vsi"):  # what is in an archive is read to its end by whoever unpacks it
        size = Path(source).stat().st_size
        if directory.end > size:
            raise RasterError(
                f"{name}: ends after {size} bytes where its cells reach to byte {directory.end}; {_GET_AGAIN}"
            )
    return directory.all_written


def _require_numbers(stream: IO[bytes], header: re.Pattern[bytes], cells: int, name: str) -> None:
    """Read a text grid in pieces and count its numbers; GDAL reads others as 0, and waits for missing ones."""
    found, left, start = 0, b"", True
    while piece := stream.read(_PIECE_BYTES):
        data = left + piece
        if start:
            match = header.match(data)
            data, start = data[match.end() if match else 0 :], False
        cut = max(data.rfind(space) for space in (b" ", b"\n", b"\t", b"\r")) + 1
        found += _count(data[:cut], found, name)
        left = data[cut:]
        if len(left) > 1000:
            raise RasterError(
                f"{name}: holds {left[:20].decode('ascii', 'replace')}… where a number should be; {_GET_AGAIN}"
            )
    found += _count(left, found, name)
    if found != cells:
        raise RasterError(f"{name}: holds {found} heights where its header promises {cells}; {_GET_AGAIN}")


def _count(data: bytes, before: int, name: str) -> int:
    words = data.split()
    match = _NUMBERS.match(data)
    if match is None or match.end() < len(data):
        good = len(data[: match.end() if match else 0].split())
        word = printable(words[good][:20].decode("utf-8", "replace"))
        raise RasterError(
            f"{name}: holds {word} as height number {before + good + 1}, which is no number: write the marker that "
            "NODATA_value declares where a height is missing"
        )
    return len(words)
