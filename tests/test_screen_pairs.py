"""Screening pairs of sites: the same as a study of each, and what happens to tables, chunks and bad rows."""

import csv
import json
import sys
from dataclasses import replace

import numpy as np
import pytest
import rasterio
from click.testing import CliRunner
from pyproj import Transformer

from profiler.cli.app import root
from profiler.errors import InputError
from profiler.geometry import hold_rules
from profiler.models import DiffractionChoice, Hop, Rule, Site, TerrainChoice
from profiler.screen.chunk import Template, hop_of, screen_chunk
from profiler.screen.pairs import Pairs, read_pairs
from profiler.screen.results import results_file
from profiler.screen.run import CHUNK, chunks_of, screen
from profiler.screen.tables import read_table
from profiler.study import open_hop_terrain, run_study

RULES = (Rule(4 / 3, 1.0), Rule(2 / 3, 0.3), Rule(1.0, 0.6, 3.0))
SLACK_M = 0.004 + 0.0005
"""How far two searches of the width may differ, one that stops at 4 mm (a study) and one at 0.5 mm (screening)."""


def template(raster, **changes) -> Template:
    site = Site("anywhere", -112.0, 37.0, 30.0)
    hop = Hop("template", site, replace(site, antenna_m=24.0), 6.2e9, RULES, TerrainChoice((raster,)))
    return Template(replace(hop, **changes))


def some_pairs(count, west, south, east, north, seed=5, most_km=35.0) -> Pairs:
    """Pairs anywhere in a box, tilted and uneven; every third with heights and a frequency of its own."""
    rng = np.random.default_rng(seed)
    a = rng.uniform((west, south), (east, north), (count, 2))
    way, length = rng.uniform(0, 2 * np.pi, count), rng.uniform(2.0, most_km, count) / 111.0
    b = a + np.stack([np.sin(way) / np.cos(np.radians(a[:, 1])), np.cos(way)], axis=1) * length[:, None]
    b = np.clip(b, (west, south), (east, north))
    own = np.where((np.arange(count) % 3 == 0)[:, None], [[641.0, 412.0, 13.0]], np.nan)
    return Pairs([f"p{i}" for i in range(count)], [""] * count, *a.T, *b.T, *own.T)


CANYON = (-113.237, 37.135, -112.855, 37.51)


def same_as_studies(screened: Template, pairs: Pairs) -> None:
    """Hold every row to a study of the pair."""
    with open_hop_terrain(screened.hop) as terrain:
        rows = screen_chunk(screened, pairs, terrain)
        on_path = screen_chunk(replace(screened, beside=False), pairs, terrain)
        assert rows.status == ["ok"] * len(pairs)
        assert not rows.studied.any()
        assert set(rows.outcome) == {"passes", "fails"}
        assert (on_path.surplus_m - rows.surplus_m > 0.01).any()
        for i in range(len(pairs)):
            study = run_study(hop_of(screened.hop, pairs, i), terrain)
            surplus_m = np.array([result.critical.surplus_m for result in study.rules])
            along = [result.check.surplus_m[result.check.critical] for result in study.rules]
            assert on_path.rule_surplus_m[i] == pytest.approx(np.array(along), abs=1e-3)
            assert rows.rule_surplus_m[i] == pytest.approx(surplus_m, abs=SLACK_M)
            if abs(surplus_m.min()) > SLACK_M:
                assert rows.outcome[i] == study.verdict.outcome
            assert rows.diffraction_db[i] == pytest.approx(study.median_diffraction.loss_db, abs=0.1)
            place = study.governing.critical
            assert rows.distance_m[i] == pytest.approx(study.line.distance_m, abs=1e-6)
            assert rows.azimuth_a_deg[i] == pytest.approx(study.line.azimuth_a_deg, abs=1e-9)
            assert rows.azimuth_b_deg[i] == pytest.approx(study.line.azimuth_b_deg, abs=1e-9)
            assert rows.surplus_at_m[i] == pytest.approx(place.distance_m, abs=60.0)
            feet = [(r, float(study.profile.ground_m[0]), float(study.profile.ground_m[-1])) for r in RULES]
            held = hold_rules(study.surface, feet, study.hop.frequency_hz)
            least = max(0.0, -min(each.surplus_m for each in held))
            assert rows.least_equal_m[i] == pytest.approx(least, abs=0.01)


@pytest.mark.parametrize("raster", ["canyon_srtm_3arcsec.tif", "canyon_srtm_utm12.vrt"])
def test_screening_gives_what_studies_give(real_terrain, raster):
    same_as_studies(template(real_terrain / raster), some_pairs(15, *CANYON))


def test_what_needs_a_study_gets_one_and_its_numbers(real_terrain):
    raster, pairs = real_terrain / "canyon_srtm_3arcsec.tif", some_pairs(2, *CANYON, most_km=6.0)
    plain, other = template(raster), template(raster, diffraction=DiffractionChoice("bullington"))
    with open_hop_terrain(plain.hop) as terrain:
        kernel, studied = (screen_chunk(each, pairs, terrain) for each in (plain, other))
    assert studied.studied.tolist() == [1.0, 1.0]
    assert studied.rule_surplus_m == pytest.approx(kernel.rule_surplus_m, abs=SLACK_M)
    assert studied.least_equal_m == pytest.approx(kernel.least_equal_m, abs=0.01)
    assert studied.surplus_at_m == pytest.approx(kernel.surplus_at_m, abs=60.0)


def test_a_finer_raster_between_the_sites_is_not_passed_over(real_terrain, write_raster):
    """A mound of 900 m on a raster of its own, which no site stands on."""
    mound = write_raster("mound.tif", np.full((40, 40), 4000.0), rasterio.Affine(1e-4, 0, -113.05, 0, -1e-4, 37.30))
    raster = real_terrain / "canyon_srtm_3arcsec.tif"
    over = template(raster, terrain=TerrainChoice((raster, mound)))
    pair = Pairs(["1"], [""], *(np.array([value]) for value in (-113.15, 37.297, -112.95, 37.299, 30.0, 30.0, 6.0)))
    with open_hop_terrain(over.hop) as terrain:
        rows = screen_chunk(over, pair, terrain)
        study = run_study(hop_of(over.hop, pair, 0), terrain)
    assert rows.studied.tolist() == [1.0]
    assert rows.surplus_m[0] == study.governing.critical.surplus_m < -1000.0


HEAD = "id,latitude_a,longitude_a,latitude_b,longitude_b,antenna_a_m\n"
GOOD = "37.30,-113.15,37.35,-113.05,"
HOP = """
frequency_ghz = 6.2
[site_a]
position = "37.2, -113.1"
antenna_m = 30
[site_b]
position = "37.3, -113.0"
antenna_m = 24
[terrain]
paths = ["{}"]
[rules]
preset = "1.0-and-0.3-f1"
"""


def run(folder, raster, table, *options, results="rows.csv", code=0):
    """Run the command over a table; its output and the path of its results."""
    (folder / "hop.toml").write_text(HOP.format(raster))
    (folder / "pairs.csv").write_text(table)
    words = ["screen", str(folder / "pairs.csv"), "--template", str(folder / "hop.toml"), "-o", str(folder / results)]
    found = CliRunner().invoke(root, [*words, *options], standalone_mode=False)
    if isinstance(code, int):
        assert found.exception is None, found.exception
        assert found.return_value == code
        return found.output, folder / results
    with pytest.raises(InputError, match=code):
        raise found.exception
    return found.output, folder / results


def test_every_row_keeps_its_place_and_says_what_is_wrong_with_it(real_terrain, tmp_path):
    with rasterio.open(real_terrain / "canyon_srtm_3arcsec.tif") as source:
        heights, profile = source.read(1), source.profile
    heights[330:400, 100:300] = profile["nodata"] or -32768
    with rasterio.open(tmp_path / "void.tif", "w", **{**profile, "nodata": profile["nodata"] or -32768}) as raster:
        raster.write(heights, 1)
    table = (
        f"{HEAD}good,{GOOD}\nword,37.3,here,37.4,-113.0,\nlow,{GOOD}-3\naway,10,20,10.1,20.1,\n"
        "void,37.32,-113.10,37.15,-113.12,\nsame,37.3,-113.1,37.3,-113.1,\nshort,37.3\n" + f"tall,{GOOD}400\n"
    )
    output, results = run(tmp_path, tmp_path / "void.tif", table, code=1)
    rows = list(csv.DictReader(results.read_text().splitlines()))
    assert [row["id"] for row in rows] == ["good", "word", "low", "away", "void", "same", "short", "tall"]
    said = {row["id"]: row["status"] for row in rows}
    assert said["good"] == said["tall"] == "ok"
    assert said["word"] == "longitude_a = 'here': must be a number"
    assert said["low"] == "antenna_a_m = '-3': must be more than 0 and under 2000 m"
    assert "20" in said["away"]
    assert "no ground" in said["void"] or "missing" in said["void"]
    assert said["same"] == "the sites are 0.00 m apart"
    assert said["short"] == "longitude_a is missing"
    assert all(row["surplus_m"] == "" == row["outcome"] for row in rows if row["status"] != "ok")
    assert float(rows[7]["surplus_m"]) > float(rows[0]["surplus_m"])
    assert "8 pairs: " in output
    assert "6 could not be screened" in output


@pytest.mark.parametrize(
    ("table", "options", "words"),
    [
        (f"{HEAD}1,{GOOD}\n1,{GOOD}\n", (), "id = '1': must be different in every row; rows 1 and 2"),
        ("id,latitude_a\n1,2\n", (), "longitude_a: must be a column of the table; it has id, latitude_a"),
        ("id,id,latitude_a\n1,2,3\n", (), "column id stands twice"),
        (HEAD, (), "gives no pair"),
        ("id,latitude,longitude\n1,37.3,-113\n", (), "must come with --within-km"),
        (f"{HEAD}1,{GOOD}\n", ("--within-km", "1", "5"), "must come without --within-km"),
        ("id,latitude,longitude\n1,37.3,-113\n", ("--within-km", "5", "1"), "must be two distances"),
    ],
)
def test_a_table_that_cannot_be_screened_is_refused_whole(real_terrain, tmp_path, table, options, words):
    _, results = run(tmp_path, real_terrain / "canyon_srtm_3arcsec.tif", table, *options, code=words)
    assert not results.exists()


def test_results_that_are_there_are_not_replaced_unasked(real_terrain, tmp_path):
    raster, table = real_terrain / "canyon_srtm_3arcsec.tif", f"{HEAD}1,{GOOD}\n"
    (tmp_path / "rows.csv").write_text("mine")
    run(tmp_path, raster, table, code="is there already")
    run(tmp_path, raster, table, results="pairs.csv", code="must not be the table of pairs too")
    run(tmp_path, raster, table, results="rows.txt", code="must end in one of")
    run(tmp_path, raster, table, "--force")
    assert (tmp_path / "rows.csv").read_text().startswith("id,status,outcome,distance_m,azimuth_a_deg,azimuth_b_deg,")
    assert sorted(path.name for path in tmp_path.iterdir()) == ["hop.toml", "pairs.csv", "rows.csv"]


def test_sites_are_paired_within_the_range_alone(tmp_path):
    """Four sites in a row on the equator, a tenth of a degree (11.132 km) apart, by the definition of the ellipsoid."""
    (tmp_path / "sites.csv").write_text(
        "id;latitude;longitude;antenna_ft\na;0;10;100\nb;0;10.1;\nc;0;10.2;\nd;0;10.3;\n"
    )
    pairs = read_pairs(tmp_path / "sites.csv", within_m=(11_200.0, 33_300.0))
    assert pairs.ids == ["a - c", "b - d"]
    assert read_pairs(tmp_path / "sites.csv", within_m=(11_200.0, 33_400.0)).ids == ["a - c", "a - d", "b - d"]
    assert pairs.antenna_a_m[0] == pytest.approx(30.48)
    assert np.isnan([pairs.antenna_a_m[1], pairs.antenna_b_m[0]]).all()


def test_positions_in_another_system_are_those_of_pyproj(tmp_path):
    (tmp_path / "utm.csv").write_text(
        "id,longitude_a,latitude_a,longitude_b,latitude_b\n1,300000,4130000,310000,4140000\n2,300000,99999999,1,1\n"
    )
    pairs = read_pairs(tmp_path / "utm.csv", epsg=32612)
    a, b = (
        Transformer.from_crs(32612, 4326, always_xy=True).transform(x, y) for x, y in ((3e5, 4.13e6), (3.1e5, 4.14e6))
    )
    assert (pairs.longitude_a[0], pairs.latitude_a[0]) == pytest.approx(a, abs=1e-9)
    assert (pairs.longitude_b[0], pairs.latitude_b[0]) == pytest.approx(b, abs=1e-9)
    assert pairs.problem[0] == "" != pairs.problem[1]


def test_a_screening_goes_on_where_it_was_whoever_did_the_rest(real_terrain, tmp_path, monkeypatch):
    monkeypatch.setattr("profiler.screen.run.CHUNK", 8)
    screened, pairs = template(real_terrain / "canyon_srtm_3arcsec.tif"), some_pairs(40, *CANYON, most_km=9.0)
    whole = results_file(pairs, screen(screened, pairs, tmp_path / "a"), tmp_path / "rows.csv")
    assert results_file(pairs, screen(screened, pairs, tmp_path / "b", workers=2), tmp_path / "rows.csv") == whole
    kept = sorted((tmp_path / "a").glob("*.npz"))
    assert len(kept) == 5
    kept[1].unlink()
    kept[2].write_bytes(kept[2].read_bytes()[:500])
    done = []
    again = screen(screened, pairs, tmp_path / "a", progress=lambda ready, count: done.append((ready, count)))
    assert done == [(24, 40), (32, 40), (40, 40)]
    assert results_file(pairs, again, tmp_path / "rows.csv") == whole
    with pytest.raises(InputError, match="holds chunks of another screening"):
        screen(replace(screened, beside=False), pairs, tmp_path / "a")
    (tmp_path / "c").mkdir()
    (tmp_path / "c" / "diary.txt").touch()
    with pytest.raises(InputError, match="must be a folder of this program's own"):
        screen(screened, pairs, tmp_path / "c")


def test_chunks_hold_every_pair_once():
    pairs = some_pairs(3 * CHUNK, -170.0, -60.0, 170.0, 60.0)
    chunks = chunks_of(pairs)
    assert [chunk.size for chunk in chunks] == [CHUNK] * 3
    assert np.sort(np.concatenate(chunks)).tolist() == list(range(3 * CHUNK))


def test_every_kind_of_table_holds_the_same_rows(real_terrain, tmp_path):
    raster = real_terrain / "canyon_srtm_3arcsec.tif"
    table = f"{HEAD}ridge,{GOOD}\nnowhere,1,2,1,2.2,\nmast,{GOOD}300\n"
    expected = list(csv.DictReader(run(tmp_path, raster, table, code=1)[1].read_text().splitlines()))
    _, results = run(tmp_path, raster, table, results="rows.geojson", code=1)
    features = json.loads(results.read_text())["features"]
    assert features[0]["geometry"]["coordinates"] == [[-113.15, 37.30], [-113.05, 37.35]]
    assert [each["properties"]["id"] for each in features] == ["ridge", "nowhere", "mast"]
    assert features[2]["properties"]["surplus_m"] == float(expected[2]["surplus_m"])
    assert features[1]["properties"]["surplus_m"] is None
    assert read_pairs(results).longitude_b.tolist() == [-113.05, 2.2, -113.05]


@pytest.mark.parametrize(("kind", "library"), [("parquet", "pyarrow"), ("gpkg", "pyogrio")])
def test_tables_of_the_extra_go_round(real_terrain, tmp_path, kind, library):
    pytest.importorskip(library, reason="needs the tables extra")
    raster, table = real_terrain / "canyon_srtm_3arcsec.tif", f"{HEAD}ridge,{GOOD}\nnowhere,1,2,1,2.2,\n"
    _, first = run(tmp_path, raster, table, results=f"one.{kind}", code=1)
    _, second = run(tmp_path, raster, table, results=f"two.{kind}", code=1)
    assert first.read_bytes() == second.read_bytes()
    columns = read_table(first)
    assert columns["id"] == ["ridge", "nowhere"] or list(columns["id"]) == ["ridge", "nowhere"]
    pairs = read_pairs(first)
    assert pairs.longitude_a.tolist() == [-113.15, 2.0]


def test_a_library_that_is_not_there_is_one_line(real_terrain, tmp_path, monkeypatch):
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    table = f"{HEAD}1,{GOOD}\n"
    run(tmp_path, real_terrain / "canyon_srtm_3arcsec.tif", table, results="rows.parquet", code=r"hopwright\[tables\]")
