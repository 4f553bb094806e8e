"""Odd, damaged and lying rasters made by code, each over the same country, and the hop that crosses it.

The country is a plain at 100 m with a wall of 700 m across its middle. A hop over the plain passes; over the wall it
does not. A lying raster hides the wall: whoever reads its absent cells as ground lets the hop pass, and that is the
one outcome which none may have. ``KINDS`` maps a name to its maker, which takes an empty folder and returns the path to
give as terrain; ``EXPECTED`` maps it to words of the one line that must come (empty: the wall is seen, exit code 1).

``mutated`` damages one of them at random, for scripts that try many.
"""

from __future__ import annotations

import gzip
import json
import os
import random
import shutil
import socket
import zipfile
from collections.abc import Callable
from pathlib import Path

import numpy as np
import rasterio
from rasterio.transform import Affine

ROWS, COLS, CELL = 24, 60, 0.003
GRID = Affine(CELL, 0, 10, 0, -CELL, 50)
WALL = slice(28, 32)
WGS84 = 'GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563]],UNIT["degree",0.0174532925199433]]'

KINDS: dict[str, Callable[[Path], Path]] = {}
EXPECTED: dict[str, str] = {}


def odd(expected: str) -> Callable[[Callable[[Path], Path]], Callable[[Path], Path]]:
    """Enter a maker under its name, with words of the line that is expected of it."""

    def enter(make: Callable[[Path], Path]) -> Callable[[Path], Path]:
        KINDS[make.__name__] = make
        EXPECTED[make.__name__] = expected
        return make

    return enter


def country(dtype: str = "int16") -> np.ndarray:
    """Heights of the country, the wall with them."""
    heights = np.full((ROWS, COLS), 100, dtype)
    heights[:, WALL] = 700
    return heights


def hidden(value: float, dtype: str = "int16") -> np.ndarray:
    """Heights of the country with something else where the wall is."""
    heights = country(dtype)
    heights[:, WALL] = value
    return heights


def write(path: Path, heights: np.ndarray, *, grid: Affine = GRID, crs: str | None = "EPSG:4326", **options) -> Path:
    """Write a raster of one band or several, by rasterio's options; ``driver`` is GeoTIFF unless given."""
    bands = heights if heights.ndim == 3 else heights[None]
    shape = {"count": bands.shape[0], "height": bands.shape[1], "width": bands.shape[2], "dtype": bands.dtype}
    with rasterio.open(path, "w", **{"driver": "GTiff", "crs": crs, "transform": grid, **shape, **options}) as raster:
        raster.write(bands)
    return path


def write_hop(folder: Path, terrain: Path, *more: str) -> Path:
    """Write the hop file that crosses the country from west to east, 11 km, with further lines for its [terrain]."""
    lines = [
        'name = "over the plain"', "frequency_ghz = 7.4",
        "[site_a]", 'name = "west"', 'position = "49.964, 10.011"', "antenna_m = 60",
        "[site_b]", 'name = "east"', 'position = "49.9641, 10.166"', "antenna_m = 65",
        "[terrain]", f"paths = [{json.dumps(str(terrain))}]", *more,
        "[rules]", "rule = [{ k = 1.0, fresnel_fraction = 0.6, margin_m = 3.0 }]",
    ]  # fmt: skip
    path = folder / "hop.toml"
    path.write_text("\n".join(lines) + "\n")
    return path


def mutated(kind: str, folder: Path, seed: int) -> Path:
    """Make one kind and damage the first regular file of it at random: cut, overwritten, doubled, zeroed."""
    path, dice = KINDS[kind](folder), random.Random(seed)
    files = sorted(each for each in folder.rglob("*") if each.is_file() and not each.is_symlink())
    if not files:
        return path
    target = dice.choice(files)
    data = bytearray(target.read_bytes())
    for _ in range(dice.randint(1, 8)):
        if not data:
            break
        at = dice.randrange(len(data))
        how = dice.randrange(5)
        if how == 0:
            del data[at:]
        elif how == 1:
            data[at] = dice.randrange(256)
        elif how == 2:
            data[at : at + dice.randrange(64)] = bytes(dice.randrange(64))
        elif how == 3:
            data[at:at] = data[max(0, at - 32) : at] * dice.randrange(1, 4)
        else:
            data[at : at + 8] = dice.choice([b"999999999", b"-1", b"nan", b"\xff" * 8, b"\x00" * 8, b"NA ", b"\x1b[2J"])
    target.write_bytes(bytes(data))
    return path


# ---- rasters that are as they should be


@odd("")
def plain(folder: Path) -> Path:
    return write(folder / "a.tif", country())


@odd("")
def cloud_optimized(folder: Path) -> Path:
    return write(folder / "a.tif", country(), driver="COG")


@odd("")
def one_strip(folder: Path) -> Path:
    return write(folder / "a.tif", country(), blockysize=ROWS, compress="deflate")


@odd("")
def feet_by_scale(folder: Path) -> Path:
    path = write(folder / "a.tif", (country() * 10).astype("int16"))
    with rasterio.open(path, "r+") as raster:
        raster.scales = [0.1]
    return path


@odd("")
def text_grid(folder: Path) -> Path:
    return ascii_grid(folder, [" ".join(map(str, row)) for row in country()])


@odd("")
def text_grid_with_decimals_below(folder: Path) -> Path:
    """Whole numbers first: GDAL would take the rest for whole numbers too."""
    rows = [" ".join(map(str, row)) for row in country()]
    return ascii_grid(folder, [*rows[:-1], rows[-1].replace("700", "700.5")])


@odd("")
def zipped(folder: Path) -> Path:
    write(folder / "a.tif", country())
    with zipfile.ZipFile(folder / "a.zip", "w") as archive:
        archive.write(folder / "a.tif", "deep/a.tif")
    return folder / "a.zip"


@odd("")
def gzipped(folder: Path) -> Path:
    path = write(folder / "a.tif", country())
    (folder / "a.tif.gz").write_bytes(gzip.compress(path.read_bytes()))
    return folder / "a.tif.gz"


@odd("")
def name_with_colors(folder: Path) -> Path:
    write(folder / "\x1b[31mred\n.tif", country())
    return folder


# ---- absent cells


@odd("no ground height")
def sparse(folder: Path) -> Path:
    return write_sparse(folder / "a.tif")


@odd("no ground height")
def sparse_with_nodata(folder: Path) -> Path:
    return write_sparse(folder / "a.tif", nodata=-1)


@odd("no ground height")
def sparse_compressed(folder: Path) -> Path:
    return write_sparse(folder / "a.tif", compress="deflate", predictor=2)


def write_sparse(path: Path, **options) -> Path:
    """Write blocks of 16 cells, but not those under the wall."""
    shape = {"height": 32, "width": 64, "count": 1, "dtype": "int16", "crs": "EPSG:4326", "transform": GRID}
    tiles = {"tiled": True, "blockxsize": 16, "blockysize": 16, "sparse_ok": True}
    with rasterio.open(path, "w", driver="GTiff", **shape, **tiles, **options) as raster:
        for x in (0, 48):
            raster.write(np.full((32, 16), 100, "int16"), 1, window=((0, 32), (x, x + 16)))
    return path


@odd("no ground height")
def sparse_imagine(folder: Path) -> Path:
    shape = {"height": 128, "width": 256, "count": 1, "dtype": "int16", "crs": "EPSG:4326"}
    grid = Affine(CELL / 4, 0, 10, 0, -CELL / 4, 50)
    with rasterio.open(folder / "a.img", "w", driver="HFA", transform=grid, **shape) as raster:
        for x in (0, 192):
            raster.write(np.full((128, 64), 100, "int16"), 1, window=((0, 128), (x, x + 64)))
    return folder / "a.img"


@odd("no ground height")
def not_a_number(folder: Path) -> Path:
    return write(folder / "a.tif", hidden(np.nan, "float32"))


@odd("no ground height")
def not_a_number_declared(folder: Path) -> Path:
    return write(folder / "a.tif", hidden(np.nan, "float32"), nodata=np.nan)


@odd("no ground height")
def infinite(folder: Path) -> Path:
    return write(folder / "a.tif", hidden(-np.inf, "float32"))


@odd("no ground height")
def marker_undeclared(folder: Path) -> Path:
    return write(folder / "a.tif", hidden(-32768))


@odd("no ground height")
def marker_of_another_type(folder: Path) -> Path:
    return with_marker(write(folder / "a.tif", hidden(0, "uint16")), "-9999")


def with_marker(path: Path, marker: str) -> Path:
    """Declare a marker beside the raster, whatever its type."""
    path.with_name(path.name + ".aux.xml").write_text(
        f'<PAMDataset><PAMRasterBand band="1"><NoDataValue>{marker}</NoDataValue></PAMRasterBand></PAMDataset>'
    )
    return path


@odd("no ground height")
def marker_zero(folder: Path) -> Path:
    return write(folder / "a.tif", hidden(0), nodata=0)


@odd("no ground height")
def mask_inside(folder: Path) -> Path:
    return masked(folder, "YES")


@odd("no ground height")
def mask_beside(folder: Path) -> Path:
    return masked(folder, "NO")


def masked(folder: Path, inside: str) -> Path:
    path = write(folder / "a.tif", hidden(100))
    with rasterio.Env(GDAL_TIFF_INTERNAL_MASK=inside), rasterio.open(path, "r+") as raster:
        raster.write_mask(hidden(0) != 0)
    return path


@odd("no ground height")
def alpha_band(folder: Path) -> Path:
    return write(folder / "a.tif", np.stack([hidden(100), (hidden(0) != 0) * np.int16(255)]), alpha="yes")


@odd("")
def alpha_band_that_hides_nothing(folder: Path) -> Path:
    return write(folder / "a.tif", np.stack([country(), np.full_like(country(), 255)]), alpha="yes", nodata=-9999)


@odd("no ground height")
def alpha_band_beside_a_marker(folder: Path) -> Path:
    bands = np.stack([hidden(100), (hidden(0) != 0) * np.int16(255)])
    return write(folder / "a.tif", bands, alpha="yes", nodata=-9999)


@odd("no ground height")
def all_void(folder: Path) -> Path:
    return write(folder / "a.tif", np.full((ROWS, COLS), -9999, "int16"), nodata=-9999)


@odd("declares a scale of 0")
def scale_of_nothing(folder: Path) -> Path:
    path = write(folder / "a.tif", country())
    with rasterio.open(path, "r+") as raster:
        raster.scales, raster.offsets = [0.0], [100.0]
    return path


@odd("declares a scale of nan")
def scale_that_is_none(folder: Path) -> Path:
    path = write(folder / "a.tif", country())
    with rasterio.open(path, "r+") as raster:
        raster.scales = [float("nan")]
    return path


# ---- text grids


def ascii_grid(folder: Path, rows: list[str], header: str = "") -> Path:
    head = header or f"ncols {COLS}\nnrows {ROWS}\nxllcorner 10\nyllcorner {50 - ROWS * CELL}\ncellsize {CELL}\n"
    (folder / "a.prj").write_text(WGS84)
    (folder / "a.asc").write_text(head + "\n".join(rows) + "\n")
    return folder / "a.asc"


def grid_with(word: str) -> Callable[[Path], Path]:
    return lambda folder: ascii_grid(
        folder, [" ".join(map(str, row)).replace("700", word) for row in country().tolist()]
    )


for _name, _word in {
    "na": "NA",
    "star": "*",
    "dash": "-",
    "null": "null",
    "dot": ".",
    "hash": "#N/A",
    "dashes": "--",
}.items():
    KINDS[f"text_grid_{_name}"], EXPECTED[f"text_grid_{_name}"] = grid_with(_word), f"holds {_word} as height number"
KINDS["text_grid_nan"], EXPECTED["text_grid_nan"] = grid_with("nan"), "no ground height"
KINDS["text_grid_fused"], EXPECTED["text_grid_fused"] = grid_with("70-0"), "holds 70-0 as height number"
KINDS["text_grid_left_out"], EXPECTED["text_grid_left_out"] = grid_with(""), "heights where its header promises"


@odd("heights where its header promises")
def text_grid_cut(folder: Path) -> Path:
    path = text_grid(folder)
    path.write_bytes(path.read_bytes()[: path.stat().st_size // 2])
    return path


@odd("heights where its header promises")
def text_grid_longer(folder: Path) -> Path:
    return ascii_grid(folder, [" ".join(map(str, row)) for row in [*country(), *country()]])


@odd("not readable as a raster")
def text_grid_of_billions(folder: Path) -> Path:
    return ascii_grid(
        folder, ["1 2 3"], "ncols 4000000000\nnrows 4000000000\nxllcorner 10\nyllcorner 49\ncellsize 0.1\n"
    )


@odd("heights where its header promises")
def text_grid_promises_much(folder: Path) -> Path:
    """Repeat what held GDAL for minutes and 8 GB: a header of 30 000 by 30 000 and a few numbers."""
    return ascii_grid(
        folder, ["100 100 100"], "ncols 30000\nnrows 30000\nxllcorner 10\nyllcorner 49.9\ncellsize 0.00001\n"
    )


# ---- files cut short


@odd("")
def radar_tile(folder: Path) -> Path:
    """Put the country within a whole degree of .hgt, 1201 posts each way, big-endian."""
    heights = np.full((1201, 1201), 100, ">i2")
    heights[:, 96:110] = 700
    (folder / "N49E010.hgt").write_bytes(heights.tobytes())
    return folder / "N49E010.hgt"


@odd("not readable as a raster")
def radar_tile_cut(folder: Path) -> Path:
    path = radar_tile(folder)
    path.write_bytes(path.read_bytes()[:1_000_000])
    return path


@odd("no ground height")
def radar_tile_of_markers(folder: Path) -> Path:
    path = radar_tile(folder)
    path.write_bytes(np.where(np.frombuffer(path.read_bytes(), ">i2") == 700, -32768, 100).astype(">i2").tobytes())
    return path


@odd("bytes of cells do not fit")
def flat_binary_cut(folder: Path) -> Path:
    path = write(folder / "a.bil", country(), driver="EHdr")
    path.write_bytes(path.read_bytes()[: path.stat().st_size // 2])
    return path


@odd("bytes of cells do not fit")
def elevation_posts_cut(folder: Path) -> Path:
    from rasterio.shutil import copy

    post = 1 / 120
    heights = np.full((121, 121), 100, "int16")
    write(folder / "whole.tif", heights, grid=Affine(post, 0, 10 - post / 2, 0, -post, 50 + post / 2))
    copy(folder / "whole.tif", folder / "n49.dt0", driver="DTED")
    path = folder / "n49.dt0"
    path.write_bytes(path.read_bytes()[: path.stat().st_size // 2])
    return path


def cut(make: Callable[[Path], Path], share: float) -> Callable[[Path], Path]:
    def made(folder: Path) -> Path:
        path = make(folder)
        path.write_bytes(path.read_bytes()[: int(path.stat().st_size * share)])
        return path

    return made


def large(folder: Path, **options) -> Path:
    heights = np.random.default_rng(0).integers(90, 110, (480, 1200)).astype("int16")
    heights[:, 560:640] = 700
    grid = Affine(CELL / 20, 0, 10, 0, -CELL / 20, 50)
    return write(folder / "a.tif", heights, grid=grid, **options)


for _name, _options in {
    "strips": {},
    "deflated": {"compress": "deflate"},
    "lzw": {"compress": "lzw", "predictor": 2},
    "tiles": {"tiled": True, "blockxsize": 128, "blockysize": 128},
    "one_strip": {"blockysize": 480},
    "one_strip_deflated": {"blockysize": 480, "compress": "deflate"},
}.items():
    for _share in (0.3, 0.7):
        _kind = f"cut_{_name}_{_share:.0%}"
        KINDS[_kind] = cut(lambda folder, options=_options: large(folder, **options), _share)
        EXPECTED[_kind] = "a.tif: "
KINDS["cut_zipped"], EXPECTED["cut_zipped"] = cut(zipped, 0.6), "not readable as a raster"
KINDS["cut_gzipped"], EXPECTED["cut_gzipped"] = cut(gzipped, 0.6), "a.tif.gz: "


# ---- mosaics


def piece(source: str, first: int, wide: int, *, kind: str = "SimpleSource", inner: str = "", relative: int = 1) -> str:
    """Write a source of a VRT that fills `wide` columns from column `first` on."""
    return (
        f'<{kind}><SourceFilename relativeToVRT="{relative}">{source}</SourceFilename><SourceBand>1</SourceBand>'
        f'<SrcRect xOff="0" yOff="0" xSize="28" ySize="{ROWS}"/>'
        f'<DstRect xOff="{first}" yOff="0" xSize="{wide}" ySize="{ROWS}"/>{inner}</{kind}>'
    )


def mosaic(folder: Path, body: str, *, name: str = "m.vrt", band: str = "", head: str = "", top: str = "") -> Path:
    """Write a VRT over the country, with halves of the plain beside it to name as `half.tif`."""
    half = folder / "half.tif"
    if not half.exists():
        write(half, np.full((ROWS, 28), 100, "int16"))
    path = folder / name
    path.write_text(
        f'{top}<VRTDataset rasterXSize="{COLS}" rasterYSize="{ROWS}"{head}><SRS>EPSG:4326</SRS>'
        f"<GeoTransform>10, {CELL}, 0, 50, 0, -{CELL}</GeoTransform>"
        f'<VRTRasterBand dataType="Int16" band="1"{band}>{body}</VRTRasterBand></VRTDataset>'
    )
    return path


HALVES = piece("half.tif", 0, 28) + piece("half.tif", 32, 28)


@odd("")
def mosaic_of_all(folder: Path) -> Path:
    write(folder / "wall.tif", np.full((ROWS, 28), 700, "int16"))
    return mosaic(folder, HALVES + piece("wall.tif", 28, 4))


@odd("no ground height")
def mosaic_with_a_gap(folder: Path) -> Path:
    return mosaic(folder, HALVES)


@odd("no ground height")
def mosaic_with_a_gap_in_a_zip(folder: Path) -> Path:
    mosaic(folder, HALVES)
    with zipfile.ZipFile(folder / "m.zip", "w") as archive:
        for name in ("m.vrt", "half.tif"):
            archive.write(folder / name, f"deep/{name}")
    (folder / "half.tif").unlink()
    (folder / "only").mkdir()
    shutil.move(folder / "m.zip", folder / "only" / "m.zip")
    with zipfile.ZipFile(folder / "only" / "m.zip") as archive:
        assert archive.testzip() is None
    return zip_without(folder / "only" / "m.zip", "half.tif")


def zip_without(path: Path, name: str) -> Path:
    """Take the halves out of the list of rasters by another ending, so that only the mosaic answers."""
    with zipfile.ZipFile(path) as archive:
        held = {each: archive.read(each) for each in archive.namelist()}
    with zipfile.ZipFile(path, "w") as archive:
        for each, data in held.items():
            archive.writestr(each.replace(name, "half.piece"), data.replace(name.encode(), b"half.piece"))
    return path


@odd("no ground height")
def mosaic_of_mosaics_with_a_gap(folder: Path) -> Path:
    mosaic(folder, HALVES, name="inner.vrt")
    whole = f'<SrcRect xOff="0" yOff="0" xSize="{COLS}" ySize="{ROWS}"/>'
    outer = piece("inner.vrt", 0, COLS).replace(f'<SrcRect xOff="0" yOff="0" xSize="28" ySize="{ROWS}"/>', whole)
    return mosaic(folder, outer)


@odd("no ground height")
def mosaic_resampled_with_a_gap(folder: Path) -> Path:
    body = piece("half.tif", 0, 27) + piece("half.tif", 33, 27)
    return mosaic(folder, body.replace("<SimpleSource>", '<SimpleSource resampling="bilinear">'))


@odd("no ground height")
def mosaic_of_unmarked_voids(folder: Path) -> Path:
    """Let a piece declare 0 as missing; the mosaic, that knows nothing of it, would hand on the 0."""
    write(folder / "wall.tif", np.zeros((ROWS, 28), "int16"), nodata=0)
    return mosaic(folder, HALVES + piece("wall.tif", 28, 4))


@odd("says itself which cells are missing")
def mosaic_of_two_markers(folder: Path) -> Path:
    write(folder / "wall.tif", np.zeros((ROWS, 28), "int16"), nodata=0)
    return mosaic(folder, HALVES + piece("wall.tif", 28, 4, kind="ComplexSource", inner="<NODATA>-1</NODATA>"))


@odd("no ground height")
def mosaic_of_a_piece_that_is_not_there(folder: Path) -> Path:
    return mosaic(folder, HALVES + piece("wall.tif", 28, 4))


@odd("blocks that were never written")
def mosaic_of_a_sparse_piece(folder: Path) -> Path:
    write_sparse(folder / "sparse.tif")
    return mosaic(folder, piece("sparse.tif", 0, COLS).replace('xSize="28"', 'xSize="60"'))


@odd("heights where its header promises")
def mosaic_of_a_cut_piece(folder: Path) -> Path:
    text_grid_cut(folder)
    return mosaic(folder, piece("a.asc", 0, COLS).replace('xSize="28"', 'xSize="60"'))


@odd("no regular file")
def mosaic_of_a_pipe(folder: Path) -> Path:
    os.mkfifo(folder / "pipe.tif")
    return mosaic(folder, HALVES + piece("pipe.tif", 28, 4))


@odd("not readable as a raster")
def mosaic_of_passwords(folder: Path) -> Path:
    return mosaic(folder, HALVES + piece("/etc/passwd", 28, 4, relative=0))


@odd("VRT with another ending")
def mosaic_of_a_hidden_mosaic(folder: Path) -> Path:
    mosaic(folder, piece("/etc/passwd", 0, 28), name="wall.tif")
    return mosaic(folder, HALVES + piece("wall.tif", 28, 4))


@odd("inside itself")
def mosaic_of_itself(folder: Path) -> Path:
    return mosaic(folder, HALVES + piece("m.vrt", 28, 4))


NETWORK = {
    "vsicurl": "/vsicurl/http://127.0.0.1:9/a.tif",
    "http": "http://127.0.0.1:9/a.tif",
    "bucket": "/vsis3/bucket/a.tif",
    "zip_far_away": "/vsizip//vsicurl/http://127.0.0.1:9/a.zip/a.tif",
    "stream": "/vsicurl_streaming/http://127.0.0.1:9/a.tif",
    "by_question": "/vsicurl?url=http://127.0.0.1:9/a.tif",
    "map_service": "WMS:http://127.0.0.1:9/?",
    "service_text": "&lt;GDAL_WMS&gt;&lt;Service name='TMS'&gt;&lt;ServerUrl&gt;http://127.0.0.1:9/&lt;/ServerUrl&gt;"
    "&lt;/Service&gt;&lt;/GDAL_WMS&gt;",
}
for _name, _source in NETWORK.items():
    KINDS[f"mosaic_by_{_name}"] = lambda folder, source=_source: mosaic(
        folder, HALVES + piece(source, 28, 4, relative=0)
    )
    EXPECTED[f"mosaic_by_{_name}"] = "over the network"

for _name, _source in {
    "driver_prefix": "NETCDF:/etc/passwd:x",
    "memory": "/vsimem/a.tif",
    "standard_input": "/vsistdin/",
    "text_inside": "&lt;VRTDataset rasterXSize='9' rasterYSize='9'&gt;&lt;/VRTDataset&gt;",
    "nothing": "",
}.items():
    KINDS[f"mosaic_by_{_name}"] = lambda folder, source=_source: mosaic(
        folder, HALVES + piece(source, 28, 4, relative=0)
    )
    EXPECTED[f"mosaic_by_{_name}"] = "which is no file on this disk"


@odd("computed or raw bytes")
def mosaic_of_raw_bytes(folder: Path) -> Path:
    raw = '<SourceFilename relativeToVRT="0">/etc/passwd</SourceFilename><ImageOffset>0</ImageOffset>'
    return mosaic(folder, raw, band=' subClass="VRTRawRasterBand"')


@odd("computed or raw bytes")
def mosaic_by_program(folder: Path) -> Path:
    code = (
        "<PixelFunctionType>f</PixelFunctionType><PixelFunctionLanguage>Python</PixelFunctionLanguage>"
        f"<PixelFunctionCode><![CDATA[open({str(folder / 'ran')!r}, 'w')]]></PixelFunctionCode>"
    )
    path = mosaic(folder, code + HALVES, band=' subClass="VRTDerivedRasterBand"')
    path.write_text(path.read_text().replace("<![CDATA[", "").replace("]]>", ""))
    return path


@odd("filters or computes")
def mosaic_filtered(folder: Path) -> Path:
    return mosaic(folder, HALVES.replace("SimpleSource", "KernelFilteredSource"))


@odd("recodes its cells")
def mosaic_by_table(folder: Path) -> Path:
    return mosaic(folder, piece("half.tif", 0, COLS, kind="ComplexSource", inner="<LUT>0:0,100:9</LUT>"))


@odd("multiplies its cells by 0")
def mosaic_times_nothing(folder: Path) -> Path:
    return mosaic(folder, piece("half.tif", 0, COLS, kind="ComplexSource", inner="<ScaleRatio>0</ScaleRatio>"))


@odd("takes a mask for heights")
def mosaic_of_a_mask(folder: Path) -> Path:
    return mosaic(folder, HALVES.replace("<SourceBand>1", "<SourceBand>mask,1"))


@odd("computes its cells (VRTPansharpenedDataset)")
def mosaic_sharpened(folder: Path) -> Path:
    return mosaic(folder, HALVES, head=' subClass="VRTPansharpenedDataset"')


@odd("does not say which of its cells are missing")
def mosaic_warped_without_marker(folder: Path) -> Path:
    return mosaic(folder, "", head=' subClass="VRTWarpedDataset"', band=' subClass="VRTWarpedRasterBand"')


@odd("document type or entities")
def mosaic_with_entities(folder: Path) -> Path:
    return mosaic(folder, HALVES, top='<!DOCTYPE a [<!ENTITY b "c">]>')


@odd("is a damaged VRT")
def mosaic_cut(folder: Path) -> Path:
    return cut(lambda inner: mosaic(inner, HALVES), 0.7)(folder)


@odd("must be under 1e9")
def mosaic_of_billions(folder: Path) -> Path:
    path = mosaic(folder, HALVES)
    path.write_text(path.read_text().replace('rasterXSize="60"', 'rasterXSize="1e12"'))
    return path


# ---- what is no raster


@odd("is a pipe")
def pipe(folder: Path) -> Path:
    os.mkfifo(folder / "a.tif")
    return folder / "a.tif"


@odd("is a pipe")
def pipe_in_a_folder(folder: Path) -> Path:
    os.mkfifo(folder / "a.tif")
    return folder


@odd("is a device")
def device(folder: Path) -> Path:
    (folder / "a.tif").symlink_to("/dev/zero")
    return folder / "a.tif"


@odd("is a socket")
def a_socket(folder: Path) -> Path:
    here = Path.cwd()
    os.chdir(folder)  # the path of a socket may have 107 bytes
    try:
        with socket.socket(socket.AF_UNIX) as made:
            made.bind("a.tif")
    finally:
        os.chdir(here)
    return folder / "a.tif"


@odd("that is there")
def broken_link(folder: Path) -> Path:
    (folder / "a.tif").symlink_to(folder / "nowhere")
    return folder / "a.tif"


@odd("that is there")
def loop_of_links(folder: Path) -> Path:
    (folder / "a.tif").symlink_to(folder / "a.tif")
    return folder / "a.tif"


@odd("holds no raster")
def folder_called_raster(folder: Path) -> Path:
    (folder / "a.tif").mkdir()
    return folder / "a.tif"


@odd("link to a folder, not followed")
def linked_folder(folder: Path) -> Path:
    (folder / "real").mkdir()
    write(folder / "real" / "a.tif", country())
    (folder / "given").mkdir()
    (folder / "given" / "link").symlink_to(folder / "real")
    return folder / "given"


@odd("not readable as a raster")
def empty(folder: Path) -> Path:
    (folder / "a.tif").write_bytes(b"")
    return folder / "a.tif"


@odd("not readable as a raster")
def noise(folder: Path) -> Path:
    (folder / "a.tif").write_bytes(random.Random(1).randbytes(5000))
    return folder / "a.tif"


@odd("not readable as a raster")
def service_description(folder: Path) -> Path:
    (folder / "a.tif").write_text(
        '<GDAL_WMS><Service name="TMS"><ServerUrl>http://127.0.0.1:9/${z}</ServerUrl></Service></GDAL_WMS>'
    )
    return folder / "a.tif"


@odd("beside it names other files")
def overviews_that_are_a_mosaic(folder: Path) -> Path:
    mosaic(folder, piece("/vsicurl/http://127.0.0.1:9/a.tif", 0, 28, relative=0), name="a.tif.ovr")
    return plain(folder)


@odd("beside it names other files")
def mask_that_is_a_mosaic(folder: Path) -> Path:
    mosaic(folder, piece("/vsicurl/http://127.0.0.1:9/a.tif", 0, 28, relative=0), name="a.tif.msk")
    return plain(folder)


@odd("beside it names other files")
def metadata_that_points_elsewhere(folder: Path) -> Path:
    (folder / "a.tif.aux.xml").write_text(
        '<PAMDataset><Metadata domain="OVERVIEWS"><MDI key="OVERVIEW_FILE">/vsicurl/http://127.0.0.1:9/a.ovr</MDI>'
        "</Metadata></PAMDataset>"
    )
    return plain(folder)


@odd("over the network")
def mosaic_by_network_in_a_zip(folder: Path) -> Path:
    mosaic(folder, piece("/vsicurl/http://127.0.0.1:9/a.tif", 0, 28, relative=0))
    with zipfile.ZipFile(folder / "a.zip", "w") as archive:
        archive.write(folder / "m.vrt", "m.vrt")
    return folder / "a.zip"


@odd("holds no raster")
def zip_of_nothing(folder: Path) -> Path:
    with zipfile.ZipFile(folder / "a.zip", "w") as archive:
        archive.writestr("readme.txt", "nothing")
    return folder / "a.zip"


@odd("not readable as a raster")
def zip_with_forged_names(folder: Path) -> Path:
    with zipfile.ZipFile(folder / "a.zip", "w") as archive:
        archive.writestr("../../\x1b[2J\nhopwright: PASSES\n.tif", b"nothing")
    return folder / "a.zip"


@odd("holds 8-bit cells")
def eight_bit(folder: Path) -> Path:
    return write(folder / "a.tif", country().clip(0, 255).astype("uint8"))


@odd("is a photo")
def photo(folder: Path) -> Path:
    return write(folder / "a.tif", np.zeros((3, ROWS, COLS), "uint8"), photometric="RGB")


@odd("not real numbers")
def complex_numbers(folder: Path) -> Path:
    return write(folder / "a.tif", country("complex64"))


@odd("has 2 bands")
def two_bands(folder: Path) -> Path:
    return write(folder / "a.tif", np.stack([country(), country()]))


@odd("has no coordinate reference system")
def nowhere(folder: Path) -> Path:
    return write(folder / "a.tif", country(), crs=None)


@odd("where ground lies between")
def above_the_sky(folder: Path) -> Path:
    return write(folder / "a.tif", hidden(30000))
