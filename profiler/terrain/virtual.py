"""Virtual rasters (VRT), read as text first, so that GDAL gets nothing but a plain mosaic of rasters on this disk.

A VRT comes from strangers and may name anything: files that are no rasters, the network, a program to run on the cells.
And where none of its pieces lies its cells read as 0, a sea where a mountain may be. So the text is written anew, from
the few parts that a mosaic of heights needs: every cell starts as missing, and a piece paints only what it holds; what
a piece declares as missing, by its marker or its mask, lets what lies under it show.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from xml.etree import ElementTree
from xml.etree.ElementTree import Element, SubElement

from profiler.errors import RasterError
from profiler.printable import printable
from profiler.terrain.files import Piece, Window, on_disk, read_bytes

__all__ = ["Virtual", "is_virtual", "read_virtual"]

_MOST_BYTES, _DEEPEST = 64_000_000, 8

_KEPT = frozenset({"SRS", "GeoTransform"})
_DROPPED = frozenset({"OverviewList", "BlockXSize", "BlockYSize", "Metadata", "MaskBand", "GCPList"})
_BAND_KEPT = frozenset({"Description", "UnitType", "Offset", "Scale", "NoDataValue", "ColorInterp"})
_BAND_DROPPED = frozenset({"Metadata", "Histograms", "CategoryNames", "ColorTable", "HideNoDataValue", "Overview"})
_SOURCE_KEPT = frozenset({"SourceProperties", "SrcRect", "DstRect", "NODATA", "ScaleOffset", "ScaleRatio"})
_SOURCE_DROPPED = frozenset({"UseMaskBand"})
_RESAMPLING = frozenset({"nearest", "bilinear", "cubic", "cubicspline", "lanczos", "average", "mode"})
_WARP_TAGS = frozenset({
    "WarpMemoryLimit", "ResampleAlg", "WorkingDataType", "Option", "SourceDataset", "Transformer", "ApproxTransformer",
    "MaxError", "BaseTransformer", "GenImgProjTransformer", "SrcGeoTransform", "SrcInvGeoTransform", "DstGeoTransform",
    "DstInvGeoTransform", "ReprojectTransformer", "ReprojectionTransformer", "SourceSRS", "TargetSRS", "BandList",
    "BandMapping", "SrcNoDataReal", "SrcNoDataImag", "DstNoDataReal", "DstNoDataImag", "SrcAlphaBand", "DstAlphaBand",
    "GDALWarpOptions", "SourceExtraPixels", "Options",
})  # fmt: skip
"""Parts of a warped VRT: none names a file but SourceDataset."""

_TRANSLATE = "make a GeoTIFF of it by gdal_translate and give that"
_OVER_NETWORK = re.compile(r"/vsi(curl|s3|gs|az|adls|oss|swift|hdfs|webhdfs)(_streaming)?[/?]|https?://|ftp://")


@dataclass(frozen=True, slots=True)
class Virtual:
    """A VRT as GDAL may have it: its text, the files behind it, the declared types of its bands, and what to tell."""

    text: str
    pieces: tuple[Piece, ...]
    types: tuple[str, ...]
    notes: tuple[str, ...]


@dataclass(slots=True)
class _Reader:
    """What holds while one VRT and those inside it are read."""

    allow_network: bool
    pieces: list[Piece] = field(default_factory=list)
    remote: list[str] = field(default_factory=list)
    absent: list[str] = field(default_factory=list)

    def notes(self) -> Iterator[str]:
        if self.absent:
            some = ", ".join(Path(name).name for name in self.absent[:3])
            yield f"names {len(self.absent)} files that are not there ({printable(some)}): their cells are missing"
        if self.remote:
            yield f"reads {len(self.remote)} sources over the network, as allowed: their contents have no hash here"


def is_virtual(head: bytes) -> bool:
    """Whether GDAL would take a file that begins so for a VRT."""
    return b"<VRTDataset" in head


def read_virtual(source: str, name: str, *, allow_network: bool) -> Virtual:
    """Read a VRT and write it anew from what is safe and plain in it.

    Parameters
    ----------
    source
        What GDAL would open.
    name
        What messages call it.
    allow_network
        Let it name sources that are read over the network.

    Raises
    ------
    RasterError
        When it is damaged, computes its cells, or names what is no raster on this disk.
    """
    reader = _Reader(allow_network)
    root = _parse(source, name)
    wide, high = (_size(root, side, name) for side in ("rasterXSize", "rasterYSize"))
    clean = _rewritten(root, source, name, reader, (0, int(high), 0, int(wide)), depth=1)
    types = tuple(
        band.get("dataType", "Byte")
        for band in root.iter("VRTRasterBand")
        if band.findtext("ColorInterp", "") != "Alpha" and band in list(root)
    )
    return Virtual(ElementTree.tostring(clean, encoding="unicode"), tuple(reader.pieces), types, tuple(reader.notes()))


def _parse(source: str, name: str) -> Element:
    data = read_bytes(source, _MOST_BYTES + 1)
    if len(data) > _MOST_BYTES:
        raise RasterError(f"{name}: is a VRT of more than {_MOST_BYTES // 1_000_000} MB; split it")
    if b"<!" in data.replace(b"<!--", b""):
        raise RasterError(f"{name}: is a VRT with a document type or entities, which no mosaic needs; {_TRANSLATE}")
    try:
        root = ElementTree.fromstring(data)
    except (ElementTree.ParseError, ValueError, LookupError) as error:
        raise RasterError(f"{name}: is a damaged VRT ({error}); get it again, or leave it out") from None
    if root.tag != "VRTDataset":
        raise RasterError(f"{name}: is a damaged VRT (it begins with {root.tag}); get it again, or leave it out")
    return root


def _rewritten(root: Element, source: str, name: str, reader: _Reader, window: Window, depth: int) -> Element:
    """Return the VRT with every source named in full, and every cell missing where none of them has one."""
    if depth > _DEEPEST:
        raise RasterError(f"{name}: is a VRT inside a VRT more than {_DEEPEST} deep, or inside itself; {_TRANSLATE}")
    kind = root.get("subClass")
    if kind == "VRTWarpedDataset":
        return _warped(root, source, name, reader, window)
    if kind:
        raise RasterError(f"{name}: is a VRT that computes its cells ({kind}); {_TRANSLATE}")
    size = {side: str(int(_size(root, side, name))) for side in ("rasterXSize", "rasterYSize")}
    clean = Element("VRTDataset", size)
    for part in root:
        if part.tag in _KEPT:
            clean.append(part)
        elif part.tag == "VRTRasterBand":
            if part.findtext("ColorInterp", "") != "Alpha":  # the pieces' own masks and their outlines say the same
                _band(part, clean, source, name, reader, window, depth)
        elif part.tag not in _DROPPED:
            raise RasterError(f"{name}: is a VRT with a part that no mosaic has ({part.tag}); {_TRANSLATE}")
        if part.tag == "MaskBand" and any(not band.startswith("mask") for band in _source_bands(part)):
            raise RasterError(f"{name}: is a VRT whose mask is a band of its own; {_TRANSLATE}")
        if part.tag == "Metadata" and part.get("domain") is None and part.get("format") is None:
            clean.append(part)
    return clean


def _source_bands(mask: Element) -> list[str]:
    return [band.text or "" for band in mask.iter("SourceBand")]


def _band(band: Element, clean: Element, source: str, name: str, reader: _Reader, window: Window, depth: int) -> None:
    """Add a band whose cells are missing (NaN where the VRT declares no marker) until a source paints them."""
    kind = band.get("subClass")
    if kind not in (None, "VRTSourcedRasterBand"):
        raise RasterError(f"{name}: is a VRT with a band that is computed or raw bytes ({kind}); {_TRANSLATE}")
    declared = band.get("dataType", "Byte")
    made = SubElement(clean, "VRTRasterBand", dataType=declared if declared.startswith("C") else "Float64")
    made.set("band", str(len(clean.findall("VRTRasterBand"))))
    SubElement(made, "NoDataValue").text = band.findtext("NoDataValue", "nan")
    for part in band:
        if part.tag in ("SimpleSource", "ComplexSource"):
            _source(part, made, source, name, reader, window, depth)
        elif part.tag in _BAND_KEPT:
            if part.tag != "NoDataValue":
                made.append(part)
        elif part.tag not in _BAND_DROPPED:
            raise RasterError(f"{name}: is a VRT that filters or computes its cells ({part.tag}); {_TRANSLATE}")


def _source(part: Element, band: Element, source: str, name: str, reader: _Reader, window: Window, depth: int) -> None:
    """Add a source that paints where it has data."""
    for each in part:
        if each.tag not in _SOURCE_KEPT | _SOURCE_DROPPED | {"SourceFilename", "SourceBand"} and (
            each.tag != "OpenOptions" or len(each)
        ):
            raise RasterError(f"{name}: is a VRT that recodes its cells ({each.tag}); {_TRANSLATE}")
    number = part.findtext("SourceBand", "1").strip()
    if not number.isdigit():
        raise RasterError(f"{name}: is a VRT that takes a mask for heights (SourceBand {number}); {_TRANSLATE}")
    filled = _filled(part, name, window) if depth == 1 else window
    real = _resolved(part.find("SourceFilename"), source, name, reader)
    if real is None:
        return
    made = SubElement(band, "ComplexSource")
    if (resampling := part.get("resampling", "").lower()) in _RESAMPLING:
        made.set("resampling", resampling)
    filename = SubElement(made, "SourceFilename", relativeToVRT="0", shared="0")
    SubElement(made, "SourceBand").text = number
    for each in part:
        if each.tag in _SOURCE_KEPT:
            made.append(each)
    marker = part.findtext("NODATA")
    if marker is None:  # GDAL follows the one or the other
        SubElement(made, "UseMaskBand").text = "true"
    if float(part.findtext("ScaleRatio", "1") or 1) == 0.0:
        raise RasterError(f"{name}: is a VRT that multiplies its cells by 0; {_TRANSLATE}")
    filename.text = real
    reader.pieces.append(Piece(real, filled, None if marker is None else _number(marker, f"{name}: NODATA")))
    # only what is called so is looked into now, for a mosaic may have thousands; another VRT is refused when it is read
    if real.lower().endswith(".vrt") and is_virtual(read_bytes(real, 4096)):
        inside = f"{name}: {printable(real)}"
        filename.text = ElementTree.tostring(
            _rewritten(_parse(real, inside), real, inside, reader, filled, depth + 1), encoding="unicode"
        )


def _filled(part: Element, name: str, window: Window) -> Window:
    """Window of the whole that a source fills; all of it where it does not say."""
    place = part.find("DstRect")
    if place is None:
        return window
    left, top, wide, high = (_size(place, side, name) for side in ("xOff", "yOff", "xSize", "ySize"))
    return math.floor(top), math.ceil(top + high), math.floor(left), math.ceil(left + wide)


def _resolved(filename: Element | None, source: str, name: str, reader: _Reader) -> str | None:
    """Find what GDAL opens for a source; None for a file that is not there.

    Raises
    ------
    RasterError
        For the network, unless that is allowed, and for all that is no regular file.
    """
    text = "" if filename is None else (filename.text or "").strip()
    shown = printable(text[:200])
    if _OVER_NETWORK.search(text):
        if not reader.allow_network:
            raise RasterError(
                f"{name}: names {shown}, which is read over the network; get that file and name it, or set "
                "terrain.allow_network = true in the hop file"
            )
        reader.remote.append(text)
        return f"/vsicurl/{text}" if "://" in text and not text.startswith("/vsi") else text
    plain = re.sub(r"^(/vsi(zip|gzip|tar)/)+", "", text)
    if not text or text.startswith("<") or "/vsi" in plain:
        raise RasterError(
            f"{name}: names {shown or 'nothing'} as a source, which is no file on this disk; {_TRANSLATE}"
        )
    relative = filename is not None and filename.get("relativeToVRT") == "1" and not plain.startswith("/")
    folder = source.rpartition("/")[0] if relative else str(Path.cwd())
    full = text if plain.startswith("/") else f"{folder}/{text}"
    path = on_disk(full)
    if path is None:
        if Path(plain if plain.startswith("/") else full).exists():
            raise RasterError(f"{name}: names {shown} as a source, which is no regular file; {_TRANSLATE}")
        if ":" in text.rpartition("/")[2]:
            raise RasterError(f"{name}: names {shown} as a source, which is no file on this disk; {_TRANSLATE}")
        reader.absent.append(text)
        return None
    return full


def _warped(root: Element, source: str, name: str, reader: _Reader, window: Window) -> Element:
    """Take a warped VRT as it is, where it starts from missing cells and warps one raster on this disk."""
    if any(band.find("NoDataValue") is None for band in root.findall("VRTRasterBand")) or not any(
        option.get("name") == "INIT_DEST" and (option.text or "").strip() == "NO_DATA" for option in root.iter("Option")
    ):
        raise RasterError(
            f"{name}: is a warped VRT that does not say which of its cells are missing; warp with -dstnodata, or "
            "make a GeoTIFF by gdalwarp -dstnodata"
        )
    options = root.find("GDALWarpOptions")
    if options is None or any(part.tag not in _WARP_TAGS for part in options.iter()):
        other = "nothing" if options is None else next(p.tag for p in options.iter() if p.tag not in _WARP_TAGS)
        raise RasterError(f"{name}: is a warped VRT with more than a change of projection ({other}); {_TRANSLATE}")
    for option in options.iter("Option"):
        if (option.get("name") or "").upper().startswith(("CUTLINE", "RPC", "COORDINATE")):
            raise RasterError(f"{name}: is a warped VRT with more than a change of projection; {_TRANSLATE}")
    clean = Element("VRTDataset", root.attrib)
    clean.extend(part for part in root if part.tag in _KEPT | {"BlockXSize", "BlockYSize", "GDALWarpOptions"})
    for band in root.findall("VRTRasterBand"):
        made = SubElement(clean, "VRTRasterBand", band.attrib)
        made.extend(part for part in band if part.tag in _BAND_KEPT)
    filename = options.find("SourceDataset")
    real = _resolved(filename, source, name, reader)
    if real is None or filename is None:
        raise RasterError(f"{name}: warps a file that is not there; get it, or leave the VRT out")
    if is_virtual(read_bytes(real, 4096)):
        raise RasterError(f"{name}: warps another VRT; {_TRANSLATE}")
    filename.text = real
    filename.set("relativeToVRT", "0")
    reader.pieces.append(Piece(real, window))
    return clean


def _size(part: Element, side: str, name: str) -> float:
    value = _number(part.get(side), f"{name}: {side}")
    if not abs(value) < 1e9:
        raise RasterError(f"{name}: {side} = {value:g}: must be under 1e9 in a VRT; get it again")
    return value


def _number(text: str | None, what: str) -> float:
    try:
        value = float(text or "")
    except ValueError:
        value = math.nan
    if math.isinf(value) or (math.isnan(value) and (text or "").strip().lower() != "nan"):
        raise RasterError(f"{what} = {printable((text or 'nothing')[:40])}: must be a number in a VRT; get it again")
    return value
