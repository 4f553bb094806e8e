"""Where the heights of the ground come from, and what stands on it."""

from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, ClassVar, Literal

from profiler.models.site import Place
from profiler.models.stated import Bounds, Form, Forms, Key, Stated, require

__all__ = ["CoverChoice", "FillPolicy", "Obstacle", "SampleMethod", "TerrainChoice"]

SampleMethod = Literal["bilinear", "highest"]
FillPolicy = Literal["stop", "interpolate"]


@dataclass(frozen=True, slots=True)
class TerrainChoice(Stated):
    """Where ground heights come from and how they are read.

    ``spacing_m`` is the most that points are apart, None a 200th of the path. ``vertical_datum`` and ``height_unit``
    ("m", "ft") are those of rasters that do not say it themselves. Of rasters of one resolution the one whose path
    stands first answers. ``voids_are_sea`` takes cells without a height for the sea, at 0 m.
    """

    paths: Annotated[
        tuple[Path, ...],
        Key(
            "rasters, or folders of them; from the folder of this file",
            also=("path", "files", "rasters", "dem", "dtm"),
            example=["terrain/"],
        ),
    ]
    method: Annotated[
        SampleMethod, Key("between cell centres, or the highest of the cells around", example="bilinear")
    ] = "bilinear"
    spacing_m: Annotated[
        float | None,
        Key(
            "most between listed points; nothing that is found depends on it",
            above=0,
            left_out="a 200th of the path",
            example=50,
        ),
    ] = None
    missing: Annotated[
        FillPolicy, Key("where the path has no ground; what is interpolated is shown in the result", example="stop")
    ] = "stop"
    vertical_datum: Annotated[
        str | None,
        Key("of rasters that do not say it themselves", left_out="not known", example="EGM96"),
    ] = None
    height_unit: Annotated[
        str | None, Key("of rasters that do not say it themselves: m or ft", left_out="metres", example="ft")
    ] = None
    allow_mixed_datums: Annotated[
        bool, Key("let rasters on different vertical datums meet on the path", example=True)
    ] = False
    voids_are_sea: Annotated[bool, Key("cells without a height are the sea, at 0 m", example=True)] = False
    allow_network: Annotated[bool, Key("let a raster name sources that are read over the network", example=True)] = (
        False
    )


@dataclass(frozen=True, slots=True)
class Extent(Place):
    """Where along the path an obstacle stands."""

    FORMS: ClassVar = (
        Forms(
            (
                ("at_m", "width_m?"),
                ("from_m", "to_m"),
                *((*way, "width_m?") for way in Place.FORMS[0].ways),
            )
        ),
    )

    at_m: Annotated[float | None, Key("its middle, from site A", least=0, usual="km", example=6.2)] = None
    from_m: Annotated[float | None, Key("its near edge, from site A", least=0, usual="km", example=9.0)] = None
    to_m: Annotated[float | None, Key("its far edge, from site A", least=0, usual="km", example=9.4)] = None
    width_m: Annotated[float | None, Key("along the path", least=0, left_out="0 m", example=20)] = None


@dataclass(frozen=True, slots=True)
class Obstacle(Stated):
    """One thing that stands on the ground across the path, ``from_m`` to ``to_m`` from site A, ``height_m`` tall."""

    name: Annotated[str, Key("what it is", left_out="its number", example="water tower")]
    from_m: Annotated[float, Form(Extent), Bounds(least=0)]
    to_m: Annotated[float, Bounds(least=0)]
    height_m: Annotated[float, Key("above ground", least=0, below=2000, example=32)]

    def _agree(self) -> None:
        require(self.from_m <= self.to_m, "to_m", self.to_m, f"at least from_m = {self.from_m:g}; both are from site A")


@dataclass(frozen=True, slots=True)
class CoverChoice(Stated):
    """What stands on the ground: canopy rasters (heights), a land-cover raster with a height per class, obstacles."""

    FORMS: ClassVar = (Forms((("landcover", "class_heights_m"),), needed=False),)

    canopy: Annotated[
        tuple[Path, ...], Key("rasters of heights above ground", example=["canopy.tif"], left_out="none")
    ] = ()
    landcover: Annotated[
        Path | None, Key("a raster of classes, with a height for each", example="landcover.tif", left_out="none")
    ] = None
    class_heights_m: Annotated[
        tuple[tuple[int, float], ...],
        Key(
            "heights of the classes by their whole numbers, like 41 = 18",
            least=0,
            below=2000,
            example={"41": 18, "82": 2, "11": 0},
            left_out="none",
        ),
    ] = ()
    obstacles: Annotated[
        tuple[Obstacle, ...], Key("things that stand across the path", name="obstacle", left_out="none")
    ] = ()
