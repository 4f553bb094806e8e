"""profiler.cover: which source gives the cover at a point, what it refuses, and that nothing missing becomes bare."""

import numpy as np
import pytest
from affine import Affine
from hypothesis import given
from hypothesis import strategies as st

from profiler.cover import obstacle_edges, obstacle_heights, open_cover
from profiler.errors import InputError, MissingGroundError, RasterError
from profiler.models import CoverChoice, Obstacle

CELL = 0.001
NORTH_UP = Affine(CELL, 0.0, 10.0, 0.0, -CELL, 50.1)
X = np.array([0.0, 1000.0, 2000.0, 3000.0])
LONGITUDE = np.array([10.0105, 10.0305, 10.0505, 10.0705])  # cell centres: columns 10, 30, 50, 70
LATITUDE = np.full(4, 50.0505)  # row 49


@pytest.fixture
def grid(write_raster):
    """Write 100 by 100 cells of one value, with one column of another: ``grid("name.tif", 5.0, {30: 12.0})``."""

    def write(name, value, columns=None, *, dtype="float32", **options):
        cells = np.full((100, 100), value, dtype=dtype)
        for column, other in (columns or {}).items():
            cells[:, column] = other
        return write_raster(name, cells, NORTH_UP, **options)

    return write


def cover(choice, longitude=LONGITUDE, latitude=LATITUDE, *, method="bilinear", **options):
    with open_cover(choice, method) as rasters:
        return rasters.sample(X, longitude, latitude, **options)


def test_canopy_comes_first_and_classes_fill_its_gaps(grid):
    canopy = grid("canopy.tif", 5.0, {30: -1.0, 70: 22.0}, nodata=-1.0)
    classes = grid("classes.tif", 3, {30: 41}, dtype="uint8")
    choice = CoverChoice(canopy=(canopy,), landcover=classes, class_heights_m=((3, 0.0), (41, 17.0)))
    found = cover(choice)
    assert found.cover_m.tolist() == [5.0, 17.0, 5.0, 22.0]
    assert tuple(map(str, found.notes)) == (
        "canopy heights from canopy.tif on 75 % of the path",
        "class heights from classes.tif on 25 % of the path",
    )
    assert found.files == (canopy, classes)


def test_classes_alone(grid):
    classes = grid("classes.tif", 3, {30: 41}, dtype="uint8")
    found = cover(CoverChoice(landcover=classes, class_heights_m=((3, 0.5), (41, 17.0))))
    assert found.cover_m.tolist() == [0.5, 17.0, 0.5, 0.5]


def test_a_class_is_never_blended_with_its_neighbour(grid):
    classes = grid("classes.tif", 3, {30: 41}, dtype="uint8")
    choice = CoverChoice(landcover=classes, class_heights_m=((3, 0.0), (41, 17.0)))
    longitude = np.array([10.02999, 10.03001, 10.03099, 10.03101])  # either side of both edges of column 30
    assert cover(choice, longitude).cover_m.tolist() == [0.0, 17.0, 17.0, 0.0]


def test_eight_bit_canopy_is_heights_and_no_photo(grid):
    assert cover(CoverChoice(canopy=(grid("canopy.tif", 9, dtype="uint8"),))).cover_m.tolist() == [9.0] * 4


def test_canopy_is_read_like_the_terrain(grid):
    canopy = grid("canopy.tif", 0.0, {30: 20.0})
    between = np.array([10.031, 10.031, 10.031, 10.031])  # halfway from column 30 to column 31
    for method, height in (("bilinear", 10.0), ("highest", 20.0)):
        found = cover(CoverChoice(canopy=(canopy,)), between, method=method)
        assert found.cover_m == pytest.approx(np.full(4, height), abs=1e-6)


def test_no_cover_given_is_bare_and_says_so():
    found = cover(CoverChoice())
    assert found.cover_m.tolist() == [0.0] * 4
    assert tuple(map(str, found.notes)) == ("no cover given: trees and buildings are not in this result",)
    assert not found.cover_m.flags.writeable


def test_a_gap_in_what_was_given_is_an_error_that_says_where(grid):
    choice = CoverChoice(canopy=(grid("canopy.tif", 5.0, {50: -1.0}, nodata=-1.0),))
    with pytest.raises(MissingGroundError, match=r"cover: no data 2000 m from A: must be covered; give more rasters"):
        cover(choice)


def test_points_may_have_columns(grid):
    canopy = grid("canopy.tif", 4.0)
    shape = (4, 3)
    choice = CoverChoice(canopy=(canopy,))
    longitude, latitude = np.broadcast_to(LONGITUDE[:, None], shape), np.broadcast_to(LATITUDE[:, None], shape)
    found = cover(choice, longitude, latitude)
    assert found.cover_m.tolist() == [[4.0] * 3] * 4


def test_shares_are_of_the_length_not_of_the_points(grid):
    classes, canopy = grid("classes.tif", 3, dtype="uint8"), grid("canopy.tif", 5.0, {30: -1.0}, nodata=-1.0)
    choice = CoverChoice(canopy=(canopy,), landcover=classes, class_heights_m=((3, 0.0),))
    notes = cover(choice, weight_m=np.array([500.0, 100.0, 200.0, 200.0])).notes
    assert [str(note).split(" on ")[1] for note in notes] == ["90 % of the path", "10 % of the path"]


def test_an_unlisted_class_is_named_with_those_that_are(grid):
    classes = grid("classes.tif", 3, {30: 41}, dtype="uint8")
    with pytest.raises(InputError, match=r"classes\.tif holds class 41 .*listed: \[3\]"):
        cover(CoverChoice(landcover=classes, class_heights_m=((3, 0.0),)))


def test_heights_below_the_ground_are_no_canopy(grid):
    canopy = grid("canopy.tif", 5.0, {30: -3.0})
    with pytest.raises(InputError, match=r"cover\.canopy = .*canopy\.tif: must hold heights of 0 m or more, not -3 m"):
        cover(CoverChoice(canopy=(canopy,)))


def test_classes_with_decimals_are_no_classes(grid):
    with pytest.raises(RasterError, match=r"holds 3\.5, and a class is a whole number"):
        cover(CoverChoice(landcover=grid("classes.tif", 3.5), class_heights_m=((3, 0.0),)))


def test_a_folder_of_land_cover_lists_the_files_that_were_read(grid):
    first, _ = (grid(f"tiles/{name}.tif", 3, dtype="uint8") for name in ("first", "second"))  # the second has no say
    assert cover(CoverChoice(landcover=first.parent, class_heights_m=((3, 1.0),))).files == (first,)


@given(start=st.floats(0.0, 2999.0), width=st.floats(0.0, 1000.0), height=st.floats(0.5, 100.0))
def test_an_obstacle_stands_between_its_edges(start, width, height):
    obstacle = Obstacle("any", start, min(start + width, 3000.0), height)
    inner = np.array([0.5 * (obstacle.from_m + obstacle.to_m)])
    assert obstacle_heights(inner, (obstacle,)).tolist() == [height]
    beyond = np.array([obstacle.from_m - 0.006, obstacle.to_m + 0.006])
    assert obstacle_heights(beyond, (obstacle,)).tolist() == [0.0, 0.0]


def test_overlapping_obstacles_do_not_stack():
    obstacles = (Obstacle("wood", 0.0, 2500.0, 12.0), Obstacle("mast", 1990.0, 2010.0, 30.0))
    assert obstacle_heights(X, obstacles).tolist() == [12.0, 12.0, 30.0, 0.0]
    assert obstacle_heights(X, obstacles[::-1]).tolist() == [12.0, 12.0, 30.0, 0.0]


def test_an_obstacle_beyond_the_path_is_refused():
    with pytest.raises(InputError, match=r"obstacle mast: to_m = 3001: must lie within the 3000 m path"):
        obstacle_edges((Obstacle("mast", 2990.0, 3001.0, 30.0),), 3000.0)
