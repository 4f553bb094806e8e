"""Where the antennas are."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Annotated, Any, ClassVar

from profiler.models.stated import Bounds, Form, Forms, Key, Stated

__all__ = ["Place", "Site"]


@dataclass(frozen=True, slots=True)
class Place(Stated):
    """A position in one of its three forms."""

    FORMS: ClassVar = (
        Forms((("position", "datum?"), ("latitude", "longitude", "datum?"), ("easting", "northing", "epsg"))),
    )

    position: Annotated[
        str | None,
        Key(
            "degrees as people write them, latitude first where there are no letters; or UTM or MGRS",
            parsed=True,
            also=("coordinates", "coords", "location", "latlon", "mgrs", "utm"),
            example="46°02'56.4\"N 39°06'01.8\"W",
        ),
    ] = None
    latitude: Annotated[float | None, Key("north is positive", least=-90, most=90, example=46.0490, also=("lat",))] = (
        None
    )
    longitude: Annotated[
        float | None, Key("east is positive", least=-180, most=180, example=-39.1005, also=("lon", "long", "lng"))
    ] = None
    datum: Annotated[
        str | None,
        Key(
            'of the degrees: WGS84, NAD83, NAD27, ETRS89, OSGB36 and so on, or a code like "EPSG:4267"',
            example="WGS84",
            left_out="WGS 84, and the result says so",
        ),
    ] = None
    easting: Annotated[float | None, Key("in the unit of the grid", example=492225, also=("x",))] = None
    northing: Annotated[float | None, Key("in the unit of the grid", example=5099500, also=("y",))] = None
    epsg: Annotated[int | None, Key("code of the grid", least=1, example=32624, also=("crs", "srid", "zone"))] = None

    @classmethod
    def remedy(cls, field: str, raw: Mapping[str, Any]) -> str:
        """Where the two angles would fit the other way round, say so."""
        latitude, longitude = raw.get("latitude"), raw.get("longitude")
        if field != "latitude" or not isinstance(latitude, int | float) or not isinstance(longitude, int | float):
            return ""
        if not (90 < abs(latitude) <= 180 and abs(longitude) <= 90):
            return ""
        return f"latitude and longitude look swapped: give latitude = {longitude}, longitude = {latitude}"


@dataclass(frozen=True, slots=True)
class Site(Stated):
    """One end of a hop.

    ``surveyed_ground_m`` replaces the raster's ground at the site. Within ``clearing_m`` of the site nothing stands on
    the ground, whatever the cover says. ``position_notes`` say how the position was given when that was not plain
    WGS 84 degrees.
    """

    name: Annotated[
        str, Key("what the site is called", left_out="A or B", example="Western ridge", also=("site", "site_name"))
    ]
    longitude: Annotated[float, Form(Place), Bounds(least=-180, most=180)]
    latitude: Annotated[float, Bounds(least=-90, most=90)]
    antenna_m: Annotated[
        float,
        Key(
            "centre of the antenna above ground",
            above=0,
            below=2000,
            example=35,
            also=(
                "height",
                "antenna_height",
                "tower_height",
                "mast_height",
                "mounting_height",
                "centerline",
                "agl",
                "h",
            ),
        ),
    ]
    surveyed_ground_m: Annotated[
        float | None,
        Key(
            "surveyed ground above the terrain's datum; it replaces the raster here",
            least=-500,
            most=9000,
            name="ground_m",
            also=("elevation", "elev", "ground_elevation", "site_elevation", "altitude", "amsl"),
            left_out="the raster's ground",
            example=600.2,
        ),
    ] = None
    clearing_m: Annotated[
        float, Key("kept free of trees around the mast, whatever the cover says", least=0, most=5000, example=40)
    ] = 0.0
    call_sign: Annotated[str, Key("of the station", left_out="not said", example="XX9999")] = ""
    owner: Annotated[str, Key("of the site or the structure", left_out="not said", example="nobody")] = ""
    licence: Annotated[str, Key("of the station", left_out="not said", example="none", also=("license",))] = ""
    structure: Annotated[
        str,
        Key(
            "what the antenna stands on, in words", left_out="not said", example="guyed mast", also=("structure_type",)
        ),
    ] = ""
    structure_height_m: Annotated[
        float | None,
        Key("its top above ground, for the documents", above=0, below=2000, left_out="not said", example=42),
    ] = None
    position_notes: tuple[str, ...] = ()
