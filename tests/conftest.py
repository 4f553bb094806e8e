"""Shared by all tests: the hypothesis profile and where the published data lies."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from hypothesis import settings

settings.register_profile("repeatable", derandomize=True, deadline=None, max_examples=60)
settings.load_profile("repeatable")

HERE = Path(__file__).resolve().parent


@pytest.fixture(scope="session")
def reference() -> Path:
    """Find the published values; their sources are in the folder's README."""
    return HERE / "reference"


@pytest.fixture(scope="session")
def real_terrain() -> Path:
    """Find the real terrain; its sources are in the folder's README."""
    return HERE / "terrain"


@pytest.fixture
def write_raster(tmp_path: Path) -> Callable[..., Path]:
    """Write heights as a raster: ``write_raster("a.tif", heights, affine, crs, unit="ft", nodata=-9999, …)``."""
    import rasterio

    def write(name, heights, affine, crs="EPSG:4326", *, unit=None, scale=None, tags=None, driver="GTiff", **options):
        path = tmp_path / name
        path.parent.mkdir(parents=True, exist_ok=True)
        bands = np.atleast_3d(np.asarray(heights).T).T  # (rows, cols) or (bands, rows, cols)
        shape = {"count": bands.shape[0], "height": bands.shape[1], "width": bands.shape[2], "dtype": bands.dtype}
        with rasterio.open(path, "w", driver=driver, crs=crs, transform=affine, **shape, **options) as raster:
            raster.write(bands)
            if unit is not None:
                raster.units = [unit]
            if scale is not None:
                raster.scales, raster.offsets = [scale[0]], [scale[1]]
            raster.update_tags(**(tags or {}))
        return path

    return write
