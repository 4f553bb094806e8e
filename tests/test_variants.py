"""Keys set beside a hop file, what stands in where a height is left out, and the comparison of variants."""

import json
import re
from pathlib import Path

import pytest

from profiler.cli import main
from profiler.errors import InputError
from profiler.hopfile import load_hop, value_of
from profiler.hopfile.overrides import overridden

ROOT = Path(__file__).resolve().parent.parent
RIDGE, QUARRY = ROOT / "sample_dem" / "ridge_to_mill.toml", ROOT / "sample_dem" / "quarry_to_island.toml"


@pytest.fixture
def run(capsys):
    def call(*words):
        with pytest.raises(SystemExit) as ended:
            main([str(word) for word in words])
        said = capsys.readouterr()
        return ended.value.code, said.out, said.err

    return call


# Keys set beside a file -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("key", "value", "read", "instead_of"),
    [
        ("site_a.antenna_ft", 100, lambda hop: hop.site_a.antenna_m, "antenna_m = 30"),
        ("site_a.antenna", "100 ft", lambda hop: hop.site_a.antenna_m, "antenna_m = 30"),
        ("radio.mode[1].threshold_dbm", 30.48, lambda hop: hop.radio.modes[1].threshold_dbm, "threshold_dbm = -88.5"),
        ("confidence.terrain_le90_m", 50.1353, lambda hop: hop.confidence.terrain_sigma_m, "terrain_rmse_m = 4.0"),
        ("radio.losses.radome", 30.48, lambda hop: dict(hop.radio.other_losses_db)["radome"], None),
        ("cover.obstacle[0]", {"at_m": 4000, "height_m": 30.48}, lambda hop: hop.cover.obstacles[0].height_m, None),
    ],
)
def test_a_key_is_set_in_place_of_all_that_says_the_same(key, value, read, instead_of):
    if key == "cover.obstacle[0]":
        key, value = "cover.obstacle", [value]
    hop = load_hop(RIDGE, {key: value})
    assert read(hop) == pytest.approx(30.48, rel=1e-5)
    (override,) = hop.overrides
    assert (override.key, override.instead_of) == (key, instead_of)
    assert any(note.startswith(f"set beside the hop file: {key} = ") for note in hop.assumptions)


def test_a_position_takes_the_place_of_every_other_form():
    raw = {"site_a": {"latitude": 1, "longitude": 2, "antenna_m": 3}}
    tables, (override,) = overridden(raw, {"site_a.position": "46 N 39 W"})
    assert tables == {"site_a": {"antenna_m": 3, "position": "46 N 39 W"}}
    assert override.instead_of == "latitude = 1, longitude = 2"
    assert raw["site_a"]["latitude"] == 1
    tables, _ = overridden({"cover": {"obstacle": [{"at_m": 3, "width_m": 2}]}}, {"cover.obstacle[0].from_km": 1})
    assert tables == {"cover": {"obstacle": [{"from_km": 1}]}}


def test_paths_that_are_set_start_from_the_current_folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "dem").mkdir()
    assert load_hop(RIDGE, {"terrain.paths": ["dem"]}).terrain.paths == (tmp_path / "dem",)
    assert load_hop(RIDGE).terrain.paths == (RIDGE.parent / "country.tif",)


def test_two_frequencies_each_have_their_direction_and_the_lower_needs_the_clearance(run):
    words = ("--frequency-ghz", "11.5", "--set", "return_frequency_ghz=7.425")
    found = json.loads(run("study", RIDGE, *words, "--json", "-")[1])
    alone = json.loads(run("study", RIDGE, "--json", "-")[1])
    assert found["hop"]["frequencies_hz"] == {"a_to_b": 11.5e9, "b_to_a": 7.425e9}
    assert found["rules"][0]["critical"] == alone["rules"][0]["critical"]  # at the lower, 7.425 GHz
    there, back = found["budget"]["a_to_b"], found["budget"]["b_to_a"]
    # 20·log10(11.5/7.425) = 3.80 dB more free-space loss, and as much more gain of each of the two dishes.
    assert there["free_space_db"] - back["free_space_db"] == pytest.approx(3.80, abs=0.005)
    assert there["received_dbm"] - back["received_dbm"] == pytest.approx(
        3.80 - there["gas_db"] + back["gas_db"], abs=0.01
    )
    assert back == {**alone["budget"]["b_to_a"], "lines": back["lines"], "modes": back["modes"]}
    # Rain takes more from 11.5 GHz than from 7.425: the outage is that of the higher.
    both = [each["availability"]["year_percent"]["rain"] for each in (found, alone)]
    assert both[0] > both[1]


def test_a_line_by_its_length_the_eirp_and_a_receiver_that_gets_too_much(run):
    words = ["radio.a.line_length_ft=120", "radio.a.line_loss_db_per_100ft=1.5", "radio.b.overload_dbm=-60"]
    found = json.loads(run("study", RIDGE, *(f"--set={word}" for word in words), "--json", "-")[1])
    there = found["budget"]["a_to_b"]
    lines = {line["name"]: line["value"] for line in there["lines"]}
    assert lines["line by length A"] == pytest.approx(-1.8)  # 120 ft at 1.5 dB per 100 ft
    # Dish of 0.6 m at 7.425 GHz, 60 %: 10·log10(0.6·(π·0.6/0.040376)²) = 31.17 dBi; 22 − 1.2 − 1.8 + 31.17.
    assert there["eirp_dbm"] == pytest.approx(50.17, abs=0.01)
    (warning,) = (each for each in found["verdict"]["warnings"] if "receiver takes" in each)
    assert warning.startswith("A to B: the received level of -51.")


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"site_a.antenna_m": -3}, r"^command line: site_a\.antenna_m = -3: must be more than 0"),
        (
            {"site_a.height_ft": 3},
            r"command line: site_a\.height_ft = 3: must be a known key; did you mean antenna_",
        ),
        ({"radio.mode[3].power_dbm": 3}, r"^command line: --set = 'radio\.mode\[3\]\.power_dbm': must be about one of"),
        ({"radio.mode.power_dbm": 3}, r"must be a name in which mode is a table"),
        ({"site_a..antenna_m": 3}, r"must be the dotted name of a key"),
        ({"": 3}, r"must be the dotted name of a key"),
    ],
)
def test_what_cannot_be_set(changes, message):
    with pytest.raises(InputError, match=message):
        load_hop(RIDGE, changes)


def test_values_are_those_of_toml_or_text():
    assert value_of("[[0.1, 0.8], [50, 1.33]]") == [[0.1, 0.8], [50, 1.33]]
    assert (value_of('"11"'), value_of("11"), value_of("11 GHz"), value_of("true")) == ("11", 11, "11 GHz", True)
    assert value_of("1\nother = 2") == "1\nother = 2"
    assert load_hop(RIDGE, {"document.revision": 2, "radio.channel": 11}).document.revision == "2"


def test_options_stand_beside_a_hop_file(run):
    code, out, _ = run(
        "study", RIDGE, "--antenna-a", "60'", "--frequency-ghz", "11", "--name-b", "Sawmill", "--json", "-"
    )
    hop = json.loads(out)["hop"]
    assert code == 0
    assert hop["site_a"]["antenna_m"] == pytest.approx(18.288)
    assert (hop["frequency_hz"], hop["site_b"]["name"], hop["site_b"]["antenna_m"]) == (11e9, "Sawmill", 30.0)
    assert [each["key"] for each in hop["overrides"]] == ["site_a.antenna", "frequency_ghz", "site_b.name"]
    assert hop["overrides"][0]["instead_of"] == "antenna_m = 30"


def test_set_has_the_last_word_and_an_option_is_named_in_an_error(run):
    code, out, _ = run("study", QUARRY, "--antenna-a", 99, "--set", "site_a.antenna_m=20", "--json", "-")
    assert json.loads(out)["hop"]["site_a"]["antenna_m"] == 20
    code, _, err = run("study", RIDGE, "--antenna-a", "-3")
    assert (code, err) == (2, "hopwright: command line: --antenna-a = -3.0: must be more than 0 and under 2000 m\n")
    code, _, err = run("study", RIDGE, "--set", "site_a")
    assert (code, err) == (2, "hopwright: command line: --set = 'site_a': must be KEY=VALUE\n")


# Heights that are left out --------------------------------------------------------------------------------------------


@pytest.fixture
def bare(tmp_path):
    """Write the ridge without antenna heights, in this folder, with the sample's rasters named in full."""
    text = re.sub(r"antenna_m = 30\n", "", RIDGE.read_text())
    for name in ("country.tif", "canopy.tif"):
        text = text.replace(f'"{name}"', json.dumps(str(ROOT / "sample_dem" / name)))
    file = tmp_path / "bare.toml"
    file.write_text(text)
    return file


def test_heights_need_no_heights_to_begin_with_and_a_study_asks_for_them(run, bare):
    code, out, _ = run("heights", bare, "--json", "-")
    found = json.loads(out)
    with_heights = json.loads(run("heights", RIDGE, "--json", "-")[1])
    assert code == 0
    assert found["least_equal_m"] == pytest.approx(with_heights["least_equal_m"], abs=1e-6)
    assert any(
        "antenna at B: no height is given, the highest of the tower, 45 m, stands in" in str(note)
        for note in found["assumptions"]
    )
    code, _, err = run("study", bare)
    assert code == 2
    assert "site_a.antenna_m = (missing): must be a number, more than 0 and under 2000 m" in err


def test_steps_are_in_feet_where_feet_are_asked_for_and_no_step_is_given(run, bare):
    pair_m = json.loads(run("heights", bare, "--feet", "--json", "-")[1])["cheapest_m"]
    for height_m in pair_m:
        assert height_m / 0.3048 == pytest.approx(round(height_m / 0.3048), abs=1e-9)
    assert load_hop(RIDGE, steps_in_feet=True).heights.tower_a.step_m == 0.3048
    kept = load_hop(RIDGE, {"heights.a.step_m": 2}, steps_in_feet=True)
    assert (kept.heights.tower_a.step_m, kept.heights.tower_b.step_m) == (2.0, 0.3048)


def test_costs_in_mixed_units_add_up_and_say_what_was_taken():
    hop = load_hop(RIDGE, {"heights.a.cost_per_ft": 3.048, "heights.b.cost_per_m": 2})
    assert (hop.heights.tower_a.cost_per_m, hop.heights.tower_b.cost_per_m) == (pytest.approx(10.0), 2.0)
    assert "cost at A: 3.048 per ft is 10 per m" in hop.assumptions
    assert "cost at B: none is given, 1 per m is taken" in load_hop(RIDGE, {"heights.a.cost_per_m": 3}).assumptions


def test_a_copy_is_not_written_with_keys_set_beside_the_file(run, tmp_path):
    code, _, err = run("heights", RIDGE, "--frequency-ghz", 11, "--write", tmp_path / "copy.toml")
    assert code == 2
    assert "--write = " in err
    assert "must be without options that set keys" in err
    assert list(tmp_path.iterdir()) == []


# Side by side ---------------------------------------------------------------------------------------------------------


def test_compare_puts_variants_side_by_side(run):
    code, out, _ = run("compare", RIDGE, QUARRY, "--variant", "site_b.antenna_m=5; frequency_ghz=11", "--json", "-")
    first, second, third = json.loads(out)["variants"]
    assert code == 1  # not every one passes
    assert (first["outcome"], second["outcome"]) == ("passes", "fails")
    alone = json.loads(run("study", QUARRY, "--json", "-")[1])
    assert second["surplus_m"] == min(rule["critical"]["surplus_m"] for rule in alone["rules"])
    assert second["cost"] is second["fade_margin_db"] is second["cheapest_m"] is None
    assert third["antenna_m"] == [30.0, 5.0]
    assert [each["key"] for each in third["overrides"]] == ["site_b.antenna_m", "frequency_ghz"]
    assert third["fade_margin_db"] != first["fade_margin_db"]
    heights = json.loads(run("heights", RIDGE, "--json", "-")[1])
    assert (first["least_equal_m"], first["cheapest_m"]) == (heights["least_equal_m"], heights["answer_m"])


def test_compare_passes_only_where_all_pass_and_needs_two(run):
    assert run("compare", RIDGE, "--variant", "site_b.antenna_m=35", "-q")[:2] == (
        0,
        "1  ridge_to_mill: PASSES\n2  site_b.antenna_m=35: PASSES\n",
    )
    code, _, err = run("compare", RIDGE)
    assert code == 2
    assert "must be two or more, or one with --variant" in err


def test_the_table_of_a_comparison_fits_80_columns(run):
    variants = ("--variant", "site_b.antenna_m=5", "--variant", "site_a.antenna_m=9")
    _, out, _ = run("compare", QUARRY, QUARRY, *variants)
    assert max(len(line) for line in out.splitlines()) <= 80
    assert out.count("chance of clearing") == 2  # three columns, then the fourth
