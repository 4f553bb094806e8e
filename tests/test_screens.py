"""What is read in ten seconds: the short answers fit 24 lines of 80 columns; their words are held to literal text."""

import io
import json
import sys
from contextlib import redirect_stdout
from pathlib import Path

import numpy as np
import pytest
from affine import Affine
from rich.cells import cell_len

from profiler.cli import main

SAMPLE = Path(__file__).resolve().parent.parent / "sample_dem"
LONG = "Relay station of the mountain rescue service above the old quarry near the upper reservoir"
MANY_RULES = "\n".join(
    f'[[rules.rule]]\nlabel = "rule {i} of a committee that could not agree"\nk = {0.5 + 0.1 * i}\n'
    f"fresnel_fraction = {0.2 * i}\nmargin_m = {i}"
    for i in range(9)
)
OWN = "\n[radio.mode.objective]\nyear_percent = 1e-7\nworst_month_percent = 1e-6\nminutes_per_year = 1e-3\n"


def ridge(**changes):
    """Give the text of the passing sample hop with some of it replaced."""
    return _changed("ridge_to_mill.toml", changes)


def quarry(**changes):
    return _changed("quarry_to_island.toml", changes)


def _changed(name, changes):
    text = (SAMPLE / name).read_text(encoding="utf-8")
    for raster in ("country.tif", "canopy.tif"):
        text = text.replace(f'"{raster}"', f'"{(SAMPLE / raster).as_posix()}"')
    for old, new in changes.values():
        assert old in text, old
        text = text.replace(old, new)
    return text


LONG_NAMES = {
    "hop": ('name = "Western ridge to the mill"', f'name = "{LONG} to {LONG}"'),
    "a": ('name = "Western ridge"', f'name = "{LONG} A"'),
    "b": ('name = "Mill"', f'name = "{LONG.replace(" ", "_")} B"'),
}
CASES = {
    "passes": ridge(),
    "fails": quarry(),
    "long names": ridge(**LONG_NAMES),
    "everything at once": ridge(
        **LONG_NAMES,
        rules=('preset = "1.0-and-0.3-f1"', ""),
        rule=("[rules]", MANY_RULES),
        survey=("antenna_m = 30\n\n[site_b]", "antenna_m = 12\nground_m = 700\n\n[site_b]"),
        mode=('[[radio.mode]]\nname = "QPSK"', f'{OWN}\n[[radio.mode]]\nname = "QPSK, {LONG}"'),
        rain=("rain_rate_mm_h = 32\n", ""),
        error=("terrain_rmse_m = 4.0", "terrain_rmse_m = 14.0"),
    ),
    "wide letters": ridge(hop=('name = "Western ridge to the mill"', f'name = "{"西嶺から水車小屋まで" * 12}"')),
}


@pytest.fixture
def screen(tmp_path, monkeypatch):
    """Run a command over a hop as at a terminal of some width; give the exit code and what is printed."""

    def call(command, hop, *words, width=80):
        for name, value in {"COLUMNS": str(width), "FORCE_COLOR": "1", "NO_COLOR": "1", "TERM": "xterm"}.items():
            monkeypatch.setenv(name, value)
        (tmp_path / "hop.toml").write_text(hop, encoding="utf-8")
        printed = io.StringIO()
        with redirect_stdout(printed), pytest.raises(SystemExit) as stop:
            main([command, str(tmp_path / "hop.toml"), *words])
        sys.stdout.flush()
        return stop.value.code, printed.getvalue()

    return call


SHOWN = [*(("study", case) for case in CASES), ("heights", "fails"), ("heights", "long names")]
SHOWN += [("losses", "everything at once"), ("reach", "long names")]


@pytest.mark.parametrize(("command", "case"), SHOWN)
def test_the_short_answer_fits_a_screen(screen, command, case):
    words = ("--feet",) if case in ("fails", "everything at once") else ()
    _, out = screen(command, CASES[case], *words)
    lines = out.splitlines()
    assert len(lines) <= 24, out
    assert [line for line in lines if cell_len(line) > 80] == []
    assert lines[-1].endswith("--full.")
    assert any(line.startswith("Next: ") for line in lines)
    if words:
        assert " m " not in out.replace("5 m to", "")
        assert command == "losses" or " km" not in out
    narrow = screen(command, CASES[case], *words, width=40)[1].splitlines()
    assert [line for line in narrow if cell_len(line) > 40] == []
    assert len(narrow) <= 48


def test_warnings_are_counted_where_they_do_not_fit(screen):
    _, out = screen("study", CASES["everything at once"])
    _, full = screen("study", CASES["everything at once"], "--full", width=1000)
    told = sum(line.startswith("Warning: ") for line in out.splitlines())
    [count] = [int(line.split()[1]) for line in out.splitlines() if line.startswith("and ") and " more" in line]
    warnings = full[full.index("\nWarnings\n") :].split("\n\n")[0]
    assert told + count == warnings.count("\n  - ")


def test_quiet_says_verdict_chance_and_the_first_warning(screen):
    code, out = screen("study", CASES["everything at once"], "-q", width=1000)
    verdict, sentence, warning = out.splitlines()
    assert code == 1
    assert verdict.endswith(": FAILS, less than 0.1 % chance of clearing, 90 % asked")
    assert sentence.startswith("Does not clear: ")
    assert warning.startswith("Warning: ")


# --- literal words of a tilted hop, everything different at both ends ------------------------------------------------

TILTED = """\
name = "Valley to plateau"
frequency_ghz = 6

[site_a]
name = "Valley"
position = "46.0, 9.0"
antenna_m = 30

[site_b]
name = "Plateau"
position = "46.18, 9.05"
antenna_ft = 164.042

[terrain]
paths = ["tilted.tif"]

[[rules.rule]]
k = 1.3333333333333333
fresnel_fraction = 0.6
margin_m = 2

[confidence]
terrain_rmse_m = 4
correlation_m = 300
draws = 400
"""


@pytest.fixture
def tilted(write_raster, tmp_path):
    """Ground that rises from 100 m at A to 400 m at B, with a wall of rock 20 m high across the middle."""
    cell = 0.001
    north = 46.19 + cell / 2
    latitude = north - cell * (np.arange(200) + 0.5)
    ground = 100.0 + 300.0 * (latitude - 46.0) / 0.18 + np.where(np.abs(latitude - 46.09) < cell / 2, 20.0, 0.0)
    heights = np.repeat(ground[:, None], 80, axis=1).astype("float32")
    write_raster("tilted.tif", heights, Affine(cell, 0, 8.98, 0, -cell, north), "EPSG:4326")
    return TILTED.replace('"tilted.tif"', f'"{(tmp_path / "tilted.tif").as_posix()}"')


def test_the_words_of_a_tilted_hop(screen, tilted):
    """All by hand.

    A degree at 46.09° N is 111.153 km along the meridian and 77.336 km along the parallel (the usual
    series for WGS 84), so the path goes 20.0076 km north and 3.8668 km east: 20.378 km, in the middle at
    atan(3.8668/20.0076) = 10.939°; the meridians converge by 0.05°·sin 46.09° = 0.036°, half of it to each end.

    The middle: ray (130 + 450)/2 = 290 m, rock 250 + 20 = 270 m, bulge 20378²/(8·4/3·6371000) = 6.11 m, so clearance
    13.89 m; F1 = √(0.049965·20378/4) = 15.955 m, so 0.6 F1 + 2 m = 11.57 m, and 2.32 m to spare. 13.89/15.955 = 0.87.
    """
    code, out = screen("study", tilted, width=80)
    said = " ".join(out.split())
    assert code == 1
    assert said.startswith("Valley to plateau: NOT SURE, ")
    assert "Clears the rule; tightest 10.19 km from A: 2.3 m to spare (0.6 F1 + 2 m at k = 4/3)." in said
    assert "There the clearance is 13.9 m (0.87 F1) and 11.6 m are required, over ground 270.0 m." in said
    assert "A Valley, antenna 30.0 m up, azimuth 10.92°; B Plateau, antenna 50.0 m up, azimuth 190.96°" in said
    assert "; 20.38 km at 6 GHz." in said
    assert "Next: survey the ground 10.19 km from A" in said
    assert "; or raise both antennas by " in said
    assert " for a chance of 90 %." in said


def test_the_words_of_a_tilted_hop_in_feet(screen, tilted):
    """The same in feet: 2.317 m is 7.6 ft, 2 m 6.6 ft, 270 m 885.8 ft, 20 378 m 12.66 miles, half of it 6.33."""
    _, out = screen("study", tilted, "--feet")
    said = " ".join(out.split())
    assert "tightest 6.33 mi from A: 7.6 ft to spare (0.6 F1 + 6.6 ft at k = 4/3)." in said
    assert "antenna 98.4 ft up" in said
    assert "antenna 164.0 ft up" in said
    assert "; 12.66 mi at 6 GHz." in said
    assert "over ground 885.8 ft." in said


def test_a_hop_that_is_short_says_what_can_be_built(screen, tilted):
    """8 m lower at A and 20 m lower at B lower the ray in the middle by 14 m: 2.317 - 14 = 11.683 m short.

    Both masts have room for 11.7 m more. With A's tower ending at 25 m, A rises 3 m and B 2·11.683 - 3 = 20.367 m. With
    B's ending at 35 m too, no height clears; what stands there is rock and not cover, and with 13.89 - 14 < 0 the ray
    itself is not free, so that neither a cut nor another band is named.
    """
    short = tilted.replace("antenna_m = 30", "antenna_m = 22").replace("antenna_ft = 164.042", "antenna_m = 30")
    code, out = screen("study", short)
    said = " ".join(out.split())
    assert code == 1
    assert "Does not clear: 11.7 m short, 10.19 km from A (0.6 F1 + 2 m at k = 4/3)." in said
    assert "Next: raise both antennas by 11.7 m, A to 33.7 m and B to 41.7 m." in said
    a_ends = short + "\n[heights.a]\nhighest_m = 25\n"
    said = " ".join(screen("study", a_ends)[1].split())
    assert "Next: raise antenna A by 3.0 m to 25.0 m and antenna B by 20.4 m to 50.4 m." in said
    both_end = a_ends + "\n[heights.b]\nhighest_m = 35\n"
    said = " ".join(screen("study", both_end)[1].split())
    assert "Next: look for a relay, a passive reflector or another site: no height within the towers' limits" in said
    assert "band" not in said
    assert "lower the cover" not in said


def test_the_masts_feet_are_not_the_tightest_place(screen, tilted, tmp_path):
    """With 10 m at A and 90 m at B the ray in the middle is at 300 m: 12.317 m to spare, 0.77 of F1.

    Near A it starts 10 - 2 = 8 m free and leaves the ground by 80/20378 a metre; bulge and zone grow faster: 204 m
    away (the last point listed within 300 m) 8 + 0.80 - 0.24 - 0.6·√(0.05·204) = 6.6 m are to spare, fewer, but 2.1
    of F1 there. The wall decides.
    """
    low = tilted.replace("antenna_m = 30", "antenna_m = 10").replace("antenna_ft = 164.042", "antenna_m = 90")
    target = tmp_path / "out.json"
    said = " ".join(screen("study", low, "--json", str(target))[1].split())
    document = json.loads(target.read_text(encoding="utf-8"))
    critical, tight = document["rules"][0]["critical"], document["rules"][0]["tight"][0]
    assert 300 < critical["distance_m"] < 900
    assert critical["surplus_m"] < 7.0
    assert tight["distance_m"] == pytest.approx(10189, abs=2)
    assert document["verdict"]["headline"].startswith("Clears the rule; tightest 10.19 km from A: 12.3 m to spare")
    assert "At the masts' feet: 6.6 m to spare at A and 8" in said
