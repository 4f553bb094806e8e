"""How wrong the heights may be."""

from dataclasses import dataclass
from typing import Annotated, ClassVar, Literal

from profiler.models.stated import Bounds, Form, Forms, Key, Stated

__all__ = ["ConfidenceChoice", "TerrainDoubt", "TerrainKind"]


TerrainKind = Literal["srtm-1", "srtm-3", "nasadem", "merit", "alos-w3d30", "copernicus-glo30", "usgs-10m", "lidar"]


@dataclass(frozen=True, slots=True)
class TerrainDoubt(Stated):
    """How a hop file states the error of the terrain: by the kind of model, or by numbers of one of four measures."""

    FORMS: ClassVar = (
        Forms(
            (
                ("terrain_kind", "correlation_m?"),
                ("terrain_rmse_m", "correlation_m", "terrain_source?", "terrain_offset_sigma_m?"),
                ("terrain_sigma_m", "correlation_m", "terrain_source?", "terrain_offset_sigma_m?"),
                ("terrain_le90_m", "correlation_m", "terrain_source?", "terrain_offset_sigma_m?"),
                ("terrain_absolute_le90_m", "terrain_relative_le90_m", "correlation_m", "terrain_source?"),
            )
        ),
    )

    terrain_kind: Annotated[
        TerrainKind | None,
        Key(
            "with its published error",
            example="srtm-1",
        ),
    ] = None
    terrain_rmse_m: Annotated[float | None, Key("root mean square of the error", least=0, most=100, example=4.0)] = None
    terrain_sigma_m: Annotated[float | None, Key("its standard deviation", least=0, most=100, example=4.0)] = None
    terrain_le90_m: Annotated[
        float | None, Key("what 90 % of the errors stay within", least=0, most=150, example=6.6)
    ] = None
    terrain_absolute_le90_m: Annotated[
        float | None,
        Key("what 90 % of the errors stay within, local noise and offset together", least=0, most=150, example=4.0),
    ] = None
    terrain_relative_le90_m: Annotated[
        float | None,
        Key(
            "what 90 % of the differences between two points stay within: local noise alone",
            least=0,
            most=150,
            example=2.0,
        ),
    ] = None
    terrain_source: Annotated[
        str | None,
        Key("where that number comes from", left_out="hop file", example="a guess for an invented country"),
    ] = None
    correlation_m: Annotated[
        float | None,
        Key(
            "the distance at which errors hardly agree any more; 0 is none, inf one error for the whole path",
            least=0,
            infinite=True,
            left_out="that of the kind of model; common models have 30 to 300 m",
            example=120,
        ),
    ] = None
    terrain_offset_sigma_m: Annotated[
        float | None,
        Key(
            "the part of the error that the whole neighbourhood shares",
            least=0,
            most=100,
            left_out="that of the kind of model, or none: all of a number is local, the cautious way",
            example=2.0,
        ),
    ] = None


@dataclass(frozen=True, slots=True)
class ConfidenceChoice(Stated):
    """How wrong the terrain and the cover may be, and how the doubt is drawn.

    ``terrain_source`` says in words where ``terrain_sigma_m`` comes from. ``correlation_m`` is the practical range of
    the terrain error: the distance at which its correlation has fallen to 5 %; 0 is none, infinity is one error for
    the whole path. ``cover_correlation_m`` is the same for the cover, None meaning the terrain's. ``site_sigma_m`` is
    the error of the ground at sites known better than the raster, None meaning that they share the raster's error.
    The cover's error is ``cover_sigma_m`` and ``cover_relative_sigma`` times its height, added in quadrature.
    ``terrain_offset_sigma_m`` is the part of the terrain's error that a whole neighbourhood shares, beside the local
    ``terrain_sigma_m``. ``step_m`` is the step at which local errors are drawn, None meaning the raster's cell.
    ``minimum_chance`` is the chance of clearing under which a hop that clears on the map is not sure to pass.
    """

    terrain_sigma_m: Annotated[float, Form(TerrainDoubt), Bounds(least=0, most=100)]
    terrain_source: str
    correlation_m: Annotated[float, Bounds(least=0, infinite=True)]
    covariance: Annotated[
        Literal["exponential", "gaussian"], Key("how the correlation falls with distance", example="exponential")
    ] = "exponential"
    site_sigma_m: Annotated[
        float | None,
        Key("of surveyed ground at the sites", least=0, most=100, left_out="that of the raster", example=0.5),
    ] = None
    cover_sigma_m: Annotated[float, Key("of the cover's height", least=0, most=100, example=2.0)] = 0.0
    cover_relative_sigma: Annotated[float, Key("a share of the cover's height", least=0, most=1, example=0.1)] = 0.0
    cover_correlation_m: Annotated[
        float | None,
        Key("the same for the cover", least=0, infinite=True, left_out="that of the terrain", example=60),
    ] = None
    minimum_chance: Annotated[
        float,
        Key(
            "under it a hop that clears on the map is not sure to pass",
            least=0.5,
            below=1,
            percent=True,
            example=90,
        ),
    ] = 0.9
    terrain_offset_sigma_m: Annotated[float, Bounds(least=0, most=100)] = 0.0
    step_m: Annotated[float | None, Key("of the drawn errors", above=0, left_out="the raster's cell", example=30)] = (
        None
    )
    vary_k: Annotated[bool, Key("by availability.k_percentiles or the maps", example=True)] = False
    draws: Annotated[int, Key("of the whole path", least=100, most=1_000_000, example=2000)] = 2000
    seed: Annotated[int, Key("of the draws: the same file gives the same numbers", least=0, example=1)] = 1
