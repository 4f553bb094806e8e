"""It always answers: whatever the surroundings, the streams, words and names, an answer or one line, in time."""

import json
import os
import subprocess
import sys
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest
import rasterio
from affine import Affine

from profiler.cli import main

ROOT = Path(__file__).resolve().parent.parent
SAMPLE = ROOT / "sample_dem" / "ridge_to_mill.toml"

HOP = """\
name = "Over the plain"
frequency_ghz = 7.5

[site_a]
name = "South"
position = "46.0, 9.0"
antenna_m = 40

[site_b]
name = "North"
position = "46.18, 9.0"
antenna_m = 40

[terrain]
paths = ["dem.tif"]

[rules]
rule = [{ k = 1.333, fresnel_fraction = 1.0 }, { k = 0.667, fresnel_fraction = 0.3 }]
"""


@pytest.fixture
def here(tmp_path, monkeypatch):
    """Stand in a folder with a hop over a plain."""
    size = {"count": 1, "height": 120, "width": 24, "dtype": "int16", "crs": "EPSG:4326"}
    affine = Affine(1 / 600, 0.0, 8.98, 0.0, -1 / 600, 46.19)
    with rasterio.open(tmp_path / "dem.tif", "w", driver="GTiff", transform=affine, **size) as raster:
        raster.write(np.full((1, 120, 24), 100, dtype="int16"))
    (tmp_path / "hop.toml").write_text(HOP)
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.fixture
def run(here, capfd):
    """Run the command line in this process: exit code, standard output, standard error."""

    def call(*words):
        capfd.readouterr()
        with pytest.raises(SystemExit) as stop:
            main([str(word) for word in words])
        sys.stdout.flush()
        return stop.value.code, *capfd.readouterr()

    return call


def process(*words, env=None, program=("-m", "profiler"), **options):
    """Run the command line as a process of its own."""
    options = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE, **options}
    return subprocess.run(
        [sys.executable, *program, *map(str, words)],
        check=False,
        timeout=60,
        env={**os.environ, "PYTHONPATH": str(ROOT), **(env or {})},
        **options,
    )


def shell(line):
    """Run a line of sh in which $HOPWRIGHT is the command."""
    command = f"{sys.executable} -m profiler"
    return subprocess.run(
        ["sh", "-c", line.replace("$HOPWRIGHT", command)],
        capture_output=True,
        check=False,
        timeout=60,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )


# A fault of the program -----------------------------------------------------------------------------------------------


def broken(*_, **__):
    raise ZeroDivisionError("by\x1b[2J zero\nhopwright: all is well")


def test_a_fault_of_the_program_is_70_and_asks_for_a_report(run, monkeypatch):
    monkeypatch.setattr("profiler.study.run_study", broken)
    code, out, err = run("study", "hop.toml")
    assert (code, out) == (70, "")
    assert err == (
        "hopwright: a fault of hopwright 0.1.0 itself, not of your input (ZeroDivisionError: by\\x1b[2J zero hopwright:"
        " all is well): please report it with the command and the hop file; HOPWRIGHT_TRACEBACK=1 before the command"
        " shows where it is\n"
    )
    monkeypatch.setenv("HOPWRIGHT_TRACEBACK", "1")
    with pytest.raises(ZeroDivisionError, match="zero"):
        main(["study", "hop.toml"])


def test_an_error_of_a_library_that_is_no_error_of_the_system_is_a_fault_too(run, monkeypatch):
    def fails(*_, **__):
        raise rasterio.errors.RasterioIOError("a library's own words")

    monkeypatch.setattr("profiler.study.run_study", fails)
    code, _, err = run("study", "hop.toml")
    assert code == 70
    assert "RasterioIOError" in err


def test_memory_that_runs_out_is_told_with_a_remedy(run, monkeypatch):
    def full(*_, **__):
        raise MemoryError

    monkeypatch.setattr("profiler.study.run_study", full)
    code, _, err = run("study", "hop.toml")
    assert code == 2
    assert err.startswith("hopwright: not enough memory: must be a smaller task")


# Streams --------------------------------------------------------------------------------------------------------------

FULL = b"hopwright: standard output: No space left on device: must be a file that can be read or written here\n"
CLOSED = b"hopwright: standard output: is closed: must be open; send it to a file\n"
GONE = b"hopwright: gone.toml: No such file or directory: must be a hop file that can be read\n"


@pytest.mark.parametrize(
    ("line", "code", "said"),
    [
        ("$HOPWRIGHT study hop.toml >/dev/full", 2, FULL),
        ("$HOPWRIGHT terrain dem.tif --json - >/dev/full", 2, FULL),
        ("$HOPWRIGHT starter - >/dev/full", 2, FULL),
        ("$HOPWRIGHT --help >/dev/full", 2, FULL),
        ("$HOPWRIGHT study hop.toml >&-", 2, CLOSED),
        ("$HOPWRIGHT study hop.toml >&- 2>&-", 2, b""),
        ("$HOPWRIGHT study gone.toml 2>&-", 2, b""),
        ("$HOPWRIGHT study gone.toml 2>/dev/full", 2, b""),
        ("$HOPWRIGHT study gone.toml <&-", 2, GONE),
        ("$HOPWRIGHT study hop.toml --json x.json -q <&- 2>&- >/dev/null", 0, b""),
        ("$HOPWRIGHT study hop.toml | true", 0, b""),
    ],
)
def test_streams_that_are_full_or_closed(here, line, code, said):
    done = shell(line)
    assert (done.returncode, done.stdout, done.stderr) == (code, b"", said)
    if "x.json" in line:  # nothing else got into the file that has the number of a closed stream
        assert json.loads((here / "x.json").read_text())["schema"]


# Surroundings ---------------------------------------------------------------------------------------------------------


STOPPED_CLOCK = """
import datetime
class Stopped(datetime.datetime):
    now = classmethod(lambda self, zone=None: self(2001, 2, 3, tzinfo=zone))
datetime.datetime = Stopped
from profiler.cli import main
main()
"""


def test_no_setting_of_the_caller_changes_a_figure_or_adds_a_line(here):
    """Settings of the drawing library in the folder and in MATPLOTLIBRC, a notebook's backend, no home and so on."""
    (here / "plain").mkdir()
    words = ("heights", "../hop.toml", "-q", "--figure", "hop.svg", "--figure", "hop.png", "--figure", "hop.pdf")
    plain = process(*words, cwd=here / "plain", program=("-c", STOPPED_CLOCK))
    (here / "odd").mkdir()
    (here / "odd" / "matplotlibrc").write_bytes(
        b"lines.linewidth: 30\nnonsense: \xff\xfe\naxes.formatter.use_locale: 1"
    )
    (here / "rc").write_text("figure.facecolor: red\nfont.size: much\ntext.usetex: True\n")
    odd = process(
        *words,
        cwd=here / "odd",
        program=("-c", STOPPED_CLOCK),
        env={
            "MATPLOTLIBRC": str(here / "rc"),
            "MPLBACKEND": "module://matplotlib_inline.backend_inline",
            "HOME": "/proc/none",
            "XDG_CONFIG_HOME": "",
            "XDG_CACHE_HOME": "/proc/none",
            "PYTHONWARNINGS": "error",
            "PYTHONDEVMODE": "1",
            "COLUMNS": "0",
            "LINES": "-1",
            "TERM": "nonsense",
            "LC_ALL": "xx_XX.nonsense",
            "SOURCE_DATE_EPOCH": "",
        },
    )
    assert (plain.returncode, plain.stderr) == (odd.returncode, odd.stderr) == (0, b"")
    assert plain.stdout == odd.stdout
    for name in ("hop.svg", "hop.png", "hop.pdf"):
        assert (here / "plain" / name).read_bytes() == (here / "odd" / name).read_bytes()


@pytest.mark.parametrize("columns", ["0", "1", "-5", "99999999999999999999", "wide"])
def test_any_width_of_a_terminal_goes(run, monkeypatch, columns):
    monkeypatch.setenv("COLUMNS", columns)
    monkeypatch.setenv("FORCE_COLOR", "1")
    code, out, err = run("study", "hop.toml")
    assert (code, err) == (0, "")
    assert "Over the" in out


# Words ----------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "words",
    [
        ("heights", "hop.toml", "--sure", "9_0"),
        ("study", "hop.toml", "--height-limits", "0", "1_000"),
        ("study", "hop.toml", "--rule", "1_0", "1", "0"),
        ("reach", "hop.toml", "--fade-margin-db", "1_0"),
        ("reach", "hop.toml", "--bit-error-ratio", "1e-0_6"),
        ("reach", "hop.toml", "--efficiency", "٠.٥"),
        ("study", "--antenna-a", "1_0", "--antenna-b", "10", "--a", "46N 9E", "--b", "46.18N 9E", "--frequency-ghz",
         "7.5", "--terrain", "dem.tif", "--rule", "1", "0.6", "3"),
    ],
)  # fmt: skip
def test_a_number_is_written_in_digits_alone(run, words):
    code, out, err = run(*words)
    assert (code, out, err.count("\n")) == (2, "", 1)
    assert "must be a number, like 7.5" in err or "must be a number with its unit" in err


@pytest.mark.parametrize(
    "limits", [("-1e308", "1e308"), ("0", "5e-324"), ("1e20", "1.1e20"), ("nan", "1"), ("-inf", "inf"), ("3", "3")]
)
@pytest.mark.parametrize("axis", ["--distance-limits", "--height-limits"])
def test_limits_that_no_axis_can_carry(run, here, axis, limits):
    code, out, err = run("study", "hop.toml", "--figure", "x.png", axis, *limits)
    assert (code, out, err.count("\n")) == (2, "", 1)
    assert "must be two numbers of -1e+06 to 1e+06, the lower first, 0.01 or more apart" in err
    assert not (here / "x.png").exists()


# Names ----------------------------------------------------------------------------------------------------------------

HOSTILE = "a\x1b[2J\x1b[1;1H\x1b[32mPASSES\x9b31m\u202ebidi\u2066\u2028line\ufeffmark\ufffe\uffff\U0001fffe\udcff b--c"


def seen_safe(text):
    """Check that a text, which may have colors off, holds nothing but letters and the line feeds of its layout."""
    assert all(line.isprintable() for line in text.split("\n")), [
        letter for letter in text if not letter.isprintable() and letter != "\n"
    ]


@pytest.mark.parametrize("end", ["", "\nhopwright: forged", "\rforged", "\n\nOver the plain: PASSES"])
def test_names_of_files_steer_no_terminal(run, here, end):
    """In errors, in results, in JSON and in figures; and never begin a line of their own."""
    name = (HOSTILE + end).replace("/", "")
    for file in (f"{name}.toml", "hop.toml"):
        for command in ("study", "heights", "losses", "terrain --hop"):
            words = command.split()
            rasters = [] if words[0] != "terrain" else ["gone" + name]
            _, out, err = run(*words, "gone" + file, *rasters)
            seen_safe(out + err)
            assert err.count("\n") == 1
    seen_safe("".join(run("study", "hop.toml", "--nonsense" + name)[1:]))
    seen_safe("".join(run(name)[1:]))


def test_text_in_a_hop_file_steers_no_terminal(run, here):
    """Keys of inline tables, names with marks that the reader of hop files lets through, values of any kind."""
    for bad in ('x = {"\\u001b[2J\\u202e\\u009b" = 1}', '"\\u001b[2J" = 1', 'x = "\\u001b[2J\\u0007"', '"a\\nb" = 1'):
        (here / "bad.toml").write_text(f"{bad}\n{HOP}")
        code, out, err = run("study", "bad.toml")
        assert (code, out, err.count("\n")) == (2, "", 1)
        seen_safe(err)
    marks = "\ufeff\ufffe \u200f\u061c\u00ad\U000e0041 --> ]]> & <b> $x_2$ -- \U0001fffe"
    (here / "marks.toml").write_text(HOP.replace("South", f"South {marks}"), encoding="utf-8")
    names = [f"marks{ending}" for ending in (".svg", ".pdf", ".png", ".json")]
    figures = [word for name in names[:3] for word in ("--figure", name)]
    code, out, err = run("study", "marks.toml", *figures, "--json", names[3])
    assert (code, err) == (0, "")
    seen_safe(out)
    drawn = (here / "marks.svg").read_text(encoding="utf-8")
    assert "\\ufeff\\ufffe" in drawn
    ElementTree.fromstring(drawn)  # well-formed
    assert (here / "marks.pdf").read_bytes().rstrip().endswith(b"%%EOF")
    document = (here / "marks.json").read_text(encoding="utf-8")
    seen_safe(document)
    assert f"South {marks}" in json.dumps(json.loads(document), ensure_ascii=False)  # no letter is lost


@pytest.mark.skipif(sys.platform != "linux", reason="file names are bytes there")
def test_names_that_are_no_utf_8(here):
    (here / "dem.tif").rename(os.fsdecode(bytes(here) + b"/dem\xff.tif"))
    (here / "hop.toml").rename(os.fsdecode(bytes(here) + b"/hop\xff\xfe.toml"))
    for words in (
        ("study", "hop\udcff\udcfe.toml"),
        ("terrain", "dem\udcff.tif"),
        ("terrain", "."),
        ("study", "x\udcff.toml", "--json", "\udcff.json"),
        ("starter", "new\udcff.toml"),
    ):
        done = process(*words)
        assert done.returncode in (0, 1, 2)
        assert done.stderr.count(b"\n") == (1 if done.returncode == 2 else 0), done.stderr
        seen_safe(done.stdout.decode() + done.stderr.decode())
    assert (here / os.fsdecode(b"new\xff.toml")).exists()


def test_files_with_such_names_are_studied_and_forge_no_line(run, here):
    """The hop file and the terrain have an end of line, a color and a turn of the writing in their names."""
    evil = "\nforged \x1b[32m\u202e"
    (here / "land").mkdir()
    raster, hop = f"land/dem{evil}.tif", f"hop{evil}.toml"
    (here / "dem.tif").rename(here / raster)
    (here / hop).write_text(HOP.replace("dem.tif", "land"))
    for words in (
        ("study", hop), ("heights", hop), ("losses", hop), ("reach", hop), ("terrain", raster, "--hop", hop),
        ("terrain", "land", "--all", "--hop", hop), ("study", hop, "--json", f"out{evil}.json"),
        ("heights", hop, "--write", f"copy{evil}.toml"), ("starter", f"new{evil}.toml"),
        ("compare", hop, hop),
        ("study", hop, "--json", raster),
    ):  # fmt: skip
        code, out, err = run(*words)
        assert code == (2 if words[0] == "reach" or words[-1] == raster else 0), err
        seen_safe(out + err)
        assert not [line for line in (out + err).splitlines() if line.startswith("forged")], out + err
