"""Make the invented country of sample_dem/: two ridges, a valley with a lake and an island, forest on the slopes.

Nothing here is real ground: the country stands in the middle of the North Atlantic, so that nobody takes it for a
place. Seeded: running it again writes the same heights.
"""

from pathlib import Path

import numpy as np
import rasterio
from rasterio.transform import from_origin

FOLDER = Path(__file__).resolve().parent.parent / "sample_dem"
CELL_M = 50.0
WIDTH, HEIGHT = 640, 400  # 32 km by 20 km
WEST, NORTH = 484_000.0, 5_110_000.0  # EPSG:32624, UTM zone 24 north
LAKE_LEVEL_M = 412.0
SEED = 20_261_201


def rough(rng: np.random.Generator, slope: float) -> np.ndarray:
    """Fractal noise of unit standard deviation: white noise with its spectrum bent to the power -slope."""
    across, down = np.meshgrid(np.fft.rfftfreq(WIDTH), np.fft.fftfreq(HEIGHT))
    wave = np.hypot(across, down)
    wave[0, 0] = np.inf
    noise = np.fft.irfft2(np.fft.rfft2(rng.standard_normal((HEIGHT, WIDTH))) * wave ** (-slope / 2), (HEIGHT, WIDTH))
    return noise / noise.std()


def country() -> tuple[np.ndarray, np.ndarray]:
    """Ground heights and canopy heights, metres, north row first."""
    rng = np.random.default_rng(SEED)
    east_km, south_km = np.meshgrid((np.arange(WIDTH) + 0.5) * CELL_M / 1e3, (np.arange(HEIGHT) + 0.5) * CELL_M / 1e3)
    bend = 1.6 * np.sin(south_km / 5.0)
    west_ridge = 330 * np.exp(-(((east_km - 7.0 - bend) / 2.2) ** 2)) * (0.75 + 0.25 * np.cos(south_km / 3.1))
    east_ridge = 260 * np.exp(-(((east_km - 25.0 - 0.5 * bend) / 2.6) ** 2)) * (0.8 + 0.2 * np.sin(south_km / 2.3))
    spur = 150 * np.exp(-(((east_km - 19.5) / 0.9) ** 2)) / (1 + np.exp((9.5 - south_km) / 0.6))
    plain = 430 + 14 * rough(rng, 3.6) + 4 * (east_km - 16) * 0.2
    ground = plain + west_ridge + east_ridge + spur + 0.06 * (west_ridge + east_ridge) * rough(rng, 3.0)
    basin = np.hypot((east_km - 15.0) / 2.6, (south_km - 12.5) / 3.6)
    ground = np.where(basin < 1, np.minimum(ground, LAKE_LEVEL_M + 30 * (basin - 0.85)), ground)
    island = 26 * np.exp(-(np.hypot(east_km - 14.6, south_km - 13.2) ** 2) / 0.12)
    lake = (basin < 1) & (ground < LAKE_LEVEL_M)
    ground = np.where(lake, LAKE_LEVEL_M + island, ground)
    wooded = (rough(rng, 3.2) + (ground - 520) / 110 > 0.1) & (ground < 700) & ~lake
    canopy = np.where(wooded, np.clip(16 + 4 * rough(rng, 2.4), 6, 28), 0.0)
    return np.round(ground), np.round(canopy)


def write(name: str, heights: np.ndarray, kind: str, note: str) -> None:
    """Write one raster as a compressed, tiled GeoTIFF."""
    with rasterio.open(
        FOLDER / name,
        "w",
        driver="GTiff",
        width=WIDTH,
        height=HEIGHT,
        count=1,
        dtype=kind,
        crs="EPSG:32624",
        transform=from_origin(WEST, NORTH, CELL_M, CELL_M),
        tiled=True,
        blockxsize=128,
        blockysize=128,
        compress="deflate",
        predictor=2,
        zlevel=9,
    ) as raster:
        raster.write(heights.astype(kind), 1)
        raster.set_band_unit(1, "metre")
        raster.update_tags(note=note)


if __name__ == "__main__":
    ground_m, canopy_m = country()
    write("country.tif", ground_m, "int16", "invented ground heights, above an invented sea level; not a real place")
    write("canopy.tif", canopy_m, "uint8", "invented tree heights above ground; not a real place")
