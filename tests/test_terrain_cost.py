"""What reading costs: only the blocks near the path, each once; few open files; memory apart from the mosaic's size."""

import subprocess
import sys

import numpy as np
import pytest
from rasterio.transform import Affine

from profiler.terrain import open_terrain

ARCSEC = 1 / 3600


@pytest.fixture
def tile(write_raster):
    """One degree at 1″, 3600 × 3600, in blocks of 128 × 128 (29 × 29 = 841 of them)."""
    x = np.arange(3600, dtype="int16")
    heights = (1000 + x[:, None] % 500 + x[None, :] % 300).astype("int16")
    grid = Affine(ARCSEC, 0, 10, 0, -ARCSEC, 51)
    return write_raster("t.tif", heights, grid, tiled=True, blockxsize=128, blockysize=128, compress="deflate")


@pytest.fixture
def reads(monkeypatch):
    """Every window that is asked of GDAL."""
    import profiler.terrain.reading as reading

    windows, read = [], reading.read_window

    def watched(dataset, band, rows, cols, **rest):
        windows.append((dataset.name, rows, cols))
        return read(dataset, band, rows, cols, **rest)

    monkeypatch.setattr(reading, "read_window", watched)
    return windows


def blocks_of(windows, side=128):
    return [
        (name, row, col)
        for name, rows, cols in windows
        for row in range(rows[0] // side, (rows[1] - 1) // side + 1)
        for col in range(cols[0] // side, (cols[1] - 1) // side + 1)
    ]


@pytest.mark.parametrize(
    ("start", "end", "most"),
    [
        ((10.001, 50.5), (10.999, 50.52), 0.05),
        ((10.4, 50.001), (10.42, 50.999), 0.05),
        ((10.001, 50.001), (10.999, 50.999), 0.08),
    ],
)
def test_a_path_across_a_tile_reads_a_few_per_cent(tile, reads, start, end, most):
    lon, lat = np.linspace(start[0], end[0], 5000), np.linspace(start[1], end[1], 5000)
    with open_terrain(tile) as terrain:
        use = terrain.sample(lon, lat).sources[0]
    blocks = blocks_of(reads)
    assert len(set(blocks)) == len(blocks) == use.blocks_read  # each once
    col, row = (lon - 10) / ARCSEC - 0.5, (51 - lat) / ARCSEC - 0.5
    needed = {
        ("", int(r) // 128, int(c) // 128)
        for dr in (0, 1)
        for dc in (0, 1)
        for r, c in zip(np.floor(row) + dr, np.floor(col) + dc, strict=True)
    }
    assert {block[1:] for block in blocks} == {block[1:] for block in needed}  # the floor: no block less would do
    assert use.read_share < most


def test_cost_does_not_depend_on_the_number_of_points(tile, reads):
    with open_terrain(tile) as terrain:
        few, many = (
            terrain.sample(np.linspace(10.1, 10.9, n), np.linspace(50.3, 50.31, n)).sources[0] for n in (2500, 50_000)
        )
    assert few.blocks_read == many.blocks_read == 24  # columns 360 to 3240 in one row of blocks of 128


def test_thousands_of_tiles_keep_few_files_open(write_raster, monkeypatch):
    import profiler.terrain.gdal as gdal

    monkeypatch.setattr(gdal, "_HANDLES", 4)
    flat = np.full((10, 10), 7, "int16")
    folder = None
    for i in range(12):
        folder = write_raster(f"m/{i:02}.tif", flat, Affine(0.1, 0, 10 + i, 0, -0.1, 50)).parent
    with open_terrain(folder) as terrain:
        found = terrain.sample(np.linspace(10, 22, 1000), np.full(1000, 49.5))
        assert (found.ground_m == 7).all()
        assert len(found.sources) == 12
        assert len(terrain._rasters._datasets) == 4
    assert len(terrain._rasters._datasets) == 0


def test_opening_reads_no_cells(tile, reads):
    with open_terrain(tile) as terrain:
        assert terrain.covers(10.5, 50.5)
        assert terrain.finest_cell_m([10.5], [50.5]) == pytest.approx(19.67, abs=0.05)  # 1″ of the 50.5th parallel
    assert reads == []


@pytest.mark.skipif(sys.platform != "linux", reason="reads the resident size from /proc")
def test_memory_does_not_grow_with_the_mosaic(write_raster):
    """A long walk over a mosaic of 200 MB unpacked keeps to the block cache of 64 MB."""
    side, folder = 2560, None
    heights = np.tile(np.arange(side, dtype="float64"), (side, 1))
    for i in range(4):
        grid = Affine(1, 0, 500_000 + side * i, 0, -1, 5_000_000)
        options = {"tiled": True, "blockxsize": 256, "blockysize": 256, "compress": "deflate"}
        folder = write_raster(f"big/{i}.tif", heights, grid, "EPSG:32632", **options).parent
    code = (
        "import numpy as np; from pathlib import Path\n"
        "from rasterio.warp import transform\n"
        "from profiler.terrain import open_terrain\n"
        "def mb(): return int(open('/proc/self/statm').read().split()[1]) * 4096 / 1e6\n"
        f"with open_terrain(Path({str(folder)!r})) as terrain:\n"
        "    before = None\n"
        "    for north in range(4_999_900, 4_997_500, -100):\n"
        "        x = np.linspace(500_010, 510_200, 3000)\n"
        "        lon, lat = transform('EPSG:32632', 'EPSG:4326', x.tolist(), [north] * 3000)\n"
        "        terrain.sample(lon, lat)\n"
        "        before = before or mb()\n"
        "    print(mb() - before)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert float(done.stdout) < 90.0


def test_importing_costs_neither_rasterio_nor_pyproj():
    """`hopwright --help` must not wait for GDAL or PROJ."""
    code = "import sys, profiler.terrain; print('rasterio' in sys.modules, 'pyproj' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False False"
