"""A study loads what its hop asks for and no more: starting is most of the time that a command takes."""

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
SAMPLE = ROOT / "sample_dem" / "ridge_to_mill.toml"

PLAIN = f"""
name = "Rules only [a/b] :house:"
frequency_ghz = 7.425
[site_a]
name = "Ridge"
position = "46.12238, -39.10549"
antenna_m = 30
[site_b]
name = "Mill"
position = "46.07878, -38.97025"
antenna_m = 30
[terrain]
paths = ["{(ROOT / "sample_dem" / "country.tif").as_posix()}"]
[[rules.rule]]
label = "own [/rule] :key:"
k = 1.0
fresnel_fraction = 0.6
"""


def study(hop, *options):
    """Run a study; return what it prints and the modules that it has loaded at its end."""
    code = (
        "import sys\nfrom profiler.cli import main\n"
        "try:\n    main()\nfinally:\n    print('\\n'.join(sys.modules), file=sys.stderr)"
    )
    command = [sys.executable, "-c", code, "study", str(hop), "--full", *options]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=True, encoding="utf-8")
    return done.stdout, set(done.stderr.split())


@pytest.fixture(scope="module")
def plain(tmp_path_factory):
    hop = tmp_path_factory.mktemp("plain") / "hop.toml"
    hop.write_text(PLAIN)
    return study(hop)


def test_a_hop_of_rules_loads_no_other_stage_and_no_figure(plain):
    _, modules = plain
    stages = {f"profiler.{name}" for name in ("budget", "receiver", "availability", "confidence", "heights", "climate")}
    assert modules.isdisjoint(stages | {"profiler.figures", "profiler.plan.compose", "matplotlib", "scipy", "itur"})
    assert {"profiler.study.run", "profiler.terrain", "rasterio", "pyproj"} <= modules


def test_a_whole_study_with_its_figure_loads_neither_pyplot_nor_what_no_stage_asks_for(tmp_path):
    _, modules = study(SAMPLE, "--quiet", "--figure", str(tmp_path / "hop.png"))
    assert {"profiler.availability", "profiler.confidence", "matplotlib.figure"} <= modules
    assert modules.isdisjoint({"scipy.stats", "matplotlib.pyplot", "profiler.heights", "itur"})


def test_names_and_labels_are_printed_as_they_are(plain):
    text, _ = plain
    assert text.startswith("Rules only [a/b] :house:: PASSES")
    assert "own [/rule] :key:" in text
