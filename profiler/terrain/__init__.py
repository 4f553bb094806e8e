"""Ground heights from rasters: files and folders in, heights at longitudes and latitudes out.

Coordinates are longitude, latitude in degrees on WGS 84; heights are metres above whatever the raster's vertical datum
is. Missing ground is NaN, never 0.
"""

from profiler.terrain.behind import files_behind
from profiler.terrain.classes import Classes, open_classes
from profiler.terrain.describe import Bounds, RasterInfo
from profiler.terrain.files import file_hash
from profiler.terrain.gaps import fill_missing, missing_stretches, require_ground
from profiler.terrain.gdal import library_versions
from profiler.terrain.ground_patches import Layer, ground_patches, hidden_out, lay_over
from profiler.terrain.inventory import FolderSurvey, RasterSurvey, bounds_around, survey
from profiler.terrain.mosaic import Terrain, as_reading, open_terrain
from profiler.terrain.overlap import Overlap
from profiler.terrain.reference import datum_key
from profiler.terrain.samples import Samples, Skipped, SourceUse, common_datum
from profiler.terrain.sites import require_inside
from profiler.terrain.strip import Strip

__all__ = [
    "Bounds",
    "Classes",
    "FolderSurvey",
    "Layer",
    "Overlap",
    "RasterInfo",
    "RasterSurvey",
    "Samples",
    "Skipped",
    "SourceUse",
    "Strip",
    "Terrain",
    "as_reading",
    "bounds_around",
    "common_datum",
    "datum_key",
    "file_hash",
    "files_behind",
    "fill_missing",
    "ground_patches",
    "hidden_out",
    "lay_over",
    "library_versions",
    "missing_stretches",
    "open_classes",
    "open_terrain",
    "require_ground",
    "require_inside",
    "survey",
]
